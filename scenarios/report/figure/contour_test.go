package figure

import (
	"math"
	"math/rand/v2"
	"testing"
)

// field is a map of f over a square grid from −1 to 1.
func field(n int, f func(x, y float64) float64) *Map {
	m := &Map{}
	for i := range n {
		at := -1 + 2*float64(i)/float64(n-1)
		m.X, m.Y = append(m.X, at), append(m.Y, at)
	}
	for _, y := range m.Y {
		var row []float64
		for _, x := range m.X {
			row = append(row, f(x, y))
		}
		m.Z = append(m.Z, row)
	}
	return m
}

// The line of x² + y² = r² is a circle: closed, and with linear interpolation in
// squares of side h no further off than h²/8·|∂²z|/|∇z| = h²/(8r) at the sides.
func TestContourOfACircle(t *testing.T) {
	const n, r = 41, 0.6
	h := 2.0 / (n - 1)
	lines := field(n, func(x, y float64) float64 { return x*x + y*y }).lines(r * r)
	if len(lines) != 1 {
		t.Fatalf("%d lines, not one circle", len(lines))
	}
	l := lines[0]
	if l[0] != l[len(l)-1] {
		t.Errorf("it begins at %v and ends at %v", l[0], l[len(l)-1])
	}
	around := 0.0
	for i, p := range l {
		if off := math.Abs(math.Hypot(p[0], p[1]) - r); off > h*h/(8*r)*1.01 {
			t.Errorf("%v is off by %v", p, off)
		}
		if i > 0 {
			around += math.Hypot(p[0]-l[i-1][0], p[1]-l[i-1][1])
		}
	}
	if want := 2 * math.Pi * r; math.Abs(around-want) > 0.002*want { // a polygon of some 100 sides
		t.Errorf("it is %v around, not %v", around, want)
	}
}

func TestContoursOfEverySort(t *testing.T) {
	for _, c := range []struct {
		name string
		m    *Map
		at   float64
		want int
	}{
		{"none", field(5, func(x, y float64) float64 { return x }), 7, 0},
		{"a straight line", field(5, func(x, y float64) float64 { return x - 0.1 }), 0, 1},
		{"a saddle, two lines", field(4, func(x, y float64) float64 { return x * y }), 0.01, 2},
		{"two hills", field(41, func(x, y float64) float64 {
			return math.Max(1-6*math.Hypot(x-0.5, y), 1-6*math.Hypot(x+0.5, y))
		}), 0.5, 2},
		{"cut by a blank", field(21, func(x, y float64) float64 {
			if math.Abs(y) < 0.2 {
				return math.NaN()
			}
			return x + 0.03
		}), 0, 2},
		{"beside infinity", field(5, func(x, y float64) float64 {
			if x > 0 {
				return math.Inf(1)
			}
			return -1
		}), 0, 1},
	} {
		t.Run(c.name, func(t *testing.T) {
			lines := c.m.lines(c.at)
			if len(lines) != c.want {
				t.Errorf("%d lines, want %d", len(lines), c.want)
			}
			for _, l := range lines {
				for _, p := range l {
					if math.IsNaN(p[0]+p[1]) || math.Abs(p[0]) > 1 || math.Abs(p[1]) > 1 {
						t.Errorf("a point at %v", p)
					}
				}
			}
		})
	}
}

// The blocks of a band cover every cell that reaches it once, and no other.
func TestBlocksCoverTheirCells(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for range 50 {
		m := field(3+random.IntN(12), func(x, y float64) float64 {
			if random.IntN(8) == 0 {
				return math.NaN()
			}
			return math.Floor(4*random.Float64()) / 4
		})
		m.Contours = []float64{0.2, 0.45, 0.7}
		c := newCells(m, false, false)
		for band := range 4 {
			count := make(map[[2]int]int)
			for _, b := range c.blocks(band) {
				for ix := b.x0; ix < b.x1; ix++ {
					for iy := b.y0; iy < b.y1; iy++ {
						count[[2]int{ix, iy}]++
					}
				}
			}
			for iy, row := range m.Z {
				for ix, z := range row {
					want := 0
					if z >= append([]float64{math.Inf(-1)}, m.Contours...)[band] {
						want = 1
					}
					if count[[2]int{ix, iy}] != want {
						t.Fatalf("cell %d, %d of value %v is %d times in band %d", ix, iy, z, count[[2]int{ix, iy}], band)
					}
				}
			}
		}
	}
}

func TestBorders(t *testing.T) {
	for _, c := range []struct {
		name string
		at   []float64
		log  bool
		want []float64
	}{
		{"even", []float64{0, 1, 2}, false, []float64{-0.5, 0.5, 1.5, 2.5}},
		{"uneven", []float64{0, 1, 3}, false, []float64{-0.5, 0.5, 2, 4}},
		{"log", []float64{1, 100, 10000}, true, []float64{0.1, 10, 1000, 100000}},
	} {
		got := borders(c.at, c.log)
		for i := range c.want {
			if math.Abs(got[i]-c.want[i]) > 1e-9*math.Abs(c.want[i]) {
				t.Errorf("%s: %v, want %v", c.name, got, c.want)
				break
			}
		}
	}
}
