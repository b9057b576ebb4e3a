package plant

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"antelag/scenarios/kind"
)

// through carries an element along straight lines through the given turning
// points, each in so many equal steps at a speed, m/s.
func through(e Element, steps int, speed float64, points ...float64) (f float64) {
	for i := 1; i < len(points); i++ {
		a, b := points[i-1], points[i]
		for k := 1; k <= steps; k++ {
			y := a + (b-a)*float64(k)/float64(steps)
			f = e.Advance(y, math.Copysign(speed, b-a), math.Abs(b-a)/float64(steps)/speed)
		}
	}
	return f
}

// A full cycle of an elastoplastic spring dissipates 4·F_y·(u_m − u_y), that
// of one with kinematic hardening (1−h) of it. The knees fall on steps, where
// the trapezoid rule is exact.
func TestBilinearLoopEnergy(t *testing.T) {
	const k, uy, um = 2e7, 0.01, 0.05 // the way back yields after 2u_y of 10u_y
	for _, h := range []float64{0, 0.02, 0.3, 1} {
		for _, steps := range []int{10, 50} {
			e := element(t, "bilinear", set{"stiffness": k, "yield_displacement": uy, "hardening": h})
			e.Start(0)
			through(e, steps, 1, 0, um, -um)
			stored0, before := e.Energy()
			through(e, steps, 1, -um, um, -um)
			stored, after := e.Energy()
			want := 4 * (1 - h) * k * uy * (um - uy)
			near(t, fmt.Sprintf("h = %v in %d steps", h, steps), after-before, want, 1e-13*4*k*uy*um)
			near(t, "stored is what it was", stored, stored0, 1e-13*stored)
		}
	}
}

// Yield force, slope behind it, elastic range of 2·F_y however far hardening
// moved it, and a path in one step or many.
func TestBilinearReturnMapping(t *testing.T) {
	const k, uy, h = 2e7, 0.01, 0.1
	fy := k * uy
	b := element(t, "bilinear", set{"stiffness": k, "yield_displacement": uy, "hardening": h})
	b.Start(0)
	for _, c := range []struct{ y, f float64 }{
		{0.005, 0.5 * fy}, {0.01, fy}, {0.02, (1 + h) * fy}, {0.11, (1 + 10*h) * fy},
		{0.10, (1 + 10*h - 1) * fy}, {0.09, (1 + 10*h - 2) * fy}, {0.08, (1 + 10*h - 2 - h) * fy},
		{0.09, (10*h - h) * fy}, {-0.01, -fy}, {-0.11, -(1 + 10*h) * fy},
	} {
		near(t, fmt.Sprintf("force at %v m", c.y), b.Advance(c.y, 0, 0), c.f, 1e-14*20*fy)
	}
	r := rand.New(rand.NewPCG(13, 14))
	one := element(t, "bilinear", set{"stiffness": k, "yield_displacement": uy, "hardening": h})
	many := element(t, "bilinear", set{"stiffness": k, "yield_displacement": uy, "hardening": h})
	one.Start(0.004)
	many.Start(0.004)
	was := 0.004
	for range 500 {
		y := 0.03 * r.NormFloat64()
		near(t, "one step or many", one.Advance(y, 0, 0), through(many, 17, 1, was, y), 1e-13*10*fy)
		was = y
	}
	// An elastic motion does not drift.
	one.Start(0.05)
	first := one.Advance(0.05, 0, 0)
	for range 100000 {
		one.Advance(0.05-0.01*r.Float64(), 0, 0)
	}
	near(t, "after a hundred thousand elastic moves", one.Advance(0.05, 0, 0), first, 0)
}

// At constant speed a full cycle dissipates 4μN·(u_m − u_y), u_y = μN/k.
func TestFrictionLoopEnergy(t *testing.T) {
	const k, n, slow, fast, vr, um = 1e8, 1e6, 0.04, 0.1, 0.03, 0.01
	for _, v := range []float64{1e-6, 0.01, 0.03, 0.2, 5} {
		mu := fast - (fast-slow)*math.Exp(-v/vr)
		uy := mu * n / k
		e := element(t, "friction", set{"stiffness": k, "normal_force": n, "slow": slow, "fast": fast, "speed": vr})
		e.Start(0)
		through(e, 10, v, 0, um, -um)
		_, before := e.Energy()
		// Turning points at which the force is at its bound, and the knee
		// 2u_y behind them, fall on steps.
		for _, sign := range []float64{1, -1} {
			through(e, 10, v, -sign*um, sign*(-um+2*uy))
			f := through(e, 10, v, sign*(-um+2*uy), sign*um)
			near(t, fmt.Sprintf("force of slip at %v m/s", v), f, sign*mu*n, 1e-14*mu*n)
		}
		_, after := e.Energy()
		near(t, fmt.Sprintf("a cycle at %v m/s", v), after-before, 4*mu*n*(um-uy), 1e-12*mu*n*um)
	}
}

