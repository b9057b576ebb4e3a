//go:build !race

package identify

// levels are how far the noise lies below the motion, dB.
var levels = []float64{-60, -40, -26}
