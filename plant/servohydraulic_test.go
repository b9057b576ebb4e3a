package plant

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"
)

// servo builds the default actuator with some settings changed.
func servo(t testing.TB, timing Timing, given set) *ServoHydraulic {
	t.Helper()
	return actuator(t, "servo-hydraulic", timing, given).(*ServoHydraulic)
}

type servoCase struct {
	Name                           string
	Tick, Stiffness, Damping, Mass float64
	Given                          set
	Every                          int
	U, Y, V, P, X                  []float64
}

// record runs a case with at least n sub-steps a tick.
func (c *servoCase) record(t *testing.T, n int) map[string][]float64 {
	p := servo(t, Timing{c.Tick, Ramp}, c.Given)
	p.least = n
	s := NewSpecimen(&spring{k: c.Stiffness}, element(t, "viscous", set{"damping": c.Damping}), &mass{m: c.Mass})
	p.Start(0, s)
	if len(p.steps.in) != n {
		t.Fatalf("%s: %d sub-steps, not %d", c.Name, len(p.steps.in), n)
	}
	out := map[string][]float64{}
	for k, u := range c.U {
		y, v := p.Advance(u, s)
		if (k+1)%c.Every == 0 {
			out["y"], out["v"] = append(out["y"], y), append(out["v"], v)
			out["p"], out["x"] = append(out["p"], p.Pressure()), append(out["x"], p.Opening())
		}
	}
	return out
}

// The formula is of second order: with n and 2n sub-steps the error is 4/3 and
// 1/3 of the difference between the two. So the difference bounds the error,
// with half as much again for what is of higher order and for the kinks of
// friction and command, which fall anywhere in a sub-step. The solver that made
// the vectors is good to 1e-9 of what there is.
func TestServoHydraulicAgainstAnODESolver(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []servoCase
	}
	load(t, "testdata/servohydraulic.json", &vectors)
	if len(vectors.Cases) != 7 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		t.Run(c.Name, func(t *testing.T) {
			runs := map[int]map[string][]float64{}
			for _, n := range []int{4, 8, 16, 32} {
				runs[n] = c.record(t, n)
			}
			for what, want := range map[string][]float64{"y": c.Y, "v": c.V, "p": c.P, "x": c.X} {
				size := largest(want, nil)
				off4 := largest(runs[4][what], want)
				off16 := largest(runs[16][what], want)
				for _, n := range []int{4, 8, 16} {
					off, bound := largest(runs[n][what], want), 1.5*4/3*largest(runs[n][what], runs[2*n][what])+1e-9*size
					if !(off <= bound) {
						t.Errorf("%s with %d sub-steps: off by %.3g of %.3g, bound %.3g", what, n, off, size, bound)
					}
				}
				// Four times finer, sixteen times better; eight with kinks.
				if !(off16 <= off4/8) {
					t.Errorf("%s: off by %.3g with 4 sub-steps, %.3g with 16", what, off4, off16)
				}
				t.Logf("%s: largest %.3g, off by %.2g with 4 sub-steps, %.2g with 16", what, size, off4, off16)
			}
		})
	}
}

// largest is the largest difference of two records; nil is zero.
func largest(a, b []float64) float64 {
	most := 0.0
	for i := range a {
		d := a[i]
		if b != nil {
			d -= b[i]
		}
		most = max(most, math.Abs(d))
	}
	return most
}

// push is a constant force.
type push struct{ f float64 }

func (p *push) Start(float64)                        {}
func (p *push) Advance(_, _, _ float64) float64      { return p.f }
func (p *push) Preview(_, _, _ float64) float64      { return p.f }
func (p *push) Energy() (stored, dissipated float64) { return 0, 0 }
func (p *push) Stiffness() float64                   { return 0 }
func (p *push) Memory(func(*float64))                {}
func (p *push) Tangent() (Element, error)            { return p, nil }

// noLoad is the no-load speed of the default actuator, Q_R·√(p_s/p_R)/A
// (Merritt 1967).
var noLoad = 250e-3 / 60 * math.Sqrt(21.0/7) / 12.5e-3

const stall = 12.5e-3 * 21e6 // A·p_s

