package plant

import (
	"fmt"
	"math"
	"testing"
)

func TestBoucWenAgainstAnODESolver(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []struct {
			Name    string
			N, Beta float64
			Y, Z    []float64
		}
	}
	load(t, "testdata/boucwen.json", &vectors)
	if len(vectors.Cases) != 22 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		t.Run(fmt.Sprintf("%s, n=%v, beta=%v", c.Name, c.N, c.Beta), func(t *testing.T) {
			// Closed form: what the solver's relative tolerance of 1e-13
			// leaves after some steps.
			tolerance, refined := 1e-12, 1e-12
			switch {
			case c.N >= 2:
				// Fourth order: sixteen times as many steps leave 1/65536.
				tolerance, refined = 1e-6, 1e-6/65536
			case c.N > 1:
				// A start from |ζ|^n = 0 has local order n+1 only: 16^2.2.
				tolerance, refined = 5e-6, 5e-6/445
			}
			const k, yield, hardening = 3e7, 0.012, 0.08
			b := NewBoucWen(k, yield, hardening, c.N, c.Beta)
			fine := NewBoucWen(1, 1, 0, c.N, c.Beta)
			fine.step /= 16
			b.Start(0)
			fine.Start(0)
			for i, y := range c.Y {
				f := b.Advance(y*yield, 0, 0)
				z := (f/k - hardening*y*yield) / ((1 - hardening) * yield)
				// Up to 300 yield displacements beside z cost digits of z.
				near(t, fmt.Sprintf("z at %d", i), z, c.Z[i], tolerance+1e-16*math.Abs(y))
				near(t, fmt.Sprintf("refined z at %d", i), fine.Advance(y, 0, 0), c.Z[i], refined)
			}
		})
	}
}

func TestBoucWenFirstLoading(t *testing.T) {
	const k, yield = 2e7, 0.015
	for _, sign := range []float64{1, -1} {
		for _, steps := range []int{1, 7, 500} {
			b := NewBoucWen(k, yield, 0, 1, 0.5)
			b.Start(0)
			for i := 1; i <= steps; i++ {
				y := sign * 0.06 * float64(i) / float64(steps)
				want := -sign * k * yield * math.Expm1(-math.Abs(y)/yield)
				near(t, "f", b.Advance(y, 0, 0), want, 1e-14*k*yield)
			}
		}
	}
	// A tiny move is elastic to all its digits: a stability analysis asks so.
	for _, n := range []float64{1, 2, 3.5} {
		b := NewBoucWen(k, yield, 0.1, n, 0.5)
		for _, y := range []float64{1e-9, -1e-12, 1e-15} {
			b.Start(0)
			// f = k·y·(1 − (1−h)·|y/y_d|^n/(n+1) …)
			near(t, "f/ky", b.Advance(y, 0, 0)/(k*y), 1, math.Abs(y)/yield+3e-16)
		}
	}
}

// With elastic unloading (β = ½, n = 1, y_d = k = 1) the steady loop between
// ±A climbs elastically from −z_m to zero, and from there by 1 − e^(−x) over
// the rest L = 2A − z_m of the way, so that z_m = 1 − e^(−L). Half the loop
// is L − z_m − z_m²/2.
func TestBoucWenLoopEnergyInClosedForm(t *testing.T) {
	for _, amplitude := range []float64{0.3, 1, 4} {
		zm := 0.0
		for range 2000 { // a contraction
			zm = -math.Expm1(-(2*amplitude - zm))
		}
		want := 2 * (2*amplitude - zm - zm - zm*zm/2)
		const count = 8000
		b := NewBoucWen(1, 1, 0, 1, 0.5)
		got := cycle(b, amplitude, count, 30)
		// Trapezoid rule with steps h ≤ 2πA/N: at most h²/12 times the total
		// variation of the slope, which is below 6 in a loop.
		h := 2 * math.Pi * amplitude / count
		near(t, fmt.Sprintf("A=%v", amplitude), got, want, h*h/2)
	}
}

// cycle returns what the last of several cycles between ±amplitude dissipates.
func cycle(e Element, amplitude float64, count, cycles int) float64 {
	e.Start(0)
	var before, after float64
	for range cycles {
		_, before = e.Energy()
		for k := 1; k <= count; k++ {
			phase := 2 * math.Pi * float64(k) / float64(count)
			e.Advance(amplitude*math.Sin(phase), amplitude*math.Cos(phase), 0)
		}
		_, after = e.Energy()
	}
	return after - before
}

