package plant

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var springKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "spring",
		Doc:      "linear spring",
		Equation: "f = k·y",
		Source:   "Hooke's law",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "stiffness k").Range(0, 1e12),
		},
	},
	New: func(v kind.Values) (Element, error) { return &spring{k: v.Num("stiffness")}, nil },
}

// spring is a linear spring, f = k·y: f the force, N; y the displacement, m;
// k the stiffness, N/m. It stores ½ky², J, and dissipates nothing.
type spring struct{ k, y float64 }

var _ Element = (*spring)(nil)

func (s *spring) Start(y float64) { s.y = y }

func (s *spring) Advance(y, _, _ float64) float64 {
	s.y = y
	return s.k * y
}

func (s *spring) Preview(y, _, _ float64) float64 { return s.k * y }

func (s *spring) Energy() (stored, dissipated float64) { return 0.5 * s.k * s.y * s.y, 0 }

func (s *spring) Stiffness() float64 { return s.k }
