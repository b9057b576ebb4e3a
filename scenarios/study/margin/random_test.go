package margin

import (
	"context"
	"flag"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"antelag/rtloop"
	"antelag/rtloop/stability"
	"antelag/scenarios"
)

// fixed is every compensator that does not adapt, with ranges for what matters.
var fixed = []func(r *rand.Rand, delay float64) string{
	func(*rand.Rand, float64) string { return `kind = "none"` },
	func(r *rand.Rand, d float64) string {
		return fmt.Sprintf("kind = \"polynomial\"\norder = %d\ndelay = \"%.6f s\"", 1+r.IntN(4), d)
	},
	func(_ *rand.Rand, d float64) string {
		return fmt.Sprintf("kind = \"linear-acceleration\"\ndelay = \"%.6f s\"", d)
	},
	func(_ *rand.Rand, d float64) string { return fmt.Sprintf("kind = \"taylor\"\ndelay = \"%.6f s\"", d) },
	func(r *rand.Rand, d float64) string {
		return fmt.Sprintf("kind = \"model-inverse\"\norder = %d\ndelay = \"%.6f s\"\nlag = \"%.6f s\"\ngain = %.4f", 1+r.IntN(3), 0.6*d, 0.4*d, 0.95+0.1*r.Float64())
	},
	func(_ *rand.Rand, d float64) string { return fmt.Sprintf("kind = \"inverse\"\ndelay = \"%.6f s\"", d) },
	func(r *rand.Rand, d float64) string {
		return fmt.Sprintf("kind = \"least-squares-polynomial\"\norder = %d\npoints = %d\ndelay = \"%.6f s\"", 1+r.IntN(3), 10+r.IntN(40), d)
	},
}

// randomLinear is scenario i of a family of linear ones, 1 to 6 storeys, 1 to 3
// channels, released from 10 mm.
func randomLinear(tb testing.TB, i int) *scenarios.Scenario {
	tb.Helper()
	r := rand.New(rand.NewPCG(uint64(i), 7))
	var b strings.Builder
	between := func(lo, hi float64) float64 { return lo + (hi-lo)*r.Float64() }
	rate := []float64{512, 1024, 2048}[r.IntN(3)]
	integrators := []string{"CR", "newmark-explicit", "KR-alpha", "alpha-OS"}
	fmt.Fprintf(&b, "[loop]\nrate = \"%v Hz\"\nduration = \"2000 s\"\nslowdown = %v\nhold = \"%s\"\n", rate, []float64{1, 1, 1, 2}[r.IntN(4)], []string{"ramp", "step"}[r.IntN(2)])
	fmt.Fprintf(&b, "[substructure]\nintegrator = \"%s\"\ndamping_ratio = %.4f\n", integrators[i%4], between(0.005, 0.06))
	storeys := 1 + r.IntN(6)
	stiffness := between(3e6, 3e7)
	for range storeys {
		fmt.Fprintf(&b, "[[substructure.storey]]\nmass = \"%.3f t\"\nstiffness = \"%.1f N/m\"\n", between(30, 70), stiffness*between(0.6, 1.4))
	}
	b.WriteString("[excitation]\nkind = \"release\"\ndrives = \"ground\"\namplitude = \"10 mm\"\n")
	for j := range 1 + r.IntN(3) {
		from := r.IntN(storeys)
		to := from + 1 + r.IntN(storeys-from)
		delay, lag := between(0, 0.02), between(0, 0.01)
		fmt.Fprintf(&b, "[[channel]]\nname = \"c%d\"\nbetween = [%d, %d]\n[channel.actuator]\n", j, from, to)
		if r.IntN(3) == 0 {
			fmt.Fprintf(&b, "kind = \"second-order\"\nfrequency = \"%.3f Hz\"\ndamping_ratio = %.3f\ndelay = \"%.6f s\"\n", between(15, 60), between(0.5, 1.2), delay)
		} else {
			fmt.Fprintf(&b, "kind = \"lag-delay\"\nlag = \"%.6f s\"\ndelay = \"%.6f s\"\ngain = %.4f\n", lag*float64(r.IntN(2)), delay, between(0.95, 1.05))
		}
		fmt.Fprintf(&b, "[[channel.specimen]]\nkind = \"spring\"\nstiffness = \"%.1f N/m\"\n", stiffness*between(0.05, 1))
		switch r.IntN(4) {
		case 0:
			fmt.Fprintf(&b, "[[channel.specimen]]\nkind = \"viscous\"\ndamping = \"%.1f N*s/m\"\n", between(1e4, 3e5))
		case 1:
			fmt.Fprintf(&b, "[[channel.specimen]]\nkind = \"maxwell\"\nstiffness = \"%.1f N/m\"\ndamping = \"%.1f N*s/m\"\n", stiffness*between(0.05, 0.5), between(1e4, 3e5))
		case 2:
			fmt.Fprintf(&b, "[[channel.specimen]]\nkind = \"mass\"\nmass = \"%.1f kg\"\n", between(50, 1500))
		}
		fmt.Fprintf(&b, "[channel.compensator]\n%s\n", fixed[(i+j)%len(fixed)](r, between(0.3, 1.3)*(delay+lag)+0.001))
	}
	s, err := scenarios.Parse(fmt.Sprintf("random-%d.toml", i), []byte(b.String()), ".")
	if err != nil {
		tb.Fatalf("%v\n%s", err, b.String())
	}
	return s
}

