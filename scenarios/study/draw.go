package study

import (
	"fmt"
	"math/bits"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"

	"antelag/scenarios/kind"
)

// Law says how a drawn setting is distributed over its spread.
type Law string

const (
	// Uniform: every value between the ends is as likely as any other.
	Uniform Law = "uniform"
	// Normal: about the middle of the spread, whose ends are three standard
	// deviations away; nothing lies beyond them (of a normal law 0.27 % would).
	Normal Law = "normal"
)

// Sampling says how draws lie to each other.
type Sampling string

const (
	// Latin is a Latin hypercube (McKay, Beckman & Conover 1979): of n draws each
	// setting has exactly one in each of n equally likely parts of its spread, in
	// an order that is independent between settings.
	Latin Sampling = "latin"
	// Independent draws know nothing of each other.
	Independent Sampling = "independent"
)

// Laws and Samplings are all there are, the default first.
var (
	Laws      = []Law{Uniform, Normal}
	Samplings = []Sampling{Latin, Independent}
)

// ParseLaw finds a law by its name; "" is the default.
func ParseLaw(text string) (Law, error) { return choose("law", text, Laws) }

// ParseSampling finds a sampling by its name; "" is the default.
func ParseSampling(text string) (Sampling, error) { return choose("sampling", text, Samplings) }

func choose[T ~string](what, text string, known []T) (T, error) {
	if text == "" {
		return known[0], nil
	}
	if slices.Contains(known, T(text)) {
		return T(text), nil
	}
	names := make([]string, len(known))
	for i := range known {
		names[i] = string(known[i])
	}
	return "", fmt.Errorf("--%s: %w", what, &kind.UnknownError{What: what, Got: text, Known: names})
}

// deviations is how many standard deviations the ends of a spread are from its
// middle under the normal law.
const deviations = 3

// draw appends the values of draw i: a function of the seed, the setting's place
// in the order of the paths, i and, for a Latin hypercube, the number of draws.
func (st *Study) draw(dst []float64, i int64) []float64 {
	for k := range st.Spread {
		u := unit(uint64(st.Seed), uint64(k), uint64(i))
		if st.Sampling != Independent {
			n := uint64(st.Draws)
			u = (float64(shuffle(uint64(i), n, mix(uint64(st.Seed), uint64(k), 'o'))) + u) / float64(n)
		}
		dst = append(dst, st.Law.quantile(st.Spread[k].Low, st.Spread[k].High, u))
	}
	return dst
}

// LatinPoint is point i of n of a Latin hypercube that fills the unit cube.
func LatinPoint(seed, i, n int64, dims int) []float64 {
	out := make([]float64, dims)
	for k := range out {
		u := unit(uint64(seed), uint64(k), uint64(i), 'p')
		out[k] = (float64(shuffle(uint64(i), uint64(n), mix(uint64(seed), uint64(k), 'l'))) + u) / float64(n)
	}
	return out
}

// quantile returns the value below which the part u, above 0 and below 1, of the
// law lies.
func (l Law) quantile(low, high, u float64) float64 {
	v := low + u*(high-low)
	if l == Normal {
		cut := distuv.UnitNormal.CDF(-deviations)
		z := distuv.UnitNormal.Quantile(cut + u*(1-2*cut))
		v = 0.5*(low+high) + z*(high-low)/(2*deviations)
	}
	return min(max(v, low), high)
}

// unit is a number between 0 and 1, never either, that looks drawn at random but
// hangs on its arguments alone.
func unit(keys ...uint64) float64 {
	return (float64(mix(keys...)>>12) + 0.5) / (1 << 52)
}

// mix stirs its arguments together: each is one step of SplitMix64 (Steele, Lea &
// Flood 2014) from a state that holds those before it.
func mix(keys ...uint64) uint64 {
	var h uint64
	for _, k := range keys {
		h = splitmix(h ^ splitmix(k))
	}
	return h
}

// splitmix is the output of SplitMix64 after one step from the state s.
func splitmix(s uint64) uint64 {
	s += 0x9e3779b97f4a7c15
	s = (s ^ s>>30) * 0xbf58476d1ce4e5b9
	s = (s ^ s>>27) * 0x94d049bb133111eb
	return s ^ s>>31
}

// shuffle returns where i, below n, goes in a permutation of n that the key
// chooses. Nothing is kept: it is a Feistel network of four rounds on the
// smallest even number of bits that holds n, gone round again until it lands
// below n (Black & Rogaway 2002).
func shuffle(i, n, key uint64) uint64 {
	half := (bits.Len64(n-1) + 1) / 2
	mask := uint64(1)<<half - 1
	for {
		left, right := i>>half, i&mask
		for round := range uint64(4) {
			left, right = right, left^mix(key, round, right)&mask
		}
		if i = left<<half | right; i < n {
			return i
		}
	}
}
