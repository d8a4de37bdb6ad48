package service

import (
	"context"

	"rowstead/proto"
	"rowstead/worker"
	"rowstead/worker/basis"
)

// answer parts: the control part and the numbers of a reply.
type (
	reply  = *proto.Reply
	ints   = []int32
	floats = [][]float64
)

func done() reply { return &proto.Reply{What: &proto.Reply_Done{Done: &proto.Empty{}}} }

func numbers() reply { return &proto.Reply{What: &proto.Reply_Numbers{Numbers: &proto.Empty{}}} }

// carryOut does what o asks for.
func (s *session) carryOut(ctx context.Context, o order) (reply, ints, floats, error) {
	switch what := o.What.(type) {
	case *proto.Order_Place, *proto.Order_Rows, *proto.Order_Vector, *proto.Order_Owes, *proto.Order_Apply:
		return done(), nil, nil, s.take(o)
	case *proto.Order_Settle:
		needs, err := s.settle()
		return &proto.Reply{What: &proto.Reply_Needs{Needs: &proto.Needs{}}}, needs, nil, err
	case *proto.Order_Connect:
		return s.exchange.connect(ctx, what.Connect)
	case *proto.Order_Prepare:
		return s.prepare(ctx, what.Prepare)
	case *proto.Order_Status:
		return s.status(), nil, nil, nil
	}
	if s.block == nil {
		return nil, nil, nil, senseless("a verb before the rows are prepared")
	}
	return s.verb(ctx, o)
}

// verb carries out an order about the block.
func (s *session) verb(ctx context.Context, o order) (reply, ints, floats, error) {
	switch what := o.What.(type) {
	case *proto.Order_Fetch:
		return s.fetch(what.Fetch)
	case *proto.Order_Advance:
		return s.advance(ctx, what.Advance, o.floats)
	case *proto.Order_Direct, *proto.Order_Move, *proto.Order_StartConjugate:
		return s.conjugate(ctx, o)
	case *proto.Order_Gradient:
		p, err := s.block.Gradient(ctx)
		return numbers(), nil, pair(p), err
	case *proto.Order_Probe:
		c, err := correction(what.Probe, o.floats)
		if err != nil {
			return nil, nil, nil, err
		}
		p, err := s.block.Probe(ctx, c)
		return numbers(), nil, pair(p), err
	case *proto.Order_Reduce:
		r, err := s.block.Reduce(ctx, o.floats)
		return &proto.Reply{What: &proto.Reply_Sums{Sums: &proto.Sums{Dots: int64(len(r.Dots))}}}, nil, floats{r.Dots, {r.WW}}, err
	case *proto.Order_Sketches:
		r, err := s.block.Sketches(ctx, int(what.Sketches.From), int(what.Sketches.To))
		return numbers(), nil, floats{r.Sketch, r.Hold}, err
	case *proto.Order_Recycle:
		if err := s.roomFor(what.Recycle); err != nil {
			return nil, nil, nil, err
		}
		r, err := s.block.Recycle(ctx, cycle(what.Recycle))
		return numbers(), nil, floats{r.SU, r.SAZ, r.HoldAZ}, err
	case *proto.Order_Keep:
		return done(), nil, nil, s.block.Keep(ctx)
	case *proto.Order_Forget:
		return done(), nil, nil, s.block.Forget(ctx)
	}
	return s.residual(ctx, o)
}

// residual carries out the verbs that answer with residuals.
func (s *session) residual(ctx context.Context, o order) (reply, ints, floats, error) {
	var r worker.ResidualSums
	var err error
	switch what := o.What.(type) {
	case *proto.Order_Start:
		if err = s.roomFor(what.Start); err != nil {
			break
		}
		if r, err = s.block.Start(ctx, cycle(what.Start)); err == nil {
			s.cycle, s.vectors = cycle(what.Start), 0
		}
	case *proto.Order_Check:
		r, err = s.block.Check(ctx)
	case *proto.Order_Try, *proto.Order_Correct:
		form := o.GetTry()
		verb := s.block.Try
		if form == nil {
			form, verb = o.GetCorrect(), s.block.Correct
		}
		var c worker.Correction
		if c, err = correction(form, o.floats); err == nil {
			err = s.fits(3 * 8 * float64(s.plan.Rows) * float64(c.Directions))
		}
		if err == nil {
			r, err = verb(ctx, c)
		}
	default:
		return nil, nil, nil, senseless("an order of an unknown kind")
	}
	if err != nil {
		return nil, nil, nil, err
	}
	control, numbers := told(r)
	return &proto.Reply{What: &proto.Reply_Residuals{Residuals: control}}, nil, floats{numbers}, nil
}