// With the valve fully open the piston moves at the no-load speed, and at
// p_L = ⅔p_s, where force times speed is largest, at 1/√3 of it; in general at
// √(1 − p_L/p_s) of it, and with the load √(1 + p_L/p_s) (Merritt 1967).
func TestServoHydraulicSpeedUnderLoad(t *testing.T) {
	most, at := 0.0, 0.0
	for _, part := range []float64{0, 0.2, 0.5, 0.6, 2.0 / 3, 0.75, 0.9, 0.99, -0.5, -0.95} {
		for _, sign := range []float64{1, -1} {
			p := servo(t, Timing{1.0 / 2048, Ramp}, set{"leakage": 0, "friction": 0})
			s := NewSpecimen(&push{sign * part * stall})
			p.Start(0, s)
			v := 0.0
			for range 2048 {
				_, v = p.Advance(sign*10, s)
			}
			// Steady but for the ringing of the oil, which the loss in the
			// valve has long since taken.
			near(t, fmt.Sprintf("speed at %v of the stall force", sign*part), v, sign*noLoad*math.Sqrt(1-part), 1e-9*noLoad)
			near(t, "load pressure", p.Pressure(), sign*part*21e6, 1e-9*21e6)
			if power := part * v * sign; power > most {
				most, at = power, part
			}
		}
	}
	near(t, "load of largest power", at, 2.0/3, 0)
}

func TestServoHydraulicStalls(t *testing.T) {
	for _, k := range []float64{1e6, 2e7, 1e9} {
		p := servo(t, Timing{1.0 / 2048, Ramp}, set{"leakage": 0, "friction": 0, "kdp": 0})
		// The dashpot takes the bounce, which relief valves and supply, both at
		// p_s, would let go on for long.
		s := NewSpecimen(&spring{k: k}, element(t, "viscous", set{"damping": 1e4}))
		p.Start(0, s)
		for range 4096 {
			p.Advance(10, s)
		}
		near(t, fmt.Sprintf("force against %v N/m", k), s.Force(), stall, 1e-6*stall)
	}
}

// Behind a closed valve the mass rings on the oil at √(4βA²/(V·m)) (Merritt
// 1967), a specimen's stiffness and mass added: √((4βA²/V + k)/(m + m_e)).
func TestServoHydraulicOilColumn(t *testing.T) {
	const h = 1.0 / 2048
	const oil = 4 * 1e9 * 12.5e-3 * 12.5e-3 / 4e-3
	for _, c := range []struct{ k, m float64 }{{0, 0}, {2e7, 0}, {0, 300}, {5e7, 2000}, {1e7, 1e5}} {
		p := servo(t, Timing{h, Ramp}, set{"kp": 0, "ki": 0, "kdp": 0, "leakage": 0, "friction": 0})
		p.least = 64
		load := &push{f: 1e4}
		s := NewSpecimen(&spring{k: c.k}, &mass{m: c.m}, load)
		p.Start(0, s)
		p.state.x = pair{} // the load is held by the oil alone
		load.f = 0
		omega := math.Sqrt((oil + c.k) / (100 + c.m))
		// From rest: y falls, swings through; count crossings of the velocity.
		last, first, crossings, end := 0.0, 0.0, 0, 0.0
		for k := range 4096 {
			_, v := p.Advance(0, s)
			if last*v < 0 {
				at := (float64(k) + last/(last-v)) * h
				if crossings == 0 {
					first = at
				}
				crossings, end = crossings+1, at
			}
			last = v
		}
		got := math.Pi * float64(crossings-1) / (end - first)
		// The formula turns by (ωh)²/3 too little; a crossing is found to a
		// part of a tick, by a chord of a sine.
		turn := omega * h
		near(t, fmt.Sprintf("frequency with %v N/m and %v kg", c.k, c.m), got/omega, 1, turn*turn/64/64/3*1.2+turn*turn*turn/10/float64(crossings))
	}
}

// smallSignal is the transfer function of the default actuator about p_L = 0,
// without friction: with K_q = Q_R√(p_s/p_R), x_v = V(s)·e,
// (m·s² + k)·y = A·p_L, (V/4β)·s·p_L = K_q·x_v − A·s·y − C_l·p_L.
func smallSignal(g set, k, m float64) func(s complex128) complex128 {
	r := func(x float64) complex128 { return complex(x, 0) }
	return func(s complex128) complex128 {
		wv := r(2 * math.Pi * 80)
		valve := r(250e-3/60*math.Sqrt(3)) / (1 + 2*0.8*s/wv + s*s/(wv*wv))
		perY := (r(100+m)*s*s + r(k)) / 12.5e-3 // p_L over y
		flow := perY*(r(4e-3/4e9)*s+1e-11) + 12.5e-3*s
		in := r(g["kp"]) + r(g["ki"])/s
		return valve * in * cmplx.Exp(-s*r(g["delay"])) / (flow + valve*(in+r(g["kd"])*s+r(g["kdp"])*perY))
	}
}

