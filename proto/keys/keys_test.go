package keys

import (
	"crypto/ecdsa"
	"crypto/tls"
	"crypto/x509"
	"net"
	"strings"
	"testing"
	"time"
)

// shake makes a TLS connection over a pipe and returns what each side says, and
// the name that the server read from the client's certificate.
func shake(t *testing.T, server, client *tls.Config) (name string, serverErr, clientErr error) {
	t.Helper()
	a, b := net.Pipe()
	defer a.Close()
	defer b.Close()
	s := tls.Server(a, server)
	done := make(chan struct{})
	go func() {
		defer close(done)
		if serverErr = s.Handshake(); serverErr != nil {
			a.Close()
			return
		}
		name, serverErr = NameOf(s.ConnectionState())
		s.Write([]byte{1}) // TLS 1.3: only a read shows the client that it was taken
	}()
	c := tls.Client(b, client)
	if clientErr = c.Handshake(); clientErr == nil {
		_, clientErr = c.Read(make([]byte, 1))
	} else {
		b.Close()
	}
	<-done
	return name, serverErr, clientErr
}

func authority(t *testing.T, now time.Time) *Authority {
	t.Helper()
	a, err := NewAuthority(now)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func issue(t *testing.T, a *Authority, name string) Identity {
	t.Helper()
	id, err := a.Issue(name)
	if err != nil {
		t.Fatal(err)
	}
	return id
}

func server(t *testing.T, id Identity) *tls.Config {
	t.Helper()
	c, err := id.Server()
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func client(t *testing.T, id Identity, peer string) *tls.Config {
	t.Helper()
	c, err := id.Client(peer)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func TestHandshakes(t *testing.T) {
	now := time.Now()
	ours, other, old := authority(t, now), authority(t, now), authority(t, now.Add(-Lifetime-2*slack))
	serverID := issue(t, ours, "coordinator")
	none := client(t, issue(t, ours, "worker-1"), "coordinator")
	none.Certificates = nil
	older := client(t, issue(t, ours, "worker-1"), "coordinator")
	older.MinVersion, older.MaxVersion = tls.VersionTLS12, tls.VersionTLS12
	mixed := issue(t, other, "worker-1")
	mixed.Authority = serverID.Authority // trusts us, but is signed by another
	for name, c := range map[string]struct {
		client *tls.Config
		good   bool
	}{
		"a worker of the run":            {client(t, issue(t, ours, "worker-1"), "coordinator"), true},
		"who expects another name":       {client(t, issue(t, ours, "worker-1"), "worker-2"), false},
		"under another authority":        {client(t, issue(t, other, "worker-1"), "coordinator"), false},
		"signed by another authority":    {client(t, mixed, "coordinator"), false},
		"a certificate that has run out": {client(t, issue(t, old, "worker-1"), "coordinator"), false},
		"without a certificate":          {none, false},
		"with an older version of TLS":   {older, false},
	} {
		got, serverErr, clientErr := shake(t, server(t, serverID), c.client)
		if ok := serverErr == nil && clientErr == nil; ok != c.good || (c.good && got != "worker-1") {
			t.Errorf("%s: name %q, server %v, client %v", name, got, serverErr, clientErr)
		}
	}
}

// A worker's certificate signs nothing: one made with its key is not believed.
func TestWorkersAreNoAuthorities(t *testing.T) {
	now := time.Now()
	ours := authority(t, now)
	serverID, worker := issue(t, ours, "coordinator"), issue(t, ours, "worker-1")
	key, err := x509.ParsePKCS8PrivateKey(worker.PrivateKey)
	if err != nil {
		t.Fatal(err)
	}
	certificate, err := x509.ParseCertificate(worker.Certificate)
	if err != nil {
		t.Fatal(err)
	}
	forger := &Authority{certificate: certificate, key: key.(*ecdsa.PrivateKey), now: now}
	forged, err := forger.Issue("worker-2")
	if err != nil {
		t.Fatal(err)
	}
	c := client(t, Identity{Authority: serverID.Authority, Certificate: forged.Certificate, PrivateKey: forged.PrivateKey}, "coordinator")
	c.Certificates[0].Certificate = append(c.Certificates[0].Certificate, worker.Certificate)
	if _, serverErr, _ := shake(t, server(t, serverID), c); serverErr == nil {
		t.Error("a certificate signed by a worker was believed")
	}
}

func TestBadIdentities(t *testing.T) {
	good := issue(t, authority(t, time.Now()), "worker-1")
	for name, bad := range map[string]Identity{
		"private key": {Authority: good.Authority, Certificate: good.Certificate, PrivateKey: []byte("no key")},
		"authority":   {Authority: []byte("nobody"), Certificate: good.Certificate, PrivateKey: good.PrivateKey},
	} {
		if _, err := bad.Server(); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("a bad %s: %v", name, err)
		}
		if _, err := bad.Client("coordinator"); err == nil {
			t.Errorf("a bad %s: no error", name)
		}
	}
	if _, err := NameOf(tls.ConnectionState{}); err == nil {
		t.Error("NameOf without a certificate: no error")
	}
}
