package plant

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var gapKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "gap",
		Doc:      "spring behind a gap: pounding, stops, restrainers, slack",
		Equation: "f = k·(y − g) for y > g, k·(y + g) for y < −g, else 0",
		Source:   "linear contact spring, common practice",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "stiffness k once the gap is closed").Range(0, 1e12),
			kind.Number("gap", quantity.Length, "width g of the gap, from zero to contact").Range(0, 10),
			kind.Word("sides", "on which side there is contact: both, plus or minus", "both", "plus", "minus"),
		},
	},
	New: func(v kind.Values) (Element, error) {
		sides := v.Text("sides")
		return &gap{k: v.Num("stiffness"), width: v.Num("gap"), plus: sides != "minus", minus: sides != "plus"}, nil
	},
}

// gap is an elastic spring that is met only behind a gap,
//
//	f = k·(y − g) for y > g,   f = k·(y + g) for y < −g,   f = 0 else,
//
// f the force, N; y the displacement, m; k the stiffness in contact, N/m; g the
// width of the gap, m. With sides = plus there is contact at y > g alone, with
// minus at y < −g alone. It stores ½k·(|y| − g)² in contact, J, and dissipates
// nothing: what hits it bounces.
//
// Its stiffness at rest is that of the open gap, 0, or k where the gap is 0.
// Contact is stiffer than that: an integrator that takes the initial stiffness
// for the largest must resolve k by its step.
type gap struct {
	k, width    float64
	plus, minus bool
	y           float64
}

var _ Element = (*gap)(nil)
var _ Previewer = (*gap)(nil)

func (g *gap) Start(y float64) { g.y = y }

func (g *gap) Advance(y, _, _ float64) float64 {
	g.y = y
	return g.k * g.pressed(y)
}

// Preview returns the force at displacement y, N.
func (g *gap) Preview(y, _, _ float64) float64 { return g.k * g.pressed(y) }

func (g *gap) Energy() (stored, dissipated float64) {
	p := g.pressed(g.y)
	return 0.5 * g.k * p * p, 0
}

// Stiffness returns that at rest at zero, N/m.
func (g *gap) Stiffness() float64 {
	if g.width > 0 {
		return 0
	}
	return g.k
}

// pressed is how far the spring is pressed at displacement y, m.
func (g *gap) pressed(y float64) float64 {
	switch {
	case g.plus && y > g.width:
		return y - g.width
	case g.minus && y < -g.width:
		return y + g.width
	}
	return 0
}
