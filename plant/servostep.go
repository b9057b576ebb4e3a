package plant

import "math"

// servoSteps is what is precomputed for the sub-steps of a tick.
type servoSteps struct {
	in    []straightPiece // of the delayed command
	spool swing
	h     float64 // s
	k     float64 // ⅔h
	ko    float64 // ⅔h·4β/V
	koa   float64 // ⅔h·4β/V·A
	leak  float64 // 1 + ⅔h·4β/V·C_l
	mass  float64 // of piston and specimen, kg
	tol   float64 // of the balance of forces, kg·m/s
	round float64 // rounding of the specimen's force per displacement, kg/s
	slope float64 // first guess at the slope of the balance, kg
}

// servoState is where the actuator stands at the end of a sub-step.
type servoState struct {
	x       pair    // opening and its rate, 1 and 1/s
	i       float64 // the integral part of e
	g, gWas float64 // k_d·ẏ + k_dp·p_L − i, now and one sub-step ago

	y, dy   float64 // displacement and the last step of it, m
	v, vWas float64 // m/s
	p, pWas float64 // load pressure, Pa
	slope   float64 // last slope of the balance of forces over v, kg
}

// cut prepares n sub-steps a tick.
func (p *ServoHydraulic) cut(n int, mass, stiffness float64) servoSteps {
	h := p.line.tick / float64(n)
	s := servoSteps{in: p.line.slices(n), h: h, k: 2 * h / 3, mass: mass, spool: swinging(p.valveOmega, p.valveZeta, h)}
	s.ko = s.k * p.oil
	s.koa = s.ko * p.area
	s.leak = 1 + s.ko*p.leakage
	// Forces balance to 1e-11 of the stall force, or as well as they can where
	// a stiff specimen's force is rounded with its displacement.
	if !p.exact {
		s.tol = 1e-11 * s.k * p.area * p.supply
	}
	s.round = 4e-16 * s.k * stiffness
	s.slope = mass + s.k*(s.koa*p.area/s.leak+p.perCreep+s.k*stiffness)
	return s
}

// rest is the state at rest at y, m, under the force r, N.
func (p *ServoHydraulic) rest(y, r float64) servoState {
	pl := max(-p.supply, min(p.supply, r/p.area))
	x := 0.0
	if leaks := p.leakage * pl; leaks != 0 {
		full := p.flow * math.Sqrt(p.supply-math.Abs(pl))
		x = max(-1, min(1, leaks/full)) // full open where the whole supply holds the load
	}
	g := -x
	return servoState{
		x: pair{y: x}, i: p.kdp*pl + x, g: g, gWas: g,
		y: y, p: pl, pWas: pl, slope: p.steps.slope,
	}
}

// command lets the controller and the spool do one sub-step, in which the
// delayed command goes from w0 to w1, m.
func (p *ServoHydraulic) command(w0, w1 float64) {
	s := &p.state
	err0 := w0 - s.y
	err1 := w1 - (s.y + s.dy) // where y goes if it goes on
	want := p.kp*err0 - s.g
	e0 := limit(want)
	e1 := limit(p.kp*err1 - (2*s.g - s.gWas))

	sw := &p.steps.spool
	q, step := s.x.y-e1, e0-e1
	x := pair{
		e1 + (sw.ofY.y*q + sw.ofV.y*s.x.v + sw.ofFrom.y*step),
		sw.ofY.v*q + sw.ofV.v*s.x.v + sw.ofFrom.v*step,
	}
	if x.y > 1 {
		x = pair{1, min(x.v, 0)}
	} else if x.y < -1 {
		x = pair{-1, max(x.v, 0)}
	}
	s.x = x

	if mean := 0.5 * (err0 + err1); !(want > 1 && mean > 0 || want < -1 && mean < 0) {
		s.i += p.ki * p.steps.h * mean
	}
}

func limit(e float64) float64 { return max(-1, min(1, e)) }

