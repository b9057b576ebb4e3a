package gauge

import (
	"math/big"
	"math/rand/v2"
	"testing"
)

// TestSumLosesNothing adds terms whose plain sum loses most of its digits and
// compares with exact arithmetic.
func TestSumLosesNothing(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	series := map[string]func(k int) float64{
		"a large term comes and goes": func(k int) float64 {
			return [...]float64{1, 1e16, 1, -1e16}[k%4]
		},
		"tenths":       func(int) float64 { return 0.1 },
		"mixed scales": func(k int) float64 { return random.NormFloat64() * [...]float64{1e-9, 1, 1e9}[k%3] },
	}
	for name, term := range series {
		var sum Sum
		plain := 0.0
		exact := new(big.Float).SetPrec(300)
		for k := range 100_000 {
			v := term(k)
			sum.Add(v)
			plain += v
			exact.Add(exact, new(big.Float).SetFloat64(v))
		}
		want, _ := exact.Float64()
		// Exact but for the roundings of the second number, 10⁻¹⁶ of terms that
		// are themselves 10⁻¹⁶ of the largest partial sum.
		if !agrees(sum.Value(), want, 1e-15) {
			t.Errorf("%s: sum %v, exactly %v", name, sum.Value(), want)
		}
		if agrees(plain, want, 1e-15) {
			t.Errorf("%s: the plain sum is as good, the case shows nothing", name)
		}
	}
}
