// Package keys makes the authority of a run and the certificates that it issues.
//
// Its nouns are the Authority, which lives in the memory of one process and signs,
// and the Identity, what one party needs to prove who it is and to know the
// others. Keys are ECDSA over P-256; names are single DNS labels such as
// "worker-1". The package does no I/O. Nothing in it is written to a file, and an
// Identity must only be handed on where others cannot read it.
package keys

import (
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/tls"
	"crypto/x509"
	"crypto/x509/pkix"
	"errors"
	"fmt"
	"math/big"
	"time"
)

// Lifetime is how long certificates are good for: longer than any run, and an
// hour earlier for clocks that disagree.
const (
	Lifetime = 90 * 24 * time.Hour
	slack    = time.Hour
)

// Authority signs certificates.
type Authority struct {
	certificate *x509.Certificate
	key         *ecdsa.PrivateKey
	now         time.Time
}

// Identity is one party's certificate, its key, and the authority that it and
// its peers stand under, all in DER.
type Identity struct {
	Authority, Certificate []byte
	PrivateKey             []byte // PKCS 8
}

// NewAuthority makes an authority whose certificates are good from now.
func NewAuthority(now time.Time) (*Authority, error) {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		return nil, fmt.Errorf("authority: %w", err)
	}
	template, err := template("rowstead authority", now)
	if err != nil {
		return nil, err
	}
	template.IsCA, template.BasicConstraintsValid, template.MaxPathLenZero = true, true, true
	template.KeyUsage = x509.KeyUsageCertSign
	der, err := x509.CreateCertificate(rand.Reader, template, template, &key.PublicKey, key)
	if err != nil {
		return nil, fmt.Errorf("authority: %w", err)
	}
	certificate, err := x509.ParseCertificate(der)
	if err != nil {
		return nil, fmt.Errorf("authority: %w", err)
	}
	return &Authority{certificate: certificate, key: key, now: now}, nil
}

// template has what all certificates share.
func template(name string, now time.Time) (*x509.Certificate, error) {
	serial, err := rand.Int(rand.Reader, new(big.Int).Lsh(big.NewInt(1), 120))
	if err != nil {
		return nil, fmt.Errorf("certificate: %w", err)
	}
	return &x509.Certificate{
		SerialNumber: serial, Subject: pkix.Name{CommonName: name},
		NotBefore: now.Add(-slack), NotAfter: now.Add(Lifetime),
	}, nil
}

// Issue makes a key and a certificate for name.
func (a *Authority) Issue(name string) (Identity, error) {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		return Identity{}, fmt.Errorf("certificate for %s: %w", name, err)
	}
	template, err := template(name, a.now)
	if err != nil {
		return Identity{}, err
	}
	template.DNSNames = []string{name}
	template.KeyUsage = x509.KeyUsageDigitalSignature
	template.ExtKeyUsage = []x509.ExtKeyUsage{x509.ExtKeyUsageServerAuth, x509.ExtKeyUsageClientAuth}
	der, err := x509.CreateCertificate(rand.Reader, template, a.certificate, &key.PublicKey, a.key)
	if err != nil {
		return Identity{}, fmt.Errorf("certificate for %s: %w", name, err)
	}
	private, err := x509.MarshalPKCS8PrivateKey(key)
	if err != nil {
		return Identity{}, fmt.Errorf("certificate for %s: %w", name, err)
	}
	return Identity{Authority: a.certificate.Raw, Certificate: der, PrivateKey: private}, nil
}

// config has what both ends share: TLS 1.3 and nothing older, our certificate,
// and no authority but the run's.
func (i Identity) config() (*tls.Config, *x509.CertPool, error) {
	key, err := x509.ParsePKCS8PrivateKey(i.PrivateKey)
	if err != nil {
		return nil, nil, fmt.Errorf("private key: %w", err)
	}
	authority, err := x509.ParseCertificate(i.Authority)
	if err != nil {
		return nil, nil, fmt.Errorf("certificate of the authority: %w", err)
	}
	pool := x509.NewCertPool()
	pool.AddCert(authority)
	return &tls.Config{
		MinVersion:   tls.VersionTLS13,
		Certificates: []tls.Certificate{{Certificate: [][]byte{i.Certificate}, PrivateKey: key}},
	}, pool, nil
}

// Server returns the configuration of the listening end. Whoever calls must have
// a certificate of the same authority.
func (i Identity) Server() (*tls.Config, error) {
	c, pool, err := i.config()
	if err != nil {
		return nil, err
	}
	c.ClientAuth, c.ClientCAs = tls.RequireAndVerifyClientCert, pool
	return c, nil
}

// Client returns the configuration of the calling end. The one that is called must
// have the same authority's certificate for the name peer.
func (i Identity) Client(peer string) (*tls.Config, error) {
	c, pool, err := i.config()
	if err != nil {
		return nil, err
	}
	c.RootCAs, c.ServerName = pool, peer
	return c, nil
}

// NameOf is the name in the certificate that the other end of a connection
// showed and that has been verified.
func NameOf(state tls.ConnectionState) (string, error) {
	if len(state.VerifiedChains) == 0 || len(state.PeerCertificates) == 0 {
		return "", errors.New("the other side showed no certificate")
	}
	names := state.PeerCertificates[0].DNSNames
	if len(names) != 1 {
		return "", fmt.Errorf("a certificate with %d names, expected one", len(names))
	}
	return names[0], nil
}
