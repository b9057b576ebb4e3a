package gauge

import "math"

// Totals is the energy of the whole run, J, what was there at the start included.
// It balances as
//
//	Input = Kinetic + Strain + Damped + Specimen − Injected
type Totals struct {
	Injected   float64 // by the tracking error into the structure
	Damped     float64 // ∫vᵀCv dt and hysteresis of the numerical part
	Specimen   float64 // into the specimens, stored and dissipated
	Dissipated float64 // of Specimen, what the specimens dissipated
	Input      float64 // by the excitation, and stored at the start
	Kinetic    float64 // ½vᵀMv now
	Strain     float64 // stored in the numerical part now

	// BalanceError is how far the balance is from closing, over its largest
	// term; 0 when there is no energy at all.
	BalanceError float64

	// AddedDamping is Δζ over the whole run, NaN when nothing moved.
	AddedDamping float64
}

// Totals returns the energy of the whole run so far.
func (e *Energy) Totals() Totals {
	t := Totals{
		Injected:   e.injected.Value() + e.fresh.injected,
		Damped:     e.damped.Value() + e.block.damped,
		Specimen:   e.specimen.Value() + e.block.specimen,
		Dissipated: e.dissipated.Value() + e.block.dissipated,
		Input:      e.input.Value() + e.block.input,
		Kinetic:    e.vmv / 2,
		Strain:     e.strain,
	}
	var residual Sum
	largest := 0.0
	for _, term := range [...]float64{
		t.Input, -t.Kinetic, -t.Strain, -t.Damped, -t.Specimen, t.Injected,
	} {
		residual.Add(term)
		largest = max(largest, math.Abs(term))
	}
	if largest != 0 {
		t.BalanceError = math.Abs(residual.Value()) / largest
	}
	motion := e.motion.Value() + e.fresh.motion
	acceleration := e.acceleration.Value() + e.fresh.acceleration
	t.AddedDamping = math.NaN()
	if motion > 0 && acceleration > 0 {
		t.AddedDamping = addedDamping(t.Injected, motion, acceleration)
	}
	return t
}
