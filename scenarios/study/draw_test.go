package study

import (
	"encoding/json"
	"math"
	"os"
	"slices"
	"testing"

	"antelag/scenarios"
)

// vectors come from testdata/vectors.py, which names the versions of SciPy and
// NumPy.
type vectors struct {
	Low, High         float64
	U                 []float64
	Uniform, Normal   []float64
	Sample            [][]float64
	SampleDiscrepancy float64 `json:"sample_discrepancy"`
	N, D              int
	Latin             [3]float64 // least, mean, largest of 300 seeds
	Independent       [3]float64
	Shares            [][3]float64
}

func readVectors(t *testing.T) *vectors {
	t.Helper()
	text, err := os.ReadFile("testdata/vectors.json")
	if err != nil {
		t.Fatal(err)
	}
	var v vectors
	if err := json.Unmarshal(text, &v); err != nil {
		t.Fatal(err)
	}
	return &v
}

// The outputs of SplitMix64 from the seed 1234567, published with many
// implementations (from memory).
func TestSplitmix(t *testing.T) {
	want := []uint64{6457827717110365317, 3203168211198807973, 9817491932198370423, 4593380528125082431, 16408922859458223821}
	for i, w := range want {
		if got := splitmix(1234567 + uint64(i)*0x9e3779b97f4a7c15); got != w {
			t.Errorf("output %d is %d, want %d", i, got, w)
		}
	}
}

// Quantiles of both laws are those of SciPy's uniform and truncnorm, to the
// rounding of the inverse error function (1e-12 of the spread).
func TestLawsAreThoseOfSciPy(t *testing.T) {
	v := readVectors(t)
	for i, u := range v.U {
		for law, want := range map[Law]float64{Uniform: v.Uniform[i], Normal: v.Normal[i]} {
			if got := law.quantile(v.Low, v.High, u); math.Abs(got-want) > 1e-12*(v.High-v.Low) {
				t.Errorf("%s at %v: %v, SciPy %v", law, u, got, want)
			}
		}
	}
}

func TestLawsStayWithinTheSpread(t *testing.T) {
	for _, law := range Laws {
		for _, u := range []float64{0.5 / (1 << 52), 1 - 0.5/(1<<52)} {
			if v := law.quantile(0.1, 0.3, u); !(v >= 0.1 && v <= 0.3) {
				t.Errorf("%s at %v: %v", law, u, v)
			}
		}
	}
}

func TestShuffleIsAPermutation(t *testing.T) {
	for _, n := range []uint64{1, 2, 3, 4, 5, 10, 17, 100, 1000, 4096, 4097} {
		for key := range uint64(3) {
			seen := make([]bool, n)
			for i := range n {
				j := shuffle(i, n, key)
				if j >= n || seen[j] {
					t.Fatalf("n %d, key %d: %d goes to %d, where another went or nobody can", n, key, i, j)
				}
				seen[j] = true
			}
		}
	}
}

// spreads is a study with so many drawn settings, each from 0 to 1, that never
// runs.
func spreads(dims int, draws int64, law Law, sampling Sampling, seed int64) *Study {
	st := &Study{Request: Request{Draws: draws, Law: law, Sampling: sampling, Seed: seed}, points: 1}
	for range dims {
		st.Spread = append(st.Spread, Spread{Spread: scenarios.Spread{Low: 0, High: 1}})
	}
	return st
}

// sample is all draws.
func (st *Study) sample() [][]float64 {
	out := make([][]float64, st.Draws)
	for i := range out {
		out[i] = st.draw(nil, int64(i))
	}
	return out
}

// Of n draws of a Latin hypercube each setting has one in each nth of its
// spread, for any n and seed.
func TestLatinHypercubeHasOneInEachPart(t *testing.T) {
	for _, n := range []int64{1, 2, 7, 100, 1024} {
		for seed := range int64(3) {
			for k := range 4 {
				seen := make([]bool, n)
				for _, x := range spreads(4, n, Uniform, Latin, seed).sample() {
					cell := int(x[k] * float64(n))
					if seen[cell] {
						t.Fatalf("n %d, seed %d, setting %d: two draws in part %d", n, seed, k, cell)
					}
					seen[cell] = true
				}
			}
		}
	}
}

