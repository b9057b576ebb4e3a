//go:build !race

package accept

// fuzzedCases is how many scenarios are drawn.
const fuzzedCases = 10000