// An elastoplastic loop dissipates 4·F_y·(u_m − u_y). The sharper the knee, the
// nearer to it comes the smooth one: what its knee cuts off, once on each side,
// is ∫(min(y, 1) − z) dy = ∫₀¹ dz/(1 + z + … + z^(n−1)) − ½ in F_y·u_y.
func TestBoucWenApproachesElastoplastic(t *testing.T) {
	const fy, uy, ductility, count = 3e5, 0.01, 6, 8000
	const um = ductility * uy
	for _, n := range []int{2, 3, 4, 8, 20} {
		got := cycle(NewBoucWen(fy/uy, uy, 0, float64(n), 0.5), um, count, 3)
		want := 4*fy*(um-uy) - 2*fy*uy*knee(n)
		// In F_y·u_y: Runge–Kutta 1e-6 of F_y over a path of 24 u_y, and the
		// trapezoid rule, h²/12 times the variation of the slope, below 6. What
		// n = 2 still lacks to full yield, 2e^(−22), is less.
		h := 2 * math.Pi * ductility / count
		near(t, fmt.Sprintf("n = %d", n), got, want, (24e-6+h*h/2)*fy*uy)
		if n == 20 { // by then the knee takes less than a thousandth
			near(t, "elastoplastic", got, 4*fy*(um-uy), 1e-3*4*fy*(um-uy))
		}
	}
}

// knee is ∫₀¹ dz/(1 + z + … + z^(n−1)) − ½, by Simpson's rule.
func knee(n int) float64 {
	const pieces = 2000
	sum := 0.0
	for i := range pieces + 1 {
		z, all := float64(i)/pieces, 0.0
		for range n {
			all = all*z + 1
		}
		weight := float64(2 + 2*(i%2))
		if i == 0 || i == pieces {
			weight = 1
		}
		sum += weight / all
	}
	return sum/(3*pieces) - 0.5
}

func TestBoucWenNeverPassesItsYieldForce(t *testing.T) {
	for _, n := range []float64{1, 1.5, 2, 5, 20} {
		for _, beta := range []float64{0.01, 0.3, 0.5, 1} {
			b := NewBoucWen(1, 1, 0, n, beta)
			b.Start(0)
			for _, y := range []float64{0.5, 1e3, -1e-3, 1e9, 1e300, -1e300, math.MaxFloat64, 0, math.Inf(1)} {
				if f := b.Advance(y, 0, 0); !(math.Abs(f) <= 1) && !math.IsInf(y, 0) {
					t.Errorf("n=%v, beta=%v: force %v at %v", n, beta, f, y)
				}
			}
			b.Start(0) // and comes back from there
			near(t, "after a new start", b.Advance(1e-6, 0, 0), 1e-6, 1e-11)
		}
	}
}

func TestApproachToFullPrecision(t *testing.T) {
	for x := 1e-18; x < 50; x *= 1.07 {
		// Both are good to an ulp or two.
		near(t, fmt.Sprintf("1 − e^(−x) at %v, relative", x), -approach(x)/math.Expm1(-x), 1, 7e-16)
	}
}

// The path to zero, ∫₀ˢ dσ/(1 − aσ^n), is −log(1 − as)/a for n = 1, and for n = 2
// artanh(s√a)/√a where a > 0 and arctan(s√−a)/√−a where a < 0.
func TestPathToZero(t *testing.T) {
	for _, s := range []float64{1e-6, 0.01, 0.05, 0.1, 0.3} {
		for _, beta := range []float64{0.05, 0.3, 0.5, 0.7, 1} {
			a := 1 - 2*beta
			one, two := s, s
			if a != 0 {
				one = -math.Log1p(-a*s) / a
			}
			if r := math.Sqrt(math.Abs(a)); a > 0 {
				two = math.Atanh(s*r) / r
			} else if a < 0 {
				two = math.Atan(s*r) / r
			}
			near(t, fmt.Sprintf("n = 1, a = %v", a), NewBoucWen(1, 1, 0, 1, beta).toZero(s)/one, 1, 1e-15)
			near(t, fmt.Sprintf("n = 2, a = %v", a), NewBoucWen(1, 1, 0, 2, beta).toZero(s)/two, 1, 1e-15)
		}
	}
}