func TestServoHydraulicSmallSignal(t *testing.T) {
	t.Parallel()
	const h = 1.0 / 2048
	for _, c := range []struct {
		given set
		k, m  float64
	}{
		{set{"kp": 175, "ki": 0, "kd": 0, "kdp": 1e-9, "delay": 1e-3}, 0, 0},
		{set{"kp": 175, "ki": 0, "kd": 0, "kdp": 1e-9, "delay": 1e-3}, 2e7, 0},
		{set{"kp": 120, "ki": 1500, "kd": 0.1, "kdp": 4e-9, "delay": 0}, 5e6, 200},
	} {
		given := set{"friction": 0}
		for name, x := range c.given {
			given[name] = x
		}
		p := servo(t, Timing{h, Ramp}, given)
		p.least = 32
		s := NewSpecimen(&spring{k: c.k}, &mass{m: c.m})
		for _, hz := range []int{1, 5, 20, 60} {
			const amplitude = 1e-7 // load pressures below 1e-4 of the supply
			p.Start(0, s)
			got := measure(hz, 2048, 2048, func(u float64) float64 { y, _ := p.Advance(amplitude*u, s); return y / amplitude })
			want := sampled(2*math.Pi*float64(hz), h, 50, smallSignal(c.given, c.k, c.m))
			// (ωh)² of the sub-steps, 3e-5 at 60 Hz; the flow's bend with the
			// load; and what is left of the start after a second, of which the
			// integral, the slowest by far, leaves e^(−8) of its small part.
			if off := cmplx.Abs(got - want); !(off < 2e-4*cmplx.Abs(want)) {
				t.Errorf("%v, %v N/m, %v kg at %d Hz: got %v, want %v, off by %.2g", c.given, c.k, c.m, hz, got, want, off)
			}
		}
	}
}

// With its defaults the loop is an actuator such as laboratories have: late by
// 8 to 15 ms, within 10 % in amplitude to 5 Hz, without overshoot to speak of,
// on specimens from none to 20 kN/mm.
func TestServoHydraulicDefaultsAreTuned(t *testing.T) {
	const h = 1.0 / 2048
	for _, k := range []float64{0, 5e6, 2e7} {
		p := servo(t, Timing{h, Ramp}, nil)
		s := NewSpecimen(&spring{k: k})
		for _, hz := range []int{1, 2, 5} {
			p.Start(0, s)
			g := measure(hz, 2048, 4096, func(u float64) float64 { y, _ := p.Advance(2e-3*u, s); return y / 2e-3 })
			late := -cmplx.Phase(g) / (2 * math.Pi * float64(hz))
			if a := cmplx.Abs(g); !(a > 0.9 && a < 1.1 && late > 8e-3 && late < 15e-3) {
				t.Errorf("%v N/m at %d Hz: amplitude %.3f, late by %.2f ms", k, hz, a, 1e3*late)
			}
		}
		p.Start(0, s)
		most, y := 0.0, 0.0
		for range 2048 {
			y, _ = p.Advance(5e-3, s)
			most = max(most, y)
		}
		if !(most < 1.1*5e-3) || !(math.Abs(y-5e-3) < 0.03*5e-3) {
			t.Errorf("%v N/m: a step of 5 mm rises to %v m and is at %v m after a second", k, most, y)
		}
	}
}

func TestServoHydraulicAtRestStaysExactly(t *testing.T) {
	for name, hold := range holds {
		for _, given := range []set{{}, {"friction": 0}, {"ki": 0}, {"leakage": 0}, {"delay": 0.3e-3, "kd": 0.1, "kdp": 1e-8}} {
			for _, y0 := range []float64{0, 0.0123, -0.0071, 1e-9} {
				p := servo(t, Timing{1.0 / 2048, hold}, given)
				s := NewSpecimen(&spring{k: 1.3e7}, &mass{m: 200}, element(t, "viscous", set{"force": 1e5, "speed": 0.3, "exponent": 0.2}))
				p.Start(y0, s)
				for k := range 3000 {
					if y, v := p.Advance(y0, s); y != y0 || v != 0 {
						t.Fatalf("%s, %v, at %v m, tick %d: moved by %v m at %v m/s", name, given, y0, k, y-y0, v)
					}
				}
				near(t, "load pressure", p.Pressure(), 1.3e7*y0/12.5e-3, 1e-3)
				near(t, "force", s.Force(), 1.3e7*y0, 0)
			}
		}
	}
}

