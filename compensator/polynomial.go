package compensator

import (
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// maxOrder is the highest order of Polynomial. Beyond it the weights amplify
// every disturbance by more than 2⁵.
const maxOrder = 4

// Polynomial extrapolates the target by the assumed delay τ, s, along the
// polynomial of order n through the present target and n past ones, τ apart
// (Horiuchi, Inoue, Konno & Namita 1999):
//
//	u_k = Σ_{i=0..n} c_i·x(t_{k+1} − iτ),   c_i = (−1)^i·C(n+1, i+1),
//
// x the target, m, and C the binomial coefficient: n = 1: 2 −1; n = 2:
// 3 −3 1; n = 3: 4 −6 4 −1. Between ticks x goes straight from one target to
// the next, so with iτ = (d+φ)·dt the target is (1−φ)·x_{k+1−d} + φ·x_{k−d}.
//
// The frequency response from x to u is Σ c_i·e^(−jωiτ); where φ ≠ 0 the
// exponential of term i becomes e^(−jωd·dt)·((1−φ) + φ·e^(−jω·dt)). Behind a
// pure delay τ the whole is 1 − (1 − e^(−jωτ))^(n+1). The weights sum to 1,
// so a target at rest is commanded as it is; a polynomial in time of degree n
// is predicted exactly when τ is a whole number of ticks.
//
// Before Start has been called the target counts as 0 for ever. A τ within
// 10⁻⁹ ticks of a whole number of them is taken for it.
type Polynomial struct {
	tick   float64
	order  int
	delay  float64
	weight [maxOrder + 1]float64 // c_i

	// The c_i spread over the ticks around t − iτ: the weight of the present
	// target, and past targets in pairs, because two sums side by side need
	// not wait for each other's additions.
	now   float64
	pairs [maxOrder][2]tap
	count int

	ring []float64 // targets, newest at head
	mask int
	head int
}

// tap is one past target in the sum: so many ticks ago, with this weight.
type tap struct {
	ago    int
	weight float64
}

var _ Compensator = (*Polynomial)(nil)

var polynomialSettings = []kind.Setting{
	kind.Integer("order", "order n of the polynomial").Default(3).Range(0, maxOrder),
	delaySetting("assumed delay τ of the actuator"),
}

var polynomialKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "polynomial",
		Doc:      "extrapolates past targets by the delay along a polynomial",
		Equation: "u = Σ_{i=0..n} (−1)^i·C(n+1, i+1)·x(t − iτ)",
		Source:   "Horiuchi et al. 1999",
		Settings: polynomialSettings,
	},
	New: newPolynomial,
}

func newPolynomial(tick float64, v kind.Values) (Compensator, error) {
	p := &Polynomial{tick: tick}
	if err := p.Retune(v); err != nil {
		return nil, err
	}
	// One entry beyond the oldest instant, for the interpolation, and one
	// because the present target takes a place too.
	p.ring = make([]float64, ringSize(int(maxOrder*maxDelay/tick)+3))
	p.mask = len(p.ring) - 1
	return p, nil
}

// Start makes the past targets x.
func (p *Polynomial) Start(x, _ float64) {
	for i := range p.ring {
		p.ring[i] = x
	}
}

// Prime keeps the past target; a fixed method learns nothing.
func (p *Polynomial) Prime(in Input, _ float64) { p.Command(in) }

// Command returns the weighted sum of present and past targets.
func (p *Polynomial) Command(in Input) float64 {
	ring, mask := p.ring, p.mask
	head := (p.head + 1) & mask
	p.head = head
	ring[head] = in.X
	even, odd := p.now*in.X, 0.0
	for i := range p.pairs[:(p.count+1)/2] {
		t := &p.pairs[i]
		even += t[0].weight * ring[(head-t[0].ago)&mask]
		odd += t[1].weight * ring[(head-t[1].ago)&mask]
	}
	return even + odd
}

// Retune changes order and delay. The history reaches back far enough for
// the largest of both, so the next command is what the new settings would
// have given had they held all along.
func (p *Polynomial) Retune(v kind.Values) error {
	if err := check(p.tick, polynomialSettings, v); err != nil {
		return err
	}
	p.order, p.delay = v.Int("order"), v.Num("delay")
	p.weight = polynomialWeights(p.order)
	p.now, p.count, p.pairs = 0, 0, [maxOrder][2]tap{}
	for i := 0; i <= p.order; i++ {
		at := float64(i) * p.delay / p.tick
		whole := math.Floor(at)
		frac := at - whole
		if near := math.Round(at); math.Abs(at-near) < 1e-9 {
			whole, frac = near, 0
		}
		p.addTap(int(whole), p.weight[i]*(1-frac))
		p.addTap(int(whole)+1, p.weight[i]*frac)
	}
	return nil
}

// polynomialWeights are c_i = (−1)^i·C(n+1, i+1) for i = 0 to n.
func polynomialWeights(order int) (weight [maxOrder + 1]float64) {
	binomial := 1.0
	for i := 0; i <= order; i++ {
		binomial *= float64(order+1-i) / float64(i+1)
		weight[i] = binomial
		if i%2 == 1 {
			weight[i] = -binomial
		}
	}
	return weight
}

// addTap adds a weight to the target so many ticks ago; terms that fall on
// the same tick share one tap.
func (p *Polynomial) addTap(ago int, weight float64) {
	if weight == 0 {
		return
	}
	if ago == 0 {
		p.now += weight
		return
	}
	for i := range p.count {
		if t := &p.pairs[i/2][i%2]; t.ago == ago {
			t.weight += weight
			return
		}
	}
	p.pairs[p.count/2][p.count%2] = tap{ago, weight}
	p.count++
}

var weightNames = [maxOrder + 1]string{"c0", "c1", "c2", "c3", "c4"}

// Coefficients appends the weights c0 to cn and the delay.
func (p *Polynomial) Coefficients(dst []Coefficient) []Coefficient {
	for i, w := range p.weight[:p.order+1] {
		dst = append(dst, Coefficient{weightNames[i], w, quantity.None})
	}
	return append(dst, Coefficient{"delay", p.delay, quantity.Time})
}
