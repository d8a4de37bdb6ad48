package service

import (
	"context"
	"errors"
	"fmt"
	"sort"

	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/proto"
	"rowstead/worker"
	"rowstead/worker/precond"
)

// placing collects the rows of the block until it is built.
type placing struct {
	block   int
	cuts    []int
	threads int
	settled bool

	start    []int // of the rows so far
	col      []int32
	val      []float64
	vectors  [2][]float64 // right side, guess
	exponent []int16
}

// bounds of what Place may announce.
const (
	mostBlocks  = 1 << 12
	mostThreads = 1 << 10
)

// rows is the number of rows of the block.
func (p *placing) rows() int { return p.cuts[p.block+1] - p.cuts[p.block] }

// take carries out the orders that bring rows and vectors.
func (s *session) take(o order) error {
	if place := o.GetPlace(); place != nil {
		return s.place(place)
	}
	p := &s.placing
	if p.cuts == nil {
		return senseless("rows before their place")
	}
	switch what := o.What.(type) {
	case *proto.Order_Rows:
		return p.takeRows(int(what.Rows.Rows), o.ints, o.floats)
	case *proto.Order_Vector:
		return p.takeVector(what.Vector.Kind, o.ints, o.floats)
	case *proto.Order_Owes:
		return s.takeOwes(int(what.Owes.Peer), o.ints)
	}
	return s.apply(o.GetApply().GetKind())
}

// place makes room for a block, after it has made sure that the room is there.
func (s *session) place(o *proto.Place) error {
	blocks := len(o.Cuts) - 1
	if s.placing.cuts != nil {
		return senseless("a second place")
	}
	if blocks < 1 || blocks > mostBlocks || o.Block < 0 || int(o.Block) >= blocks || o.Entries < 0 || o.Threads < 1 || o.Threads > mostThreads {
		return senseless("block %d of %d with %d entries and %d threads", o.Block, blocks, o.Entries, o.Threads)
	}
	cuts := make([]int, len(o.Cuts))
	for k, c := range o.Cuts {
		if cuts[k] = int(c); (k == 0 && c != 0) || (k > 0 && cuts[k] < cuts[k-1]) || c > 1<<31-1 {
			return senseless("cuts that do not ascend from 0")
		}
	}
	p := placing{block: int(o.Block), cuts: cuts, threads: int(o.Threads)}
	if err := s.fits(12*float64(o.Entries) + 26*float64(p.rows())); err != nil {
		return err
	}
	p.start = make([]int, 1, p.rows()+1)
	p.col, p.val = make([]int32, 0, o.Entries), make([]float64, 0, o.Entries)
	s.placing = p
	if s.options.Threads != nil {
		s.options.Threads(p.threads)
	}
	return nil
}

// fits returns an error unless so many bytes are free.
func (s *session) fits(need float64) error {
	free, err := s.options.Free()
	if err == nil && need > float64(free) {
		return fmt.Errorf("%.0f bytes more are needed, %d are free on its machine", need, free)
	}
	return nil
}

// takeRows appends rows: ints has the entries of each and then all columns.
func (p *placing) takeRows(rows int, ints []int32, values []float64) error {
	if p.settled || rows < 0 || rows > len(ints) || rows > p.rows()-(len(p.start)-1) ||
		len(ints)-rows != len(values) || len(values) > cap(p.val)-len(p.val) {
		return senseless("%d rows of %d entries that have no place", rows, len(values))
	}
	end, last := p.start[len(p.start)-1], int32(p.cuts[len(p.cuts)-1])
	from := end
	for _, n := range ints[:rows] {
		if n < 0 || int(n) > len(values)-(end-from) {
			return senseless("a row of %d entries", n)
		}
		end += int(n)
		p.start = append(p.start, end)
	}
	if end-from != len(values) {
		return senseless("%d entries in rows that hold %d", len(values), end-from)
	}
	for _, c := range ints[rows:] {
		if c < 0 || c >= last {
			return senseless("column %d of %d", c, last)
		}
	}
	p.col, p.val = append(p.col, ints[rows:]...), append(p.val, values...)
	return nil
}

// takeVector appends a part of a vector.
func (p *placing) takeVector(kind proto.Vector_Kind, ints []int32, values []float64) error {
	if kind == proto.Vector_EXPONENT {
		if p.settled || len(p.exponent)+len(ints) > p.rows() {
			return senseless("a scaling that is too long or too late")
		}
		for _, e := range ints {
			if e < -1<<15 || e >= 1<<15 {
				return senseless("a scaling by 2^%d", e)
			}
			p.exponent = append(p.exponent, int16(e))
		}
		return nil
	}
	if kind != proto.Vector_RIGHT && kind != proto.Vector_GUESS {
		return senseless("a vector of kind %d", kind)
	}
	v := &p.vectors[kind]
	if len(*v)+len(values) > p.rows() {
		return senseless("a vector that is too long")
	}
	if *v == nil {
		*v = make([]float64, 0, p.rows())
	}
	*v = append(*v, values...)
	return nil
}

