// Package gauge measures how well one channel of a hybrid test tracks its
// target, and what the tracking error does to the energy of the whole loop.
//
// Throughout, x is the target displacement (m), y the measured one (m), and a
// delay is positive when y is late. Tracking and Energy are running gauges:
// their cost per tick is constant and rounding does not build up over a day of
// ticks. Record keeps the samples for what can only be known afterwards, the
// correlation delay and the frequency evaluation index.
//
// A value that is not defined (a ratio to a target that never moved) is NaN.
//
// The package knows samples and energies, not loops, channels or scenarios.
package gauge