// The forces on the piston balance its own inertia, whatever the specimen; the
// force of a specimen with mass contains the inertia of that.
func TestServoHydraulicPistonBalances(t *testing.T) {
	for _, me := range []float64{0, 400, 1e4, 1e6} {
		p := servo(t, Timing{1.0 / 2048, Ramp}, set{"kp": 20})
		k, c := &spring{k: 5e6}, element(t, "viscous", set{"force": 5e4, "speed": 0.1, "exponent": 0.4})
		s := NewSpecimen(k, c, &mass{m: me})
		p.Start(0, s)
		reached := 0.0
		for i := range 1500 {
			p.command(0.01*math.Sin(0.005*float64(i)), 0.01*math.Sin(0.005*float64(i+1)))
			before := p.state
			p.move(s)
			now := p.state
			a := ((now.v - before.v) - (before.v-before.vWas)/3) / p.steps.k
			seal := 1e3 * max(-1, min(1, now.v/creep))
			rest := k.Preview(now.y, now.v, 0) + c.(Previewer).Preview(now.y, now.v, 0)
			net := 12.5e-3*now.p - rest - seal
			// To 1e-11 of the stall force and of the momentum.
			near(t, fmt.Sprintf("inertia of %v kg at %d", 100+me, i), (100+me)*a, net, 2e-11*(stall+(100+me)*math.Abs(now.v)/p.steps.k))
			near(t, "force with inertia", s.Force(), rest+me*((now.v-before.v)/p.steps.h), 1e-12*stall+1e-12*math.Abs(s.Force()))
			reached = max(reached, math.Abs(now.y))
		}
		if !(reached > 1e-3 && reached < 0.05) {
			t.Errorf("%v kg: reached %v m", me, reached)
		}
	}
}

// A specimen that pulls harder than the supply can hold takes the piston with
// it, at ±p_s and no further; when it lets go, the actuator finds back.
func TestServoHydraulicPressureSaturatesAndRecovers(t *testing.T) {
	for _, sign := range []float64{1, -1} {
		p := servo(t, Timing{1.0 / 2048, Ramp}, set{"friction": 0})
		load := &push{}
		s := NewSpecimen(load)
		p.Start(0, s)
		y, v, before, most := 0.0, 0.0, 0.0, 0.0
		for k := range 4096 {
			switch k {
			case 100:
				load.f = sign * 1.2 * stall
			case 130:
				load.f = 0
			}
			before = v
			y, v = p.Advance(0, s)
			most = max(most, math.Abs(y))
			if !(math.Abs(p.Pressure()) <= 21e6) || !(math.Abs(p.Opening()) <= 1) {
				t.Fatalf("tick %d: %v Pa, opening %v", k, p.Pressure(), p.Opening())
			}
			if k == 125 {
				near(t, "load pressure", p.Pressure(), sign*21e6, 0)
				// (A·p_s − r)/m, exactly: the formula is exact for a constant
				// acceleration.
				near(t, "acceleration", (v-before)*2048, -sign*0.2*stall/100, 1e-6*stall/100)
			}
		}
		if !(most > 0.01) {
			t.Errorf("it was moved by %v m only", most)
		}
		near(t, "back at rest", y, 0, 1e-4)
	}
	// It starts there too: no error, and the piston gives way.
	p := servo(t, Timing{1.0 / 2048, Ramp}, nil)
	s := NewSpecimen(&spring{k: 1e8})
	p.Start(0.01, s)
	near(t, "load pressure at the start", p.Pressure(), 21e6, 0)
	y := 0.0
	for range 2048 {
		y, _ = p.Advance(0.01, s)
	}
	near(t, "where the supply holds", y*1e8, stall, 2e-2*stall)
}

func TestServoHydraulicValveSaturatesAndRecovers(t *testing.T) {
	p := servo(t, Timing{1.0 / 2048, Ramp}, nil)
	s := NewSpecimen(&spring{k: 2e6})
	p.Start(0, s)
	open, most, y := 0, 0.0, 0.0
	for range 2048 {
		y, _ = p.Advance(0.05, s)
		most = max(most, y)
		if x := p.Opening(); x == 1 {
			open++
		} else if math.Abs(x) > 1 {
			t.Fatalf("opening %v", x)
		}
	}
	if open < 50 {
		t.Errorf("fully open for %d ticks", open)
	}
	// The integral was stopped while the valve was: hardly any overshoot.
	if !(most < 1.02*0.05) {
		t.Errorf("overshoots to %v m", most)
	}
	near(t, "a second later", y, 0.05, 0.01*0.05)
	near(t, "closed", p.Opening(), 0, 0.05)
}