// The coefficient of friction at rest, at v_r and far above; and when sliding
// slows, the force follows it down.
func TestFrictionFollowsTheSpeed(t *testing.T) {
	const n = 1e6
	for _, c := range []struct{ slow, fast float64 }{{0.04, 0.1}, {0.1, 0.04}, {0.07, 0.07}} {
		e := element(t, "friction", set{"stiffness": 1e9, "normal_force": n, "slow": c.slow, "fast": c.fast, "speed": 0.02})
		e.Start(0)
		y := 0.0
		for _, s := range []struct{ v, left float64 }{{0, 1}, {0.02, math.Exp(-1)}, {0.04, math.Exp(-2)}, {10, 0}, {0.02, math.Exp(-1)}, {0, 1}} {
			y += 0.01
			near(t, fmt.Sprintf("%+v at %v m/s", c, s.v), e.Advance(y, s.v, 0), n*(c.fast-(c.fast-c.slow)*s.left), 1e-14*n)
		}
		near(t, "elastic way back", e.Advance(y-1e-5, 0, 0), n*c.slow-1e4, 1e-6) // rounding of y, times k
		near(t, "stiffness", e.Stiffness(), 1e9, 0)
	}
}

func TestCubicPotential(t *testing.T) {
	for _, k3 := range []float64{3e9, -2e8} {
		const k = 4e6
		e := element(t, "cubic", set{"stiffness": k, "cubic": k3})
		e.Start(0.02)
		for _, y := range []float64{0, 0.01, -0.03, 0.2} {
			near(t, "force", e.Advance(y, 0, 0), k*y+k3*y*y*y, 1e-15*(k+math.Abs(k3)*y*y)*math.Abs(y)*2)
			stored, gone := e.Energy()
			near(t, "potential", stored, k*y*y/2+k3*math.Pow(y, 4)/4, 1e-15*(k+math.Abs(k3)*y*y)*y*y*2)
			near(t, "dissipated", gone, 0, 0)
		}
		near(t, "stiffness", e.Stiffness(), k, 0)
	}
}

func TestGapSides(t *testing.T) {
	for sides, want := range map[string]map[float64]float64{
		"both":  {0: 0, 0.02: 0, 0.03: 1e5, -0.02: 0, -0.05: -3e5},
		"plus":  {0: 0, 0.02: 0, 0.03: 1e5, -0.02: 0, -0.05: 0},
		"minus": {0: 0, 0.02: 0, 0.03: 0, -0.02: 0, -0.05: -3e5},
	} {
		v, err := gapKind.Resolve(kind.Values{"stiffness": kind.Num(1e7), "gap": kind.Num(0.02), "sides": kind.Text(sides)})
		if err != nil {
			t.Fatal(err)
		}
		e, err := gapKind.New(v)
		if err != nil {
			t.Fatal(err)
		}
		for y, f := range want {
			e.Start(y)
			near(t, fmt.Sprintf("%s at %v", sides, y), e.Advance(y, 0, 0), f, 1e-9)
			stored, gone := e.Energy()
			near(t, "stored", stored, f*f/2e7, 1e-9)
			near(t, "dissipated", gone, 0, 0)
		}
		near(t, "stiffness of the open gap", e.Stiffness(), 0, 0)
	}
	if _, err := gapKind.Resolve(kind.Values{"stiffness": kind.Num(1), "gap": kind.Num(1), "sides": kind.Text("top")}); err == nil {
		t.Error("a gap on top is taken")
	}
	near(t, "stiffness of no gap", element(t, "gap", set{"stiffness": 3, "gap": 0}).Stiffness(), 3, 0)
}

