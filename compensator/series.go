package compensator

import (
	"errors"

	"antelag/scenarios/kind"
)

// series is a Taylor series of the target with fixed coefficients,
//
//	u_k = a₀·x + a₁·v + a₂·a:
//
// what AdaptiveTimeSeries is while it does not learn. It is no kind of its own.
type series struct {
	a0, a1, a2 float64
	names      []Coefficient
}

var _ Compensator = (*series)(nil)

func (*series) Start(_, _ float64)    {}
func (*series) Prime(Input, float64)  {}
func (*series) Memory(func(*float64)) {}

func (c *series) Command(in Input) float64 { return c.a0*in.X + c.a1*in.V + c.a2*in.A }

func (*series) Retune(kind.Values) error { return errors.New("a frozen compensator is not retuned") }

func (c *series) Coefficients(dst []Coefficient) []Coefficient { return append(dst, c.names...) }
