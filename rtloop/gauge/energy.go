package gauge

import "math"

// EnergyTick is what one tick does to the energy of the loop. Work and energy are
// those of the model (model seconds); integrals over the tick are by the
// trapezoid rule. x_j, y_j, r_j are target, measured displacement and measured
// force of channel j; v, a the velocities and accelerations, M and C the mass and
// damping matrices of the numerical part.
type EnergyTick struct {
	Injected   float64 // Σ_j ∫ r_j (dy_j − dx_j), J: what the tracking error adds to the structure
	Specimen   float64 // Σ_j ∫ r_j dy_j, J: what went into the specimens
	Input      float64 // work of the excitation on the structure, J
	Hysteresis float64 // dissipated by hysteretic storeys of the numerical part, J
	Dissipated float64 // dissipated by the specimens, J

	VCV    float64 // vᵀCv at the tick's end, W
	VMV    float64 // vᵀMv at the tick's end, J
	AMA    float64 // aᵀMa at the tick's end, N²/kg
	Strain float64 // stored in the numerical part at the tick's end, J
}

// Energy is the running energy of the loop. Over the trailing window,
//
//	W_i    = Σ Injected
//	W_d    = ∫vᵀCv dt + Σ Hysteresis + Σ Dissipated
//	margin = 1 − W_i/W_d
//	Δζ     = −W_i/(2ω̂ ∫vᵀMv dt),   ω̂² = ∫aᵀMa dt/∫vᵀMv dt
//
// The structure loses ∫r dx = Specimen − Injected through its channels, so
// Injected is what lateness gives it that no specimen did: the margin is 1 with
// perfect tracking, 0 where injection and damping balance and the motion neither
// grows nor decays, and negative where it grows. Δζ is the damping ratio that
// injection of that size looks like.
//
// A force k_e·y, with y late by τ in x = A·sin ωt over whole periods, gives
// W_i = π·k_e·A²·sin ωτ a period; with one storey m, c that is
// margin = 1 − k_e·sin(ωτ)/(cω) and Δζ = −k_e·sin(ωτ)/(2mω²).
//
// Until the window is full it covers what there is; the margin is NaN for the
// first fifth of it (one period, when the window is five), and while W_d is no
// more than a thousandth of the largest it has been, or than a billionth of the
// energy of the motion, where a ratio says nothing or is one of roundings.
//
// A tick costs the same whatever has gone before. The sums over the window are
// kept as in Tracking, so that no rounding error lives longer than two windows;
// those of the whole run grow by a window's worth of ticks at a time into
// compensated sums.
type Energy struct {
	running work // over the window
	fresh   work // since the ring last wrapped
	ring    []work
	at      int // where the newest tick goes
	full    bool

	early   int     // ticks until the margin means something
	half    float64 // half a tick, s
	trifle  float64 // W_d over ∫vᵀMv dt at which it is rounding, 1/s
	vcv     float64 // at the newest tick's end
	vmv     float64
	ama     float64
	strain  float64
	margin  float64
	lowest  float64
	largest float64 // largest W_d so far

	// The whole run, up to the last wrap; fresh and block hold the rest.
	injected, damped, specimen, dissipated, input, motion, acceleration Sum

	block block // since the ring last wrapped
	base  work  // what running began with at the last wrap
}

// block is what the sums of the whole run need beside work, J.
type block struct {
	damped, specimen, dissipated, input float64
}

// work is what the ratios over the window are made of.
type work struct {
	injected     float64 // W_i, J
	damped       float64 // W_d, J
	motion       float64 // ∫vᵀMv dt, J·s
	acceleration float64 // ∫aᵀMa dt, J/s
}

// What W_d must pass for a margin: this share of the largest W_d so far, and this
// share of the mean of vᵀMv over the window.
const (
	floor    = 1e-3
	rounding = 1e-9
)

// NewEnergy returns gauges over a trailing window of that many ticks (at least 1)
// of dt model seconds each. Start comes before the first Add.
func NewEnergy(window int, dt float64) *Energy {
	e := &Energy{ring: make([]work, max(window, 1)), half: dt / 2}
	e.Start(EnergyTick{})
	return e
}

