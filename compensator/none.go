package compensator

import "antelag/scenarios/kind"

// None does not compensate: the command is the target,
//
//	u_k = x_{k+1},
//
// u the command and x the target displacement, m. It shows what the actuator
// does when left alone, and is the baseline of every comparison.
type None struct{}

var _ Compensator = (*None)(nil)

var noneKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "none",
		Doc:      "no compensation: the command is the target",
		Equation: "u = x",
		Source:   "common practice",
	},
	New: newNone,
}

func newNone(tick float64, v kind.Values) (Compensator, error) {
	if err := check(tick, nil, v); err != nil {
		return nil, err
	}
	return &None{}, nil
}

// Start does nothing: there is no history.
func (*None) Start(_, _ float64) {}

// Prime does nothing: the method has no past.
func (*None) Prime(Input, float64) {}

// Command returns the target.
func (*None) Command(in Input) float64 { return in.X }

// Retune does nothing: there is nothing to set.
func (*None) Retune(kind.Values) error { return nil }

// Coefficients appends nothing.
func (*None) Coefficients(dst []Coefficient) []Coefficient { return dst }
