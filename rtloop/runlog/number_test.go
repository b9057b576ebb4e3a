package runlog

import (
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

// What scan reads is what strconv reads, bit for bit, whatever the number and
// however it is written.
func TestScanEqualsStrconv(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	taken := 0
	check := func(text string) {
		want, err := strconv.ParseFloat(text, 64)
		got, n := scan([]byte(text), ',')
		if n == 0 {
			return
		}
		if err != nil {
			t.Fatal(err)
		}
		taken++
		if n != len(text) || math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%s: %d bytes read as %v (%x), strconv has %v (%x)", text, n, got, math.Float64bits(got), want, math.Float64bits(want))
		}
	}
	for range 60000 {
		bits := r.Uint64()
		if v := math.Float64frombits(bits); !math.IsNaN(v) && !math.IsInf(v, 0) {
			check(strconv.FormatFloat(v, 'g', -1, 64))
			check(strconv.FormatFloat(v, 'e', r.IntN(20), 64))
		}
		// As logs have them, and as they lie at and beside a tie of rounding.
		v := math.Ldexp(float64(r.Int64()), -63-r.IntN(40)) * float64(1-2*r.IntN(2))
		check(strconv.FormatFloat(v, 'g', -1, 64))
		check(strconv.FormatFloat(v, 'f', r.IntN(25), 64))
		check(strconv.FormatUint(bits>>r.IntN(64), 10) + "e" + strconv.Itoa(r.IntN(50)-28))
		half := (r.Uint64()>>11|1<<52)<<1 | 1 // 54 bits, the last one half a unit
		check(strconv.FormatUint(half*5+uint64(r.IntN(3))-1, 10) + "e-1")
	}
	if taken < 200000 {
		t.Errorf("only %d of the numbers were read at once", taken)
	}
}

func TestScanTakesNumbersOnly(t *testing.T) {
	for _, c := range []struct {
		text string
		mark byte
		v    float64
		n    int
	}{
		{"1.5", ',', 1.5, 3}, {"1,5", ',', 1.5, 3}, {"1,5", '.', 1, 1}, {"-0", '.', math.Copysign(0, -1), 2}, {"+2.", '.', 2, 3}, {".5", '.', 0.5, 2},
		{"1e3", '.', 1000, 3}, {"1E-3;", '.', 0.001, 4}, {"12 ", '.', 12, 2}, {"1.5.2", '.', 1.5, 3},
		{"", '.', 0, 0}, {"-", '.', 0, 0}, {".", '.', 0, 0}, {"e5", '.', 0, 0}, {"1e", '.', 0, 0}, {"1e+", '.', 0, 0}, {"1e99999", '.', 0, 0}, {"NaN", '.', 0, 0},
		{"12345678901234567890.5", '.', 0, 0}, {"0000000000000000000000001.5", '.', 1.5, 27}, {"0.000000000000000000000001", '.', 1e-24, 26},
	} {
		v, n := scan([]byte(c.text), c.mark)
		if n != c.n || n > 0 && math.Float64bits(v) != math.Float64bits(c.v) {
			t.Errorf("%q: %v, %d bytes; want %v, %d", c.text, v, n, c.v, c.n)
		}
	}
}

func FuzzScan(f *testing.F) {
	for _, s := range []string{"1.5", "-1e-7", "0.12345678901234567", "9007199254740993", "1,5", "1d5"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		got, n := scan([]byte(text), '.')
		if n == 0 {
			return
		}
		want, err := strconv.ParseFloat(text[:n], 64)
		if err != nil || math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%q: %v, strconv has %v, %v", text[:n], got, want, err)
		}
	})
}