// Mean, variance and correlation of draws are those of their laws. A mean of n
// independent draws of unit variance has the deviation 1/√n, a variance of a
// uniform √(4/5n), of a normal √(2/n), a correlation 1/√n; five of them are
// allowed, which one in a million would exceed. A Latin hypercube must be far
// closer in its mean: of each setting it is within 1/(2n) of the spread by
// construction.
func TestMoments(t *testing.T) {
	const n, dims = 4000, 3
	cut := 3 * math.Exp(-4.5) / math.Sqrt(2*math.Pi)
	inside := math.Erf(3 / math.Sqrt2)
	variances := map[Law]float64{Uniform: 1. / 12, Normal: (1 - 2*cut/inside) / 36}
	for _, law := range Laws {
		for _, sampling := range Samplings {
			x := spreads(dims, n, law, sampling, 7).sample()
			sd := math.Sqrt(variances[law])
			for a := range dims {
				mean := moment(x, func(v []float64) float64 { return v[a] })
				allowed := 5 * sd / math.Sqrt(n)
				if sampling == Latin {
					allowed = 0.5 / n
				}
				if math.Abs(mean-0.5) > allowed {
					t.Errorf("%s %s: mean %v", law, sampling, mean)
				}
				for b := range dims {
					cov := moment(x, func(v []float64) float64 { return (v[a] - 0.5) * (v[b] - 0.5) }) / variances[law]
					want, allowed := 0.0, 5/math.Sqrt(n)
					if a == b {
						want, allowed = 1, 5*math.Sqrt(2./n)
					}
					if math.Abs(cov-want) > allowed {
						t.Errorf("%s %s: covariance of %d and %d over the variance is %v", law, sampling, a, b, cov)
					}
				}
			}
		}
	}
}

func moment(x [][]float64, f func([]float64) float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += f(v)
	}
	return sum / float64(len(x))
}

// discrepancy is the centred L2 discrepancy (Hickernell 1998): how unevenly a
// sample fills the unit cube.
func discrepancy(x [][]float64) float64 {
	n, d := float64(len(x)), len(x[0])
	first, second := 0.0, 0.0
	for _, a := range x {
		p := 1.0
		for k := range d {
			z := math.Abs(a[k] - 0.5)
			p *= 1 + 0.5*z - 0.5*z*z
		}
		first += p
		for _, b := range x {
			p := 1.0
			for k := range d {
				p *= 1 + 0.5*math.Abs(a[k]-0.5) + 0.5*math.Abs(b[k]-0.5) - 0.5*math.Abs(a[k]-b[k])
			}
			second += p
		}
	}
	return math.Pow(13./12, float64(d)) - 2/n*first + second/n/n
}

// Samples fill their space as evenly as SciPy's of the same kind do: the mean of
// 40 seeds within the range of SciPy's 300, and within a tenth of their mean (the
// mean of 40 has a deviation of some 3 %).
func TestDiscrepancyIsThatOfSciPy(t *testing.T) {
	v := readVectors(t)
	if got := discrepancy(v.Sample); math.Abs(got-v.SampleDiscrepancy) > 1e-12 {
		t.Fatalf("of SciPy's own sample: %v, SciPy %v", got, v.SampleDiscrepancy)
	}
	for sampling, want := range map[Sampling][3]float64{Latin: v.Latin, Independent: v.Independent} {
		const seeds = 40
		mean := 0.0
		for seed := range int64(seeds) {
			mean += discrepancy(spreads(v.D, int64(v.N), Uniform, sampling, seed).sample()) / seeds
		}
		if mean < want[0] || mean > want[2] || math.Abs(mean/want[1]-1) > 0.1 {
			t.Errorf("%s: mean %v, SciPy %v", sampling, mean, want)
		}
	}
}

// A draw is a function of the seed and its number: another seed gives others,
// the order in which they are asked for changes nothing.
func TestDrawsHangOnSeedAndNumberAlone(t *testing.T) {
	for _, sampling := range Samplings {
		st := spreads(2, 500, Normal, sampling, 3)
		forward := st.sample()
		for i := len(forward) - 1; i >= 0; i-- {
			if !slices.Equal(st.draw(nil, int64(i)), forward[i]) {
				t.Fatalf("%s: draw %d differs when asked for in another order", sampling, i)
			}
		}
		other, same := spreads(2, 500, Normal, sampling, 4).sample(), 0
		for i := range other {
			if other[i][0] == forward[i][0] {
				same++
			}
		}
		if same > 0 {
			t.Errorf("%s: %d draws are the same with another seed", sampling, same)
		}
	}
}
