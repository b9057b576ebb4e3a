package substructure

// Most hybrid tests have one level, and there loops, blocks and calls cost
// more than the arithmetic. Here stands the same arithmetic without them, in
// the same order, so that it agrees with the general path to the last bit.

// single reports whether the scalar paths apply: one level, no hysteresis.
func (s *Structure) single() bool { return s.n == 1 && len(s.storeys) == 0 }

// only returns the element of a matrix of one.
func (a *matrix) only() float64 { return a.blocks[0].cols[0][0] }

// state1 is state for one level.
type state1 struct {
	dt, k, c    float64
	inverseMass float64
	x, v, a     [1]float64
}

func newState1(st *state) state1 {
	return state1{
		dt: st.dt, k: st.s.stiffnessBlocks.only(), c: st.s.dampingBlocks.only(),
		inverseMass: st.inverseMass.only(),
	}
}

func (st *state1) X() []float64        { return st.x[:] }
func (st *state1) V() []float64        { return st.v[:] }
func (st *state1) A() []float64        { return st.a[:] }
func (st *state1) Strain() float64     { return 0.5 * (st.x[0] * float64(st.k*st.x[0])) }
func (st *state1) Hysteresis() float64 { return 0 }
func (st *state1) Memory() []float64   { return nil }

func (st *state1) Start(x0, p []float64) {
	st.x[0], st.v[0] = 0, 0
	copy(st.x[:], x0)
	st.a[0] = st.inverseMass * st.balance(p[0], 0)
}

func (st *state1) SetState(x, v, a []float64) {
	st.x[0], st.v[0], st.a[0] = x[0], v[0], a[0]
}

// balance returns p − c·v − k·x; the displacement, last to be known, comes last.
func (st *state1) balance(p, v float64) float64 {
	return p - float64(st.c*v) - float64(st.k*st.x[0])
}

// newmarkExplicit1 is newmarkExplicit for one level.
type newmarkExplicit1 struct {
	state1
	half, w, inertia float64
}

var _ Integrator = (*newmarkExplicit1)(nil)

func newNewmarkExplicit1(in *newmarkExplicit) *newmarkExplicit1 {
	return &newmarkExplicit1{state1: newState1(&in.state), half: in.half, inertia: in.inertia.only()}
}

func (in *newmarkExplicit1) Centred() []float64 { return in.v[:] }

func (in *newmarkExplicit1) Predict() {
	w := plus(in.v[0], in.half, in.a[0])
	in.w = w
	in.x[0] = plus(in.x[0], in.dt, w)
	in.v[0] = plus(w, in.half, in.a[0])
}

func (in *newmarkExplicit1) Correct(p []float64) {
	in.a[0] = in.inertia * in.balance(p[0], in.w)
	in.v[0] = plus(in.w, in.half, in.a[0])
}

// cr1 is cr for one level.
type cr1 struct {
	state1
	gain, dv float64
	centred  [1]float64
}

var _ Integrator = (*cr1)(nil)

func newCR1(in *cr) *cr1 { return &cr1{state1: newState1(&in.state), gain: in.gain.only()} }

func (in *cr1) Centred() []float64 { return in.centred[:] }

func (in *cr1) Start(x0, p []float64) {
	in.state1.Start(x0, p)
	in.ahead()
}

func (in *cr1) Predict() {
	in.v[0] += in.dv
	in.x[0] = plus(in.x[0], in.dt, in.v[0])
}

func (in *cr1) Correct(p []float64) {
	in.a[0] = in.inverseMass * in.balance(p[0], in.v[0])
	in.ahead()
}

func (in *cr1) SetState(x, v, a []float64) {
	in.state1.SetState(x, v, a)
	in.ahead()
}

func (in *cr1) ahead() {
	in.dv = in.gain * in.a[0]
	in.centred[0] = plus(in.v[0], 0.5, in.dv)
}

