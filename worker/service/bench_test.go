package service

import (
	"context"
	"crypto/tls"
	"fmt"
	"io"
	"net"
	"sync"
	"testing"
	"time"

	"google.golang.org/grpc"

	"rowstead/partition"
	"rowstead/proto"
	"rowstead/proto/keys"
	"rowstead/proto/link"
)

// ring makes the exchanges of so many neighbours in a ring, each of which sends
// entries to the one before and the one after, over links of their own.
func ring(t testing.TB, count, entries int) []*exchange {
	t.Helper()
	authority, err := keys.NewAuthority(time.Now())
	if err != nil {
		t.Fatal(err)
	}
	all := make([]*exchange, count)
	addresses := make([]string, count)
	for k := range all {
		s := &session{plan: &partition.BlockHalo{}, placing: placing{cuts: make([]int, count+1)}}
		if s.identity, err = authority.Issue(fmt.Sprintf("worker-%d", k)); err != nil {
			t.Fatal(err)
		}
		for _, peer := range []int{(k + 1) % count, (k + count - 1) % count} {
			s.plan.Receive = append(s.plan.Receive, partition.Receive{Peer: peer, Hi: entries})
		}
		all[k] = newExchange(s)
		server, err := link.Listen("127.0.0.1:0", s.identity, func(r grpc.ServiceRegistrar) { proto.RegisterNeighbourServer(r, all[k]) })
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(server.Stop)
		addresses[k] = server.Address
	}
	for k := range all {
		t.Cleanup(all[k].close)
		before := (k + count - 1) % count
		all[k].expected[fmt.Sprintf("worker-%d", before)] = before
	}
	for k := range all {
		after := (k + 1) % count
		o := &proto.Connect{Dial: []*proto.Connect_Peer{{Block: int32(after), Name: fmt.Sprintf("worker-%d", after), Address: addresses[after]}}}
		r, _, _, err := all[k].connect(context.Background(), o)
		if err != nil || len(r.GetConnected().Unreached) > 0 {
			t.Fatalf("connect %d: %v, %v", k, r, err)
		}
	}
	return all
}

// timed runs a party for every member of the ring that many times and returns
// the time of one round.
func timed(b *testing.B, count int, party func(k, times int) error) time.Duration {
	b.Helper()
	const times = 50
	var all sync.WaitGroup
	start := time.Now()
	for k := range count {
		all.Go(func() {
			if err := party(k, times); err != nil {
				b.Error(err)
			}
		})
	}
	all.Wait()
	return time.Since(start) / times
}

// rawRing is the same ring over plain TCP: after[k] is connected to before[k+1].
func rawRing(b *testing.B, count int) (after, before []net.Conn) {
	b.Helper()
	after, before = make([]net.Conn, count), make([]net.Conn, count)
	for k := range count {
		l, err := net.Listen("tcp", "127.0.0.1:0")
		if err != nil {
			b.Fatal(err)
		}
		accepted := make(chan net.Conn, 1)
		go func() {
			c, _ := l.Accept()
			accepted <- c
		}()
		if after[k], err = net.Dial("tcp", l.Addr().String()); err != nil {
			b.Fatal(err)
		}
		before[(k+1)%count] = <-accepted
		l.Close()
		for _, c := range []net.Conn{after[k], before[(k+1)%count]} {
			c.(*net.TCPConn).SetReadBuffer(1 << 20) // a round fits, so that nobody waits to write
			c.(*net.TCPConn).SetWriteBuffer(1 << 20)
			b.Cleanup(func() { c.Close() })
		}
	}
	return after, before
}

// A halo round of a ring of four with 80 KiB to each neighbour, beside plain TCP
// and TLS over TCP with the same bytes in the same run. Metrics are the time of
// each and the ratios, from interleaved batches, the smallest of each kind.
func BenchmarkHaloRound(b *testing.B) {
	const count, entries = 4, 10 << 10
	all := ring(b, count, entries)
	after, before := rawRing(b, count)
	safeAfter, safeBefore := rawRing(b, count)
	secure(b, all, safeAfter, safeBefore)
	ctx := context.Background()
	wire := func(k, times int) error {
		x, next, last := all[k], (k+1)%count, (k+count-1)%count
		out, in := [2][]float64{make([]float64, entries), make([]float64, entries)}, make([]float64, entries)
		for i := range times {
			for _, peer := range []int{next, last} {
				if err := x.Post(ctx, peer, out[i%2]); err != nil {
					return err
				}
			}
			for _, peer := range []int{next, last} {
				if err := x.Collect(ctx, peer, in); err != nil {
					return err
				}
			}
		}
		return nil
	}
	plain := func(after, before []net.Conn, k, times int) error {
		out, in := make([]byte, 8*entries), make([]byte, 8*entries)
		for range times {
			for _, c := range []net.Conn{after[k], before[k]} {
				if _, err := c.Write(out); err != nil {
					return err
				}
			}
			for _, c := range []net.Conn{after[k], before[k]} {
				if _, err := io.ReadFull(c, in); err != nil {
					return err
				}
			}
		}
		return nil
	}
	tcp := func(k, times int) error { return plain(after, before, k, times) }
	safe := func(k, times int) error { return plain(safeAfter, safeBefore, k, times) }
	least := [3]time.Duration{time.Hour, time.Hour, time.Hour}
	b.SetBytes(2 * count * 8 * entries)
	for b.Loop() {
		for i, party := range []func(k, times int) error{wire, tcp, safe} {
			least[i] = min(least[i], timed(b, count, party))
		}
	}
	b.ReportMetric(float64(least[0].Microseconds()), "us/wire-round")
	b.ReportMetric(float64(least[1].Microseconds()), "us/tcp-round")
	b.ReportMetric(float64(least[2].Microseconds()), "us/tls-round")
	b.ReportMetric(float64(least[0])/float64(least[1]), "wire/tcp")
	b.ReportMetric(float64(least[0])/float64(least[2]), "wire/tls")
}

// secure puts TLS, as links have it, over the connections of a ring.
func secure(b *testing.B, all []*exchange, after, before []net.Conn) {
	b.Helper()
	for k := range after {
		next := (k + 1) % len(after)
		client, err := all[k].s.identity.Client(fmt.Sprintf("worker-%d", next))
		if err != nil {
			b.Fatal(err)
		}
		server, err := all[next].s.identity.Server()
		if err != nil {
			b.Fatal(err)
		}
		c, s := tls.Client(after[k], client), tls.Server(before[next], server)
		shaken := make(chan error, 1)
		go func() { shaken <- s.Handshake() }()
		if err := c.Handshake(); err != nil {
			b.Fatal(err)
		}
		if err := <-shaken; err != nil {
			b.Fatal(err)
		}
		after[k], before[next] = c, s
	}
}
