//go:build !race

package check

// every is which embedded scenarios are run: all.
const every = 1
