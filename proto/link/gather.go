package link

import (
	"bufio"
	"context"
	"net"
	"sync"

	"google.golang.org/grpc/credentials"
)

// Sizes of a connection's buffers: a halo of ordinary size goes to the system in
// one piece instead of one TLS record at a time.
const (
	writeBuffer = 128 << 10
	readBuffer  = 64 << 10
)

// gathering are credentials whose connections gather the TLS records of one write
// into one call of the system, and read ahead. System calls are the larger part of
// what a halo costs.
type gathering struct {
	credentials.TransportCredentials
}

// ClientHandshake implements credentials.TransportCredentials.
func (g gathering) ClientHandshake(ctx context.Context, name string, raw net.Conn) (net.Conn, credentials.AuthInfo, error) {
	records := newRecords(raw)
	secure, info, err := g.TransportCredentials.ClientHandshake(ctx, name, records)
	if err != nil {
		return nil, nil, err
	}
	return &gathered{Conn: secure, records: records}, info, nil
}

// ServerHandshake implements credentials.TransportCredentials.
func (g gathering) ServerHandshake(raw net.Conn) (net.Conn, credentials.AuthInfo, error) {
	records := newRecords(raw)
	secure, info, err := g.TransportCredentials.ServerHandshake(records)
	if err != nil {
		return nil, nil, err
	}
	return &gathered{Conn: secure, records: records}, info, nil
}

// Clone implements credentials.TransportCredentials.
func (g gathering) Clone() credentials.TransportCredentials {
	return gathering{g.TransportCredentials.Clone()}
}

// gathered is a connection above TLS.
type gathered struct {
	net.Conn
	records *records
}

// Write encrypts p and sends all its records at once.
func (c *gathered) Write(p []byte) (int, error) {
	c.records.hold()
	n, err := c.Conn.Write(p)
	if sent := c.records.release(); err == nil && sent != nil {
		return 0, sent
	}
	return n, err
}

// records is a connection below TLS.
type records struct {
	net.Conn
	ahead *bufio.Reader

	mu      sync.Mutex
	held    bool   // guarded by mu; Write gathers
	waiting []byte // guarded by mu
}

func newRecords(raw net.Conn) *records {
	return &records{Conn: raw, ahead: bufio.NewReaderSize(raw, readBuffer)}
}

// Read implements net.Conn.
func (r *records) Read(p []byte) (int, error) { return r.ahead.Read(p) }

// Write implements net.Conn.
func (r *records) Write(p []byte) (int, error) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if !r.held {
		return r.Conn.Write(p)
	}
	r.waiting = append(r.waiting, p...)
	return len(p), nil
}

func (r *records) hold() {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.held = true
}

// release sends what was gathered.
func (r *records) release() error {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.held = false
	if len(r.waiting) == 0 {
		return nil
	}
	_, err := r.Conn.Write(r.waiting)
	r.waiting = r.waiting[:0]
	return err
}
