package precond

import (
	"fmt"
	"math"
	"strings"
)

// complete returns o with defaults filled in, or an error that names every
// fault at once.
func (o Options) complete() (Options, error) {
	var faults []string
	if math.IsNaN(o.Drop) || math.IsInf(o.Drop, 0) {
		faults = append(faults, fmt.Sprintf("the drop tolerance is %v", o.Drop))
	}
	atLeast := func(name string, v *int, standard int) {
		switch {
		case *v < 0:
			faults = append(faults, fmt.Sprintf("%s is %d", name, *v))
		case *v == 0:
			*v = standard
		}
	}
	atLeast("the fill", &o.Fill, 20)
	atLeast("the number of sub-blocks", &o.SubBlocks, 0)
	atLeast("the number of interleaved sub-blocks", &o.Interleave, 0)
	atLeast("the number of threads", &o.Threads, 0)
	atLeast("the number of unknowns a node", &o.Node, 1)
	if len(faults) > 0 {
		return o, fmt.Errorf("precondition: %s", strings.Join(faults, ", "))
	}
	switch {
	case o.Drop == 0:
		o.Drop = 1e-3
	case o.Drop < 0:
		o.Drop = 0
	}
	if o.Each == nil {
		o.Each = func(count int, do func(i int)) {
			for i := range count {
				do(i)
			}
		}
	}
	return o, nil
}