// Elements whose force jumps, or nearly so, where the velocity turns would
// chatter under any explicit rule: at a velocity v a damper of exponent 0.2 has
// the slope α·f/v, thousands of times the mass over the sub-step. Here the force
// passes zero once in each half wave, and 4 sub-steps a tick tell the same
// story as 16, up to where in the tick a jump falls.
func TestServoHydraulicDoesNotChatter(t *testing.T) {
	t.Parallel()
	elements := map[string]Element{
		"friction": element(t, "friction", set{"stiffness": 5e8, "normal_force": 1e6, "slow": 0.05, "fast": 0.1, "speed": 0.03}),
		"maxwell":  element(t, "maxwell", set{"stiffness": 1e9, "force": 1e5, "speed": 0.1, "exponent": 0.2}),
		"bilinear": element(t, "bilinear", set{"stiffness": 1e9, "yield_displacement": 1e-4}),
	}
	for _, alpha := range []float64{0.1, 0.2, 0.5, 1, 2} {
		elements[fmt.Sprintf("viscous %v", alpha)] = element(t, "viscous", set{"force": 1e5, "speed": 0.1, "exponent": alpha})
	}
	for name, e := range elements {
		forces := map[int][]float64{}
		for _, n := range []int{4, 16} {
			const h, hz = 1.0 / 2048, 2
			p := servo(t, Timing{h, Ramp}, nil)
			p.least = n
			s := NewSpecimen(e)
			p.Start(0, s)
			for k := range 4096 {
				p.Advance(0.005*math.Sin(2*math.Pi*hz*h*float64(k)), s)
				forces[n] = append(forces[n], s.Force())
			}
		}
		coarse, fine := forces[4][2048:], forces[16][2048:]
		crossings := 0
		for k := 1; k < len(coarse); k++ {
			if coarse[k]*coarse[k-1] < 0 {
				crossings++
			}
		}
		if crossings != 4 {
			t.Errorf("%s: the force passes zero %d times in four half waves", name, crossings)
		}
		size := largest(fine, nil)
		sum := 0.0
		for k := range fine {
			sum += math.Abs(coarse[k] - fine[k])
		}
		// Four jumps of twice the size, each at most a quarter of a tick apart.
		if mean := sum / float64(len(fine)); !(mean < 4*2*size/4/2048) {
			t.Errorf("%s: 4 and 16 sub-steps differ by %.2g of %.2g N in the mean", name, mean, size)
		}
	}
}

func TestServoHydraulicChoosesItsSubSteps(t *testing.T) {
	const oil = 4 * 1e9 * 12.5e-3 * 12.5e-3 / 4e-3
	for _, c := range []struct {
		rate, k, m float64
		want       float64 // before rounding up
	}{
		{2048, 0, 0, 4}, // the least
		{256, 0, 0, math.Sqrt(oil/100) / 256 / 0.2},
		{256, 3e8, 0, math.Sqrt((oil+3e8)/100) / 256 / 0.2},
		{256, 0, 100, math.Sqrt(oil/200) / 256 / 0.2},
		{256, 0, 1e6, 2 * math.Pi * 80 / 256 / 0.2}, // the valve
		{256, 1e12, 0, 1024},                        // as many as there may be
	} {
		p := servo(t, Timing{1 / c.rate, Ramp}, nil)
		p.Start(0, NewSpecimen(&spring{k: c.k}, &mass{m: c.m}))
		if n := len(p.steps.in); n != int(math.Ceil(c.want)) {
			t.Errorf("%+v: %d sub-steps", c, n)
		}
	}
	for says, given := range map[string]set{
		"valve_frequency: 5000 Hz needs":          {"valve_frequency": 5000, "piston_mass": 1e5},
		"piston_mass: with 0.1 kg the oil column": {"piston_mass": 0.1},
	} {
		_, err := makeActuator("servo-hydraulic", Timing{Tick: 0.1}, given)
		if err == nil || !strings.HasPrefix(err.Error(), says) {
			t.Errorf("%v: error %v, want %q", given, err, says)
		}
	}
}
