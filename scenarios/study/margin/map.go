package margin

// Measure is what a map holds.
type Measure int

const (
	Damping Measure = iota // damping ratio of the least damped mode
	Radius                 // spectral radius
)