func TestMassForce(t *testing.T) {
	const m, dt, a = 250.0, 1e-3, 3.0
	e := element(t, "mass", set{"mass": m})
	e.Start(0.5)
	near(t, "at rest", e.Advance(0.5, 0, dt), 0, 0)
	for k := 1; k <= 100; k++ {
		v := a * dt * float64(k)
		near(t, "m·a", e.Advance(0, v, dt), m*a, 1e-10)
		stored, gone := e.Energy()
		near(t, "kinetic energy", stored, m*v*v/2, 0)
		near(t, "dissipated", gone, 0, 0)
	}
	near(t, "no time", e.Advance(0, 7, 0), 0, 0)
	near(t, "and on from there", e.Advance(0, 7, dt), 0, 0)
	s := NewSpecimen(e, element(t, "mass", set{"mass": 50}), &spring{k: 10})
	near(t, "mass of a specimen", s.Mass(), 300, 0)
	near(t, "preview without inertia", s.Preview(2, 9, dt), 20, 0)
}

// What conserves energy stores exactly what it is given, so that the trapezoid
// rule on ticks misses it by its own error: ½k₃|y|·|Δy|³ for the cubic spring,
// k·Δy²/8 where a gap closes, and ½|Δf·Δy| for a mass, whose force is that in
// the middle of the path.
func TestWhatConservesEnergy(t *testing.T) {
	const k, k3, width, m, dt = 6e6, 4e9, 0.02, 300, 5e-4
	for name, c := range map[string]struct {
		e    Element
		miss func(y0, y1, f0, f1 float64) float64
	}{
		"spring": {element(t, "spring", set{"stiffness": k}), func(_, _, _, _ float64) float64 { return 0 }},
		"cubic": {element(t, "cubic", set{"stiffness": k, "cubic": k3}), func(y0, y1, _, _ float64) float64 {
			return k3 / 2 * max(math.Abs(y0), math.Abs(y1)) * math.Pow(math.Abs(y1-y0), 3)
		}},
		"gap": {element(t, "gap", set{"stiffness": k, "gap": width}), func(y0, y1, f0, f1 float64) float64 {
			if (f0 == 0) == (f1 == 0) {
				return 0
			}
			return k * (y1 - y0) * (y1 - y0) / 8
		}},
		"mass": {element(t, "mass", set{"mass": m}), func(y0, y1, f0, f1 float64) float64 {
			return math.Abs((f1 - f0) * (y1 - y0) / 2)
		}},
	} {
		r := rand.New(rand.NewPCG(15, 16))
		e := c.e
		e.Start(0.03)
		y, v, f := 0.03, 0.0, e.Advance(0.03, 0, dt)
		stored0, _ := e.Energy()
		work, miss, moved := 0.0, 0.0, 0.0
		for range 3000 {
			next := 0.99*v - 0.3*y + 0.05*r.NormFloat64()
			to := y + (v+next)/2*dt // as a constant acceleration goes
			g := e.Advance(to, next, dt)
			work += (f + g) / 2 * (to - y)
			moved += math.Abs((f + g) / 2 * (to - y))
			miss += c.miss(y, to, f, g)
			y, v, f = to, next, g
			stored, gone := e.Energy()
			near(t, name+": dissipated", gone, 0, 0)
			near(t, name+": stored", stored-stored0, work, miss+1e-12*(moved+stored0))
		}
		if y == 0.03 || name == "gap" && moved == 0 {
			t.Errorf("%s: went nowhere", name)
		}
	}
}

// What Preview tells is what Advance does, and it changes nothing.
func TestPreviewForetells(t *testing.T) {
	for name, e := range every(t) {
		p, ok := e.(Previewer)
		if !ok {
			t.Errorf("%s cannot preview", name)
			continue
		}
		r := rand.New(rand.NewPCG(17, 18))
		y := 0.01
		e.Start(y)
		for k := range 500 {
			dt := 1e-4 * float64(1+k%3)
			v := 0.3 * r.NormFloat64()
			want := p.Preview(y+v*dt, v, dt)
			stored, gone := e.Energy()
			p.Preview(r.NormFloat64(), r.NormFloat64(), dt)
			if s, g := e.Energy(); s != stored || g != gone {
				t.Fatalf("%s: a preview changed the energies", name)
			}
			y += v * dt
			if f := e.Advance(y, v, dt); !same(f, want) {
				t.Fatalf("%s: %v N, after a preview of %v N", name, f, want)
			}
		}
	}
	// One that cannot is met with its last force.
	s := NewSpecimen(struct{ Element }{&spring{k: 10}}, &spring{k: 1})
	s.Start(2)
	near(t, "preview", s.Preview(5, 0, 1), 20+5, 0)
	near(t, "force", s.Advance(5, 0, 1), 50+5, 0)
	near(t, "preview", s.Preview(0, 0, 1), 50, 0)
}