// both returns the spectral radius by the characteristic function and by eigenvalues.
func both(tb testing.TB, s *scenarios.Scenario) (fast, exact float64) {
	tb.Helper()
	m, linear, err := (&analyst{s: s}).model(s)
	if err != nil {
		tb.Fatal(err)
	}
	if fast, err = m.Radius(); err != nil {
		tb.Errorf("%s: %v", s.Name, err)
	}
	system, err := stability.Linearize(linear)
	if err != nil {
		tb.Fatal(err)
	}
	spectrum, err := system.Spectrum()
	if err != nil {
		tb.Fatal(err)
	}
	return fast, spectrum.Radius
}

// loops is how many random loops are looked at, and 5/2 cells of maps each. The full
// evidence is -loops 200; it takes minutes.
var loops = flag.Int("loops", 16, "how many random loops to look at, and cells of a map by 5/2")

// The characteristic function and the eigenvalues of the state matrix have nothing in
// common but the parts; they come to the same.
func TestBothWays(t *testing.T) {
	for i := range *loops {
		fast, exact := both(t, randomLinear(t, i))
		// Eigenvalues of matrices this far from symmetric are good to some 1e-12;
		// of nearly equal ones half the digits are lost.
		if math.Abs(fast-exact) > 1e-9 {
			t.Errorf("%d: %.12f by the characteristic function, %.12f by eigenvalues", i, fast, exact)
		}
	}
}

// released lets a scenario go and returns its growth: the largest displacement in the
// last sixth of so many ticks over that in the sixth before the middle; and the last
// energy margin that there is.
func released(tb testing.TB, s *scenarios.Scenario, ticks int64) (growth, margin float64) {
	tb.Helper()
	rig, err := s.Build()
	if err != nil {
		tb.Fatal(err)
	}
	rig.Reference = nil
	loop := rig.Lanes[0].Loop
	if err := rig.Open(); err != nil {
		tb.Fatal(err)
	}
	var early, late float64
	margin = math.NaN()
	for k := int64(0); k < ticks; k++ {
		if !rig.Advance() && loop.Outcome() == rtloop.Diverged {
			return math.Inf(1), margin
		}
		if m := loop.Margin(); !math.IsNaN(m) {
			margin = m // undefined again when the motion has died away
		}
		largest := 0.0
		for _, x := range loop.Displacements() {
			largest = max(largest, math.Abs(x))
		}
		switch {
		case k >= ticks/3 && k < ticks/2:
			early = max(early, largest)
		case k >= ticks-ticks/6:
			late = max(late, largest)
		}
	}
	return late / early, margin
}