// weighted1 is weighted for one level; the memory is the balance and, where a
// method has it, the change of velocity to come.
type weighted1 struct {
	state1
	now, before, specimens float64
	memory                 [2]float64
}

func newWeighted1(w *weighted) weighted1 {
	return weighted1{state1: newState1(&w.state), now: w.now, before: w.before, specimens: w.specimens.only()}
}

func (w *weighted1) Start(x0, p []float64) {
	w.state1.Start(x0, p)
	w.memory[0] = w.balance(p[0], 0)
}

func (w *weighted1) SetState(x, v, a []float64) {
	w.state1.SetState(x, v, a)
	w.memory[0] = w.balance(0-float64(w.specimens*x[0]), v[0])
}

// krAlpha1 is krAlpha for one level; memory[1] is Δ.
type krAlpha1 struct {
	weighted1
	reach, late, gain, recoil, solve, inertia float64
	centred                                   [1]float64
}

var _ Integrator = (*krAlpha1)(nil)

func newKRAlpha1(in *krAlpha) *krAlpha1 {
	return &krAlpha1{
		weighted1: newWeighted1(&in.weighted), reach: in.reach, late: in.late,
		gain: in.gain.only(), recoil: in.recoil.only(), solve: in.solve.only(), inertia: in.inertia.only(),
	}
}

func (in *krAlpha1) Memory() []float64  { return in.memory[:] }
func (in *krAlpha1) Centred() []float64 { return in.centred[:] }

func (in *krAlpha1) Start(x0, p []float64) {
	in.weighted1.Start(x0, p)
	in.begin()
}

func (in *krAlpha1) SetState(x, v, a []float64) {
	in.weighted1.SetState(x, v, a)
	in.begin()
}

func (in *krAlpha1) begin() {
	in.memory[1] = in.gain * in.a[0]
	in.centred[0] = plus(in.v[0], in.late, in.memory[1])
}

func (in *krAlpha1) Predict() {
	dv := in.memory[1]
	in.x[0] = plus(in.x[0], in.dt, plus(in.v[0], in.reach, dv))
	in.v[0] += dv
}

func (in *krAlpha1) Correct(p []float64) {
	r := in.balance(p[0], in.v[0])
	weighted := weight(in.now, r, in.before, in.memory[0])
	dv := in.solve * (weighted - float64(in.recoil*in.memory[1]))
	in.memory = [2]float64{r, dv}
	in.a[0] = in.inertia * dv
	in.centred[0] = plus(in.v[0], in.late, dv)
}

// alphaOS1 is alphaOS for one level.
type alphaOS1 struct {
	weighted1
	ahead, half, pull, kick, back, again float64
	predicted, inertia, mass             float64
}

var _ Integrator = (*alphaOS1)(nil)

func newAlphaOS1(in *alphaOS) *alphaOS1 {
	return &alphaOS1{
		weighted1: newWeighted1(&in.weighted), ahead: in.ahead, half: in.half, pull: in.pull, kick: in.kick, back: in.back, again: in.again,
		inertia: in.inertia.only(), mass: in.s.mass1,
	}
}

func (in *alphaOS1) Memory() []float64  { return in.memory[:1] }
func (in *alphaOS1) Centred() []float64 { return in.v[:] }

func (in *alphaOS1) Predict() {
	a := in.a[0]
	in.x[0] = plus(in.x[0], in.dt, plus(in.v[0], in.ahead, a))
	in.predicted = plus(in.v[0], in.half, a)
	in.v[0] = plus(in.v[0], in.dt, a)
}

func (in *alphaOS1) Correct(p []float64) {
	last := in.memory[0]
	a := in.inertia * weight(in.now, in.balance(p[0], in.predicted), in.before, last)
	in.x[0] = plus(in.x[0], in.pull, a)
	in.v[0] = plus(in.predicted, in.kick, a)
	in.a[0] = a
	in.memory[0] = weight(in.back, in.mass*a, in.again, last)
}