// told puts residuals into the words and numbers of the wire.
func told(r worker.ResidualSums) (*proto.Residuals, []float64) {
	out := make([]float64, 0, 34+len(r.WorstError))
	for _, sum := range []worker.Squares{
		r.Inner, r.InnerRight, r.True, r.Right, r.Scaled, r.ScaledRight, r.TrueFloor, r.ScaledFloor, r.Solution, r.InnerMatrix,
	} {
		out = append(out, sum[:]...)
	}
	out = append(out, r.ResidualMax, r.RightMax, r.SolutionMax, r.MatrixMax)
	control := &proto.Residuals{Finite: r.Finite, Products: int64(r.Products)}
	for _, row := range r.WorstRow {
		control.WorstRow = append(control.WorstRow, int64(row))
	}
	return control, append(out, r.WorstError...)
}

// advance carries out a step.
func (s *session) advance(ctx context.Context, step *proto.Step, numbers []float64) (reply, ints, floats, error) {
	if len(numbers) == 0 {
		return nil, nil, nil, senseless("a step without a norm")
	}
	last := len(numbers) - 1
	s.exchange.counting = true
	r, err := s.block.Advance(ctx, worker.Step{
		Lo: int(step.Lo), H: numbers[:last], Norm: numbers[last],
		Product: step.Product, Dots: int(step.Dots), SketchW: step.SketchW,
	})
	s.exchange.counting = false
	if err != nil {
		return nil, nil, nil, err
	}
	s.vectors++
	sums := &proto.Sums{Gram: int64(len(r.Gram)), Dots: int64(len(r.Dots)), SketchW: int64(len(r.SketchW)), HoldW: int64(len(r.HoldW))}
	return &proto.Reply{What: &proto.Reply_Sums{Sums: sums}}, nil, floats{r.Gram, r.Dots, {r.WW}, r.SketchW, r.HoldW}, nil
}

// conjugate carries out the verbs of conjugate gradients.
func (s *session) conjugate(ctx context.Context, o order) (reply, ints, floats, error) {
	var r worker.ConjugateSums
	var err error
	_, starts := o.What.(*proto.Order_StartConjugate)
	if !starts && len(o.floats) != 1 {
		return nil, nil, nil, senseless("a step of conjugate gradients with %d coefficients", len(o.floats))
	}
	s.exchange.counting = !starts
	switch o.What.(type) {
	case *proto.Order_StartConjugate:
		r, err = s.block.StartConjugate(ctx)
	case *proto.Order_Direct:
		r, err = s.block.Direct(ctx, o.floats[0])
	default:
		r, err = s.block.Move(ctx, o.floats[0])
	}
	s.exchange.counting = false
	return numbers(), nil, floats{{r.RR, r.RZ}}, err
}

func pair(p worker.PairSums) floats { return floats{p.First[:], p.Second[:]} }

// mostVectors bounds the lengths of a cycle.
const mostVectors = 1 << 20

// roomFor returns an error unless the basis and the sketches of c fit what is free
// beside those of the largest cycle so far.
func (s *session) roomFor(c *proto.Cycle) error {
	if c.Capacity > mostVectors || c.Window > c.Capacity+mostVectors || c.SketchRows > mostVectors*64 || c.SketchRows < 0 {
		return senseless("a cycle of %d vectors, window %d, with %d sketch rows", c.Capacity, c.Window, c.SketchRows)
	}
	vector, kept := 8*float64(s.plan.Rows), float64(c.Capacity)
	switch c.Form {
	case basis.Single:
		vector /= 2
	case basis.Replay:
		kept = min(kept, float64(c.Window)+4)
	}
	need := vector*kept + 8*float64(c.Capacity)*float64(c.SketchRows+worker.HoldRows)
	if err := s.fits(need - s.room); err != nil {
		return err
	}
	s.room = max(s.room, need)
	return nil
}

func cycle(c *proto.Cycle) worker.Cycle {
	return worker.Cycle{
		Seed: c.Seed, SketchRows: int(c.SketchRows), Zeta: int(c.Zeta),
		Capacity: int(c.Capacity), Window: int(c.Window), Form: c.Form,
	}
}

// correction takes the numbers of a Correction apart. Whether they fit the basis
// is the block's to say.
func correction(c *proto.Correction, numbers []float64) (worker.Correction, error) {
	most := int64(len(numbers))
	if c.Y < 0 || c.Yu < 0 || c.Directions < 0 || c.Directions > mostVectors || c.Y > most || c.Yu > most-c.Y {
		return worker.Correction{}, senseless("a correction of %d, %d and %d directions with %d numbers", c.Y, c.Yu, c.Directions, most)
	}
	width := c.Y + c.Yu
	out := worker.Correction{Y: numbers[:c.Y:c.Y], Directions: int(c.Directions)}
	if c.HasYu {
		out.YU = numbers[c.Y:width:width]
	}
	if c.HasT {
		out.T = numbers[width:]
	}
	return out, nil
}