// A released loop grows where the spectral radius is above 1 and nowhere else. (Loops
// within 1e-4 of it would take too long to tell.)
//
// In the end one mode is left, energy E goes as e^(2σt), and of the balance
// ΔE = W_i − W_d the energy margin 1 − W_i/W_d has the sign of −σ, whatever the
// number of storeys and channels. That needs ticks that resolve the mode, for work is
// summed by the trapezoid rule, and a window of energy that fits into the time until
// the loop has diverged.
func TestRadiusIsGrowth(t *testing.T) {
	judged, margins := 0, 0
	for i := 0; judged < *loops; i++ {
		s := randomLinear(t, i)
		m, _, err := (&analyst{s: s}).model(s)
		if err != nil {
			t.Fatal(err)
		}
		poles, err := m.Poles()
		if err != nil {
			t.Fatal(err)
		}
		r := size(poles)
		rate := math.Abs(math.Log(r))
		if rate < 1e-4 {
			continue
		}
		judged++
		growth, margin := released(t, s, int64(12/rate)+2000)
		if (growth > 1) != (r > 1) {
			t.Errorf("%d: spectral radius %v, growth %v", i, r, growth)
		}
		if resolved := cmplx.Phase(poles[0]) < 0.3; !resolved || math.IsNaN(margin) {
			continue
		}
		margins++
		if (margin < 0) != (r > 1) {
			t.Errorf("%d: spectral radius %v, energy margin %v", i, r, margin)
		}
	}
	t.Logf("%d loops, %d of them with an energy margin that says the same", judged, margins)
}

// Where the energy margin does not say it: a loop that grows by 1 % a tick at two
// fifths of the rate. Between two of its ticks the force turns by 143°, so that the
// trapezoid rule gives its work no sign to be relied on.
func TestEnergyMarginOfAnUnresolvedMode(t *testing.T) {
	s := randomLinear(t, 186)
	r, err := Of(context.Background(), s, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if _, margin := released(t, s, 3000); r.Stable || r.Mode.Frequency < 800 || !(margin > 1) {
		t.Errorf("radius %v, mode %v Hz, margin %v: not the example that it was", r.SpectralRadius, r.Mode.Frequency, margin)
	}
}

// The cells of a map are what the eigenvalues say.
func TestMapIsWhatEigenvaluesSay(t *testing.T) {
	s, err := scenarios.Load("archive")
	if err != nil {
		t.Fatal(err)
	}
	for _, text := range []string{
		"damper.actuator.delay=0:60 ms:200,damper.compensator.delay=0:32 ms:200", // put together from the axes
		"damper.compensator.delay=0:32 ms:30,loop.rate=300 Hz:1500 Hz:30",        // built cell by cell
	} {
		x, y, err := ParseMap(s, text)
		if err != nil {
			t.Fatal(err)
		}
		if *loops < 200 {
			x.N, y.N = min(x.N, 20), min(y.N, 20)
		}
		g, err := Map(context.Background(), s, x, y, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if g.Refused > 0 {
			t.Errorf("%s: %d cells have no value: %v", text, g.Refused, g.Reason)
		}
		plain, err := s.Plain()
		if err != nil {
			t.Fatal(err)
		}
		rng := rand.New(rand.NewPCG(5, 6))
		for range *loops * 5 / 2 / 2 {
			ix, iy := rng.IntN(x.N), rng.IntN(y.N)
			cell, err := plain.With(change(&x, ix), change(&y, iy))
			if err != nil {
				t.Fatal(err)
			}
			if _, exact := both(t, cell); math.Abs(g.Radius[iy][ix]-exact) > 1e-9 {
				t.Errorf("%s: %v in the map, %v by eigenvalues", cell.Name, g.Radius[iy][ix], exact)
			}
		}
	}
}

// A cell of a map is what the report says of a scenario with those settings.
func TestMapIsWhatTheReportSays(t *testing.T) {
	s, err := scenarios.Load("piperack")
	if err != nil {
		t.Fatal(err)
	}
	if s, err = s.Plain(); err != nil {
		t.Fatal(err)
	}
	x, y, err := ParseMap(s, "brace-low.actuator.delay=0:60 ms:13,brace-high.compensator.delay=0:60 ms:11")
	if err != nil {
		t.Fatal(err)
	}
	g, err := Map(context.Background(), s, x, y, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for iy := 0; iy < y.N; iy += 2 {
		for ix := 0; ix < x.N; ix += 3 {
			cell, err := s.With(change(&x, ix), change(&y, iy))
			if err != nil {
				t.Fatal(err)
			}
			m, _, err := (&analyst{s: cell}).model(cell)
			if err != nil {
				t.Fatal(err)
			}
			poles, err := m.Poles()
			if err != nil {
				t.Fatal(err)
			}
			if d := m.LeastDamping(poles); math.Abs(g.Radius[iy][ix]-size(poles)) > 1e-11 || math.Abs(g.Damping[iy][ix]-d) > 1e-9 {
				t.Errorf("cell %d, %d: radius %v, damping %v; alone %v, %v", ix, iy, g.Radius[iy][ix], g.Damping[iy][ix], size(poles), d)
			}
		}
	}
}
