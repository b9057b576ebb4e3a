//go:build race

package accept

// fuzzedCases is how many scenarios are drawn under the race detector.
const fuzzedCases = 1000
