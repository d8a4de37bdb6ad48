package method_test

import (
	"context"
	"errors"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
	"rowstead/partition/samples/problems"
)

var errBroken = errors.New("the wire broke")

// failing is a Space whose n-th verb fails; all others pass through.
type failing struct {
	*spacetest.Simple
	left int
}

func (f *failing) fail() error {
	f.left--
	if f.left == 0 {
		return errBroken
	}
	return nil
}

func (f *failing) Start(ctx context.Context, c method.Cycle) (method.Residuals, error) {
	if err := f.fail(); err != nil {
		return method.Residuals{}, err
	}
	return f.Simple.Start(ctx, c)
}

func (f *failing) Advance(ctx context.Context, s method.Step) (method.Stepped, error) {
	if err := f.fail(); err != nil {
		return method.Stepped{}, err
	}
	return f.Simple.Advance(ctx, s)
}

func (f *failing) Sketches(ctx context.Context, from, to int) (sb, hold []float64, err error) {
	if err := f.fail(); err != nil {
		return nil, nil, err
	}
	return f.Simple.Sketches(ctx, from, to)
}

func (f *failing) Reduce(ctx context.Context, h []float64) ([]float64, float64, error) {
	if err := f.fail(); err != nil {
		return nil, 0, err
	}
	return f.Simple.Reduce(ctx, h)
}

func (f *failing) Try(ctx context.Context, c method.Correction) (method.Residuals, error) {
	if err := f.fail(); err != nil {
		return method.Residuals{}, err
	}
	return f.Simple.Try(ctx, c)
}

func (f *failing) Correct(ctx context.Context, c method.Correction) (method.Residuals, int, error) {
	if err := f.fail(); err != nil {
		return method.Residuals{}, 0, err
	}
	return f.Simple.Correct(ctx, c)
}

func (f *failing) Keep(ctx context.Context) error {
	if err := f.fail(); err != nil {
		return err
	}
	return f.Simple.Keep(ctx)
}

func (f *failing) Recycle(ctx context.Context, next method.Cycle) (method.Recycled, error) {
	if err := f.fail(); err != nil {
		return method.Recycled{}, err
	}
	return f.Simple.Recycle(ctx, next)
}

func (f *failing) Gradient(ctx context.Context) (float64, float64, error) {
	if err := f.fail(); err != nil {
		return 0, 0, err
	}
	return f.Simple.Gradient(ctx)
}

func (f *failing) Probe(ctx context.Context, c method.Correction) (float64, float64, error) {
	if err := f.fail(); err != nil {
		return 0, 0, err
	}
	return f.Simple.Probe(ctx, c)
}

// Whatever verb fails, and whenever, the error comes out and no verdict with it;
// a panel behind is waited for.
func TestEveryFailureComesOut(t *testing.T) {
	for _, kind := range []string{method.Sketched, method.Orthogonal} {
		a := problems.Recirculating2D(12, 50, problems.Central)
		b := problems.NormalVector(a.Rows, 5)
		for call := 1; ; call++ {
			running := 0
			sp := &failing{Simple: spacetest.New(spacetest.Problem{Matrix: a, Right: b}), left: call}
			res, err := method.Solve(context.Background(), sp, method.Options{Method: kind, Cycle: 20, Recycle: 4, Behind: func(task func()) func() {
				running++
				task()
				return func() { running-- }
			}})
			if running != 0 {
				t.Fatalf("%s, call %d: %d panels were not waited for", kind, call, running)
			}
			if err == nil {
				if !res.Met || call < 20 {
					t.Fatalf("%s: no failure from call %d on, met %v %q", kind, call, res.Met, res.Reason)
				}
				t.Logf("%s: %d verbs, each failed once", kind, call-1)
				break
			}
			if !errors.Is(err, errBroken) || res.Met {
				t.Fatalf("%s, call %d: met %v, error %v", kind, call, res.Met, err)
			}
		}
	}
}