// settle ends the placing of rows: it returns the columns of the halo and knows
// from whom they come.
func (s *session) settle() ([]int32, error) {
	p := &s.placing
	if p.cuts == nil || p.settled || len(p.start)-1 != p.rows() || len(p.val) != cap(p.val) ||
		(len(p.exponent) != 0 && len(p.exponent) != p.rows()) {
		return nil, senseless("rows are missing or were settled before")
	}
	p.settled = true
	lo := p.cuts[p.block]
	needs := partition.Needs(lo, p.start, p.col)
	partition.LocalColumns(lo, p.rows(), needs, p.col, p.col)
	s.plan = &partition.BlockHalo{Block: p.block, Rows: p.rows(), Columns: needs}
	for at := 0; at < len(needs); {
		owner := sort.SearchInts(p.cuts, int(needs[at])+1) - 1
		from := at
		for at < len(needs) && int(needs[at]) < p.cuts[owner+1] {
			at++
		}
		s.plan.Receive = append(s.plan.Receive, partition.Receive{Peer: owner, Lo: from, Hi: at})
	}
	return needs, nil
}

// takeOwes notes which own rows a peer needs; peers come in ascending order.
func (s *session) takeOwes(peer int, rows []int32) error {
	if s.plan == nil || s.block != nil || peer < 0 || peer >= len(s.placing.cuts)-1 || peer == s.placing.block ||
		(len(s.plan.Send) > 0 && s.plan.Send[len(s.plan.Send)-1].Peer >= peer) {
		return senseless("rows that nobody can be owed")
	}
	last := int32(-1)
	for _, row := range rows {
		if row <= last || int(row) >= s.plan.Rows {
			return senseless("row %d is owed after row %d", row, last)
		}
		last = row
	}
	s.plan.Send = append(s.plan.Send, partition.Send{Peer: peer, LocalRows: rows})
	return nil
}

// apply replaces b or x of the block by the vector that came.
func (s *session) apply(kind proto.Vector_Kind) error {
	if s.block == nil || (kind != proto.Vector_RIGHT && kind != proto.Vector_GUESS) || len(s.placing.vectors[kind]) != s.placing.rows() {
		return senseless("a vector that is incomplete or comes too early")
	}
	v := s.placing.vectors[kind]
	s.placing.vectors[kind] = nil
	if kind == proto.Vector_RIGHT {
		s.block.SetRight(v)
		return nil
	}
	s.block.SetGuess(v)
	return nil
}

// build makes the block of everything that came.
func (s *session) build() error {
	p := &s.placing
	if s.plan == nil || len(p.vectors[0]) != p.rows() || (p.vectors[1] != nil && len(p.vectors[1]) != p.rows()) {
		return senseless("a block of which parts are missing")
	}
	if missing := s.exchange.missing(s.plan); missing >= 0 {
		return senseless("no way to the neighbour with block %d", missing)
	}
	c := worker.Config{
		Matrix:   &csr.Matrix{Rows: p.rows(), Cols: p.rows() + len(s.plan.Columns), Start: p.start, Col: p.col, Val: p.val},
		FirstRow: p.cuts[p.block], Plan: s.plan, Exchange: s.exchange,
		Right: p.vectors[0], Guess: p.vectors[1], Threads: p.threads,
	}
	if p.exponent != nil {
		c.RowExponent = p.exponent
	}
	if c.FirstRow%8 != 0 { // as worker.New wants it
		return senseless("a block that begins with row %d, which is no multiple of 8", c.FirstRow)
	}
	s.block = worker.New(c)
	s.placing = placing{block: p.block, cuts: p.cuts, threads: p.threads, settled: true}
	return nil
}

// prepare scales the block and builds its preconditioner.
func (s *session) prepare(ctx context.Context, o *proto.Prepare) (reply, ints, floats, error) {
	if s.block == nil {
		if err := s.build(); err != nil {
			return nil, nil, nil, err
		}
	}
	r, err := s.block.Prepare(ctx, worker.Preparation{
		Precondition: o.Precondition, Options: precond.Options{Node: int(o.Node)}, Conjugate: o.Conjugate,
	})
	if err != nil {
		return nil, nil, nil, err
	}
	told := &proto.Prepared{Kind: r.Kind, Reason: r.Reason, Definite: r.Symmetric && r.PositiveDefinite}
	return &proto.Reply{What: &proto.Reply_Prepared{Prepared: told}}, nil, nil, nil
}

// fetch returns rows of x. The first rows form all of it, so that the parts that
// follow are of the same x.
func (s *session) fetch(o *proto.Fetch) (reply, ints, floats, error) {
	if o.Lo < 0 || o.Hi < o.Lo || int(o.Hi) > s.plan.Rows {
		return nil, nil, nil, senseless("rows [%d, %d) of x", o.Lo, o.Hi)
	}
	if s.solution == nil || o.Lo == 0 {
		s.solution = make([]float64, s.plan.Rows)
		s.block.Solution(s.solution)
	}
	part := s.solution[o.Lo:o.Hi]
	if int(o.Hi) == s.plan.Rows {
		s.solution = nil
	}
	return numbers(), nil, floats{part}, nil
}

// status tells what is held and was moved.
func (s *session) status() reply {
	h := &proto.Held{PeakBytes: s.options.Peak(), HaloBytes: s.exchange.bytes, RelayedBytes: s.exchange.relayedBytes}
	if s.block != nil {
		h.BlockBytes = s.block.Memory().Total()
	}
	return &proto.Reply{What: &proto.Reply_Held{Held: h}}
}

// errNeighbour is wrapped by the errors of halos whose neighbour has gone away.
var errNeighbour = errors.New("a neighbour has gone away")