// valve is the load pressure as a function of the velocity at the end of a
// sub-step. With q = p_s − σ·p_L, σ the sign of the opening, the formula
//
//	leak·p_L = P − koa·v + σ·K·√q,   P = p_L + (p_L − p_L⁻)/3,   K = ko·Q_R|x_v|/√p_R,
//
// is quadratic in √q: leak·q + K·√q = D, D = leak·p_s − σ·(P − koa·v). Where D
// is negative the load alone drives p_L past p_s, and nothing flows.
type valve struct {
	start  float64 // P, Pa
	sign   float64 // σ
	open   float64 // K
	k2     float64 // K²
	koa    float64
	leak   float64
	supply float64
}

func (a *valve) pressure(v float64) float64 {
	n := a.start - a.koa*v
	if d := a.leak*a.supply - a.sign*n; d > 0 && a.open > 0 {
		n += a.sign * a.open * (2 * d / (a.open + math.Sqrt(a.k2+4*a.leak*d)))
	}
	return max(-a.supply, min(a.supply, n/a.leak))
}

// balance is the momentum that is missing, kg·m/s, if the piston has velocity
// v at the end of a sub-step,
//
//	m·(v − v*) − ⅔h·(A·p_L − r − friction),
//
// all at its end, v* the velocity that the formula would give without force.
// It grows with v at least as m does, unless the specimen's force falls.
type balance struct {
	valve
	p        *ServoHydraulic
	s        *Specimen
	from, at float64 // y and v that the formula starts from, m and m/s
}

func (b *balance) missing(v float64) float64 {
	p := b.p
	st := &p.steps
	f := b.s.Preview(b.from+st.k*v, v, st.h) + max(-p.friction, min(p.friction, p.perCreep*v))
	return st.mass*(v-b.at) - st.k*(p.area*b.pressure(v)-f)
}

// move lets oil, piston and specimen do one sub-step under the opening of its
// end.
func (p *ServoHydraulic) move(s *Specimen) {
	now, st := &p.state, &p.steps
	b := balance{p: p, s: s, from: now.y + now.dy/3, at: now.v + (now.v-now.vWas)/3, valve: valve{
		start: now.p + (now.p-now.pWas)/3, sign: 1, open: st.ko * p.flow * now.x.y,
		koa: st.koa, leak: st.leak, supply: p.supply,
	}}
	if b.open < 0 {
		b.sign, b.open = -1, -b.open
	}
	b.k2 = b.open * b.open
	v := p.solve(&b)
	dy := now.dy/3 + st.k*v
	now.pWas, now.p = now.p, b.pressure(v)
	now.vWas, now.v = now.v, v
	now.dy = dy
	now.y += dy
	now.gWas, now.g = now.g, p.kd*v+p.kdp*now.p-now.i
	s.Advance(now.y, v, st.h)
}

// solve finds the velocity that leaves nothing missing: secants from where the
// velocity would go on its own, inside a bracket that every try narrows, and
// every fourth time a bisection, so that no kink of a specimen can hold it up.
func (p *ServoHydraulic) solve(b *balance) float64 {
	now, st := &p.state, &p.steps
	v := now.v + (now.v - now.vWas)
	m := b.missing(v)
	tol := st.tol + 1e-11*st.mass*math.Abs(v) + st.round*math.Abs(now.y) + 4e-16*st.k*math.Abs(b.s.Force())
	lo, hi := math.Inf(-1), math.Inf(1)
	slope := now.slope
	for i := 1; math.Abs(m) > tol && i < 200; i++ {
		if m > 0 {
			hi = v
		} else {
			lo = v
		}
		next := v - m/slope
		if bounded := hi-lo < math.Inf(1); bounded && (i&3 == 0 || !(next > lo && next < hi)) {
			next = lo + 0.5*(hi-lo)
		} else if i&3 == 0 {
			next = v - m/st.mass // as far as it can be
		}
		if next == v || next == lo || next == hi {
			break // no number lies between
		}
		n := b.missing(next)
		if rise := (n - m) / (next - v); rise > 0 && rise < math.Inf(1) {
			slope = rise
		}
		v, m = next, n
	}
	now.slope = slope
	return v
}
