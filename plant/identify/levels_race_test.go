//go:build race

package identify

// levels are how far the noise lies below the motion, dB: one of them where the
// race detector looks on, which makes the arithmetic many times slower.
var levels = []float64{-40}
