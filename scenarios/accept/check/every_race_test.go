//go:build race

package check

// every is which embedded scenarios are run under the race detector, which
// takes ten times as long: one in so many.
const every = 5
