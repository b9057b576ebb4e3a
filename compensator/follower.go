package compensator

// follower is a parameter p of a compensator, delay or amplitude, that
// follows the synchronization error e = x − y, m, target less measured at the
// same instant:
//
//	dp/dt = κ·w·ε,   ε = e·q/(q² + q₀²) bounded to ±(p_max − p_min),
//
// q being what e grows by with each unit that p is short of: the target's
// velocity for a delay, its displacement for an amplitude; κ the rate, 1/s; q₀
// the floor, of the same unit as q; w a weight from 0 to 1. An actuator that
// answers g·x(t−δ) leaves e ≈ (1−g)·x + δ·v. Where |q| is well above q₀, ε is
// therefore how far p is off, and p goes there as e^(−κt); the other one's part
// of e averages out over a cycle, because x and v do. Where |q| is below q₀
// the error counts for less and less, and for nothing at rest; noise n in e
// never makes more than n/(2q₀) of ε. ε is positive when the actuator is late,
// or weak, and makes p grow.
//
// p stays within its bounds, and never moves faster than κ times their
// distance, whatever is measured.
//
// e shows what p does only after the actuator's delay δ; an integrator behind
// a dead time is stable up to κδ = π/2 and well damped up to a quarter of that,
// so κ must stay well below 0.4/δ: 28 per second at 14 ms.
type follower struct {
	value  float64 // p
	start  float64 // p assumed at the start
	step   float64 // κ·dt
	floor  float64 // q₀²
	lo, hi float64
}

// follow moves the parameter by one tick.
func (f *follower) follow(e, q, w float64) {
	reach := f.hi - f.lo
	off := clamp(e*q/(q*q+f.floor), -reach, reach)
	if off != off { // beyond all numbers: nothing can be learned
		return
	}
	f.value = clamp(f.value+f.step*w*off, f.lo, f.hi)
}

// restart puts the parameter where it was assumed.
func (f *follower) restart() { f.value = f.start }

// retune changes the law; another start shifts the parameter by the
// difference, narrower bounds bring it to the bound.
func (f *follower) retune(start, step, floor, lo, hi float64) {
	f.value = clamp(f.value+(start-f.start), lo, hi)
	f.start, f.step, f.floor, f.lo, f.hi = start, step, floor*floor, lo, hi
}

// hold fixes the parameter at a value.
func (f *follower) hold(at float64) { *f = follower{value: at, start: at, floor: 1, lo: at, hi: at} }