// Start forgets everything and takes the state at t = 0. Its increments are what
// was there before: Input the energy stored at the start, Specimen that part of
// it which is in the specimens. They count in the whole run, not in the window.
func (e *Energy) Start(first EnergyTick) {
	*e = Energy{
		ring: e.ring, half: e.half, early: (len(e.ring) + 4) / 5,
		trifle: rounding / (2 * e.half * float64(len(e.ring))),
		vcv:    first.VCV, vmv: first.VMV, ama: first.AMA, strain: first.Strain,
		margin: math.NaN(), lowest: math.Inf(1),
	}
	e.injected.Add(first.Injected)
	e.damped.Add(first.Hysteresis)
	e.specimen.Add(first.Specimen)
	e.dissipated.Add(first.Dissipated)
	e.input.Add(first.Input)
}

// Add takes one tick.
func (e *Energy) Add(t *EnergyTick) {
	h := e.half
	damped := h*(e.vcv+t.VCV) + t.Hysteresis
	b := &e.block
	b.damped += damped
	b.specimen += t.Specimen
	b.dissipated += t.Dissipated
	b.input += t.Input
	in := work{
		injected:     t.Injected,
		damped:       damped + t.Dissipated,
		motion:       h * (e.vmv + t.VMV),
		acceleration: h * (e.ama + t.AMA),
	}
	e.vcv, e.vmv, e.ama, e.strain = t.VCV, t.VMV, t.AMA, t.Strain

	f := &e.fresh
	f.injected += in.injected
	f.damped += in.damped
	f.motion += in.motion
	f.acceleration += in.acceleration

	slot := &e.ring[e.at]
	old := *slot
	*slot = in
	if e.full {
		in.injected -= old.injected
		in.damped -= old.damped
		in.motion -= old.motion
		in.acceleration -= old.acceleration
	}
	r := &e.running
	r.injected += in.injected
	r.damped += in.damped
	r.motion += in.motion
	r.acceleration += in.acceleration

	e.at++
	if e.at == len(e.ring) {
		e.wrap()
	}
	e.judge()
}

// wrap is called when the ring has been filled once more: the fresh set now
// covers exactly the window and takes over.
func (e *Energy) wrap() {
	e.injected.Add(e.fresh.injected)
	e.motion.Add(e.fresh.motion)
	e.acceleration.Add(e.fresh.acceleration)
	e.damped.Add(e.block.damped)
	e.specimen.Add(e.block.specimen)
	e.dissipated.Add(e.block.dissipated)
	e.input.Add(e.block.input)
	e.block = block{}
	e.running, e.base = e.fresh, e.fresh
	e.fresh = work{}
	e.at = 0
	e.full = true
}

// judge brings the margin up to date.
func (e *Energy) judge() {
	damped := e.running.damped
	if damped > e.largest {
		e.largest = damped
	}
	if !(damped > floor*e.largest && damped > e.trifle*e.running.motion) || !e.full && e.at < e.early {
		e.margin = math.NaN()
		return
	}
	margin := 1 - e.running.injected/damped
	if margin < e.lowest {
		e.lowest = margin
	}
	e.margin = margin
}

// Margin returns the energy margin over the trailing window, NaN where undefined.
func (e *Energy) Margin() float64 { return e.margin }

// MarginMin returns the smallest margin that was defined so far, NaN if none was.
func (e *Energy) MarginMin() float64 {
	if math.IsInf(e.lowest, 1) {
		return math.NaN()
	}
	return e.lowest
}

// AddedDamping returns Δζ over the trailing window: positive where the tracking
// error takes energy out, negative where it puts energy in. NaN while the
// structure has been still, or moves with less than 10⁻¹² of the energy it had
// in the last two windows, where rounding would speak instead.
func (e *Energy) AddedDamping() float64 {
	r := &e.running
	if !(r.motion > stillness*(e.base.motion+e.fresh.motion)) ||
		!(r.acceleration > stillness*(e.base.acceleration+e.fresh.acceleration)) {
		return math.NaN()
	}
	return addedDamping(r.injected, r.motion, r.acceleration)
}

// addedDamping is −W_i/(2ω̂∫vᵀMv), with ω̂∫vᵀMv = √(∫aᵀMa·∫vᵀMv); never −0.
func addedDamping(injected, motion, acceleration float64) float64 {
	return (0 - injected) / (2 * math.Sqrt(motion) * math.Sqrt(acceleration))
}
