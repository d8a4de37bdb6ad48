package service

import (
	"context"
	"math"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"
	protobuf "google.golang.org/protobuf/proto"

	"rowstead/proto"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// alone is a session without a connection.
func alone() *session {
	s := &session{options: Options{
		Peak: func() int64 { return 1 << 20 },
		Free: func() (int64, error) { return 1 << 20, nil },
	}}
	s.exchange = newExchange(s)
	return s
}

// do carries out an order with numbers.
func (s *session) do(what any, ints []int32, floats ...float64) error {
	o := order{Order: &proto.Order{}, ints: ints, floats: floats}
	switch w := what.(type) {
	case *proto.Place:
		o.What = &proto.Order_Place{Place: w}
	case *proto.Rows:
		o.What = &proto.Order_Rows{Rows: w}
	case *proto.Vector:
		o.What = &proto.Order_Vector{Vector: w}
	case *proto.Settle:
		o.What = &proto.Order_Settle{Settle: w}
	case *proto.Owes:
		o.What = &proto.Order_Owes{Owes: w}
	case *proto.Prepare:
		o.What = &proto.Order_Prepare{Prepare: w}
	case *proto.Fetch:
		o.What = &proto.Order_Fetch{Fetch: w}
	case *proto.Apply:
		o.What = &proto.Order_Apply{Apply: w}
	case *proto.Cycle:
		o.What = &proto.Order_Start{Start: w}
	case *proto.Step:
		o.What = &proto.Order_Advance{Advance: w}
	case *proto.Correction:
		o.What = &proto.Order_Correct{Correct: w}
	}
	_, _, _, err := s.carryOut(context.Background(), o)
	return err
}

// placed is a session that holds the one block of a tridiagonal matrix of 16 rows.
func placed(t testing.TB) *session {
	t.Helper()
	s := alone()
	var ints, cols []int32
	var vals []float64
	for i := range int32(16) {
		n := int32(0)
		for _, c := range []int32{i - 1, i, i + 1} {
			if c >= 0 && c < 16 {
				cols, vals, n = append(cols, c), append(vals, float64(1+3*(1-abs(c-i)))), n+1
			}
		}
		ints = append(ints, n)
	}
	for _, err := range []error{
		s.do(&proto.Place{Cuts: []int64{0, 16}, Entries: int64(len(vals)), Threads: 1}, nil),
		s.do(&proto.Rows{Rows: 16}, append(ints, cols...), vals...),
		s.do(&proto.Vector{}, nil, vals[:16]...),
		s.do(&proto.Settle{}, nil),
		s.do(&proto.Prepare{Precondition: "none"}, nil),
	} {
		if err != nil {
			t.Fatal(err)
		}
	}
	t.Cleanup(s.block.Close)
	return s
}

func abs(v int32) int32 { return max(v, -v) }

func TestSenselessOrders(t *testing.T) {
	two := &proto.Place{Cuts: []int64{0, 8, 16}, Entries: 3, Threads: 1}
	for name, c := range map[string]struct {
		first, order any
		ints         []int32
		floats       []float64
	}{
		"rows without a place":        {nil, &proto.Rows{Rows: 1}, []int32{1, 0}, []float64{1}},
		"no cuts":                     {nil, &proto.Place{Threads: 1}, nil, nil},
		"cuts that descend":           {nil, &proto.Place{Cuts: []int64{0, 8, 4}, Threads: 1}, nil, nil},
		"cuts beyond the columns":     {nil, &proto.Place{Cuts: []int64{0, 1 << 40}, Threads: 1}, nil, nil},
		"a block beyond the last":     {nil, &proto.Place{Block: 1, Cuts: []int64{0, 8}, Threads: 1}, nil, nil},
		"more threads than any":       {nil, &proto.Place{Cuts: []int64{0, 8}, Threads: 1 << 20}, nil, nil},
		"more entries than fit":       {nil, &proto.Place{Cuts: []int64{0, 8}, Entries: 1 << 50, Threads: 1}, nil, nil},
		"a second place":              {two, two, nil, nil},
		"a column beyond the last":    {two, &proto.Rows{Rows: 1}, []int32{1, 16}, []float64{1}},
		"a negative column":           {two, &proto.Rows{Rows: 1}, []int32{1, -1}, []float64{1}},
		"a row of a negative length":  {two, &proto.Rows{Rows: 2}, []int32{2, -1, 0}, []float64{1}},
		"rows that hold fewer":        {two, &proto.Rows{Rows: 1}, []int32{1, 0, 1}, []float64{1, 2}},
		"values without columns":      {two, &proto.Rows{Rows: 1}, []int32{1}, []float64{1}},
		"more entries than announced": {two, &proto.Rows{Rows: 1}, []int32{4, 0, 1, 2, 3}, []float64{1, 2, 3, 4}},
		"more rows than its own":      {two, &proto.Rows{Rows: 9}, make([]int32, 9), nil},
		"too long a vector":           {two, &proto.Vector{}, nil, make([]float64, 9)},
		"a vector of no kind":         {two, &proto.Vector{Kind: 7}, nil, []float64{1}},
		"a scaling beyond all":        {two, &proto.Vector{Kind: proto.Vector_EXPONENT}, []int32{1 << 15}, nil},
		"settled too early":           {two, &proto.Settle{}, nil, nil},
		"owed before it is settled":   {two, &proto.Owes{Peer: 1}, []int32{0}, nil},
		"prepared before it is there": {two, &proto.Prepare{Precondition: "none"}, nil, nil},
		"a verb before it is there":   {two, &proto.Step{}, nil, []float64{1}},
	} {
		s := alone()
		if c.first != nil {
			if err := s.do(c.first, nil); err != nil {
				t.Fatalf("%s: %v", name, err)
			}
		}
		if err := s.do(c.order, c.ints, c.floats...); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestSenselessVerbs(t *testing.T) {
	s := placed(t)
	for name, c := range map[string]struct {
		order  any
		floats []float64
		want   proto.Failed_Kind
	}{
		"a step without a norm":          {&proto.Step{}, nil, proto.Failed_INPUT},
		"a step before a cycle":          {&proto.Step{}, []float64{1}, proto.Failed_REFUSED},
		"a basis that does not fit":      {&proto.Cycle{Capacity: 1 << 19, Window: 2, Form: "double"}, nil, proto.Failed_OTHER},
		"a basis beyond all":             {&proto.Cycle{Capacity: 1 << 60, Window: 2, Form: "double"}, nil, proto.Failed_INPUT},
		"a form that there is not":       {&proto.Cycle{Capacity: 3, Window: 2, Form: "wooden"}, nil, proto.Failed_REFUSED},
		"a correction that is too short": {&proto.Correction{Y: 3}, []float64{1}, proto.Failed_INPUT},
		"one of a negative length":       {&proto.Correction{Y: -1, Yu: 2}, []float64{1}, proto.Failed_INPUT},
		"directions that do not fit":     {&proto.Correction{Directions: 1 << 20, HasT: true}, nil, proto.Failed_OTHER},
		"rows of x that there are not":   {&proto.Fetch{Lo: 3, Hi: 17}, nil, proto.Failed_INPUT},
		"a vector that is incomplete":    {&proto.Apply{}, nil, proto.Failed_INPUT},
	} {
		err := s.do(c.order, nil, c.floats...)
		if err == nil || failed(err).Kind != c.want {
			t.Errorf("%s: %v, want kind %v", name, err, c.want)
		}
	}
	if err := s.do(&proto.Cycle{Capacity: 3, Window: 2, Form: "double"}, nil); err != nil {
		t.Errorf("a good cycle after all that: %v", err)
	}
}

// Whatever orders come, in whatever order, the worker answers or refuses.
func FuzzOrders(f *testing.F) {
	add := func(orders ...*proto.Order) {
		var b []byte
		for _, o := range orders {
			text, err := protobuf.Marshal(o)
			if err != nil {
				f.Fatal(err)
			}
			b = append(append(b, byte(len(text))), text...)
		}
		f.Add(b, 3.5)
	}
	start := &proto.Order{What: &proto.Order_Start{Start: &proto.Cycle{Seed: 1, SketchRows: 64, Zeta: 4, Capacity: 4, Window: 2, Form: "double"}}}
	step := &proto.Order{What: &proto.Order_Advance{Advance: &proto.Step{Product: true, Dots: 1, SketchW: true}}}
	add(start, step, step, &proto.Order{What: &proto.Order_Sketches{Sketches: &proto.Range{To: 2}}})
	add(start, step, &proto.Order{What: &proto.Order_Correct{Correct: &proto.Correction{Y: 1, Directions: 1, HasT: true}}}, &proto.Order{What: &proto.Order_Keep{Keep: &proto.Empty{}}})
	add(&proto.Order{What: &proto.Order_Prepare{Prepare: &proto.Prepare{Precondition: "ilut", Conjugate: true}}}, &proto.Order{What: &proto.Order_StartConjugate{}}, &proto.Order{What: &proto.Order_Direct{}})
	add(&proto.Order{What: &proto.Order_Rows{Rows: &proto.Rows{Rows: 1}}}, &proto.Order{What: &proto.Order_Fetch{Fetch: &proto.Fetch{Hi: 16}}})
	f.Fuzz(func(t *testing.T, b []byte, number float64) {
		s := placed(t)
		for range 12 {
			if len(b) == 0 || len(b) < 1+int(b[0]) {
				return
			}
			o := order{Order: &proto.Order{}, floats: []float64{number, 1, math.Pi}[:len(b)%4%3+1], ints: []int32{int32(len(b)), 0}}
			err := protobuf.Unmarshal(b[1:1+b[0]], o.Order)
			b = b[1+b[0]:]
			if err != nil || o.GetConnect() != nil { // which would call whoever it names
				continue
			}
			s.carryOut(context.Background(), o)
		}
	})
}

// Halos arrive whole and in order, whatever their length, and neighbours who both
// post long ones first do not wait for each other.
func TestRing(t *testing.T) {
	for _, entries := range []int{1, 1000, 300_000} {
		all := ring(t, 3, entries)
		var parties sync.WaitGroup
		for k, x := range all {
			parties.Go(func() {
				in := make([]float64, entries)
				for round := range 4 {
					for peer := range all {
						out := make([]float64, entries)
						out[0], out[entries-1] = float64(10*k+peer), float64(round)
						if peer != k && x.Post(t.Context(), peer, out) != nil {
							t.Error("a post failed")
						}
					}
					for peer := range all {
						if peer == k {
							continue
						}
						err := x.Collect(t.Context(), peer, in)
						if err != nil || in[entries-1] != float64(round) || (entries > 1 && in[0] != float64(10*peer+k)) {
							t.Errorf("%d entries, round %d: %v, %v from %d, %v", entries, round, in[0], in[entries-1], peer, err)
						}
					}
				}
			})
		}
		parties.Wait()
	}
}

// A halo of another length, a verb that is cancelled and a neighbour that goes
// away are errors, told apart.
func TestExchangeFailures(t *testing.T) {
	all := ring(t, 3, 10)
	if err := all[0].Post(t.Context(), 1, make([]float64, 5)); err != nil {
		t.Fatal(err)
	}
	if err := all[1].Collect(t.Context(), 0, make([]float64, 6)); err == nil || !strings.Contains(err.Error(), "halo of block 1: 5 entries came, expected 6") {
		t.Errorf("another length: %v", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	time.AfterFunc(time.Millisecond, cancel)
	if err := all[1].Collect(ctx, 0, make([]float64, 6)); failed(err).Kind != proto.Failed_CANCELLED {
		t.Errorf("cancelled: %v", err)
	}
	all[2].close()
	if err := all[1].Collect(t.Context(), 2, make([]float64, 6)); failed(err).Kind != proto.Failed_NEIGHBOUR {
		t.Errorf("gone away: %v", err)
	}
}
