package canvas

import (
	"strings"
	"testing"
)

func TestGridKeepsCellsAndBounds(t *testing.T) {
	g := NewGrid(3, 2)
	g.Set(1, 0, Cell{'a', Good})
	g.Set(2, 1, Cell{'b', Plain})
	for _, p := range [][2]int{{-1, 0}, {3, 0}, {0, -1}, {0, 2}, {1 << 40, 1 << 40}} {
		g.Set(p[0], p[1], Cell{'x', Bad})
		if got := g.At(p[0], p[1]); got != (Cell{}) {
			t.Errorf("outside at %v: %v", p, got)
		}
	}
	if got := g.At(1, 0); got != (Cell{'a', Good}) {
		t.Errorf("read back %v", got)
	}
	if got, want := g.String(), " a\n  b"; got != want {
		t.Errorf("picture %q, want %q", got, want)
	}
	g.Clear()
	if got := g.String(); got != "\n" {
		t.Errorf("cleared picture %q", got)
	}
}

func TestGridResizeReusesMemoryAndBlanks(t *testing.T) {
	g := NewGrid(20, 10)
	g.Whole().Fill(Cell{'x', Plain})
	if n := testing.AllocsPerRun(10, func() { g.Resize(10, 20); g.Resize(5, 5); g.Resize(20, 10) }); n != 0 {
		t.Errorf("%v allocations", n)
	}
	if got := strings.TrimSpace(g.String()); got != "" {
		t.Errorf("not blank after resize: %q", got)
	}
	for _, size := range [][2]int{{-3, 5}, {5, -3}, {0, 0}} {
		g.Resize(size[0], size[1])
		g.Set(0, 0, Cell{'x', Plain})
		g.Whole().Text(0, 0, Plain, "abc")
		if strings.ContainsAny(g.String(), "xabc") {
			t.Errorf("%v has cells", size)
		}
	}
}

func TestRegionOfALargerGridDrawsOnlyWhatIsLeft(t *testing.T) {
	g := NewGrid(10, 10)
	r := g.Whole().Sub(2, 2, 8, 8)
	g.Resize(5, 4)
	r.Fill(Cell{'x', Plain})
	r.Text(0, 0, Plain, "日本語")
	r.Tint(0, 0, 8, Good)
	if got, want := g.String(), "\n\n  日x\n  xxx"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

func TestWideRunesAreNeverTorn(t *testing.T) {
	for _, c := range []struct {
		name string
		do   func(Region)
		want string
	}{
		{"whole", func(r Region) {}, "日本語"},
		{"left half overwritten", func(r Region) { r.Set(2, 0, Cell{'x', Plain}) }, "日x 語"},
		{"right half overwritten", func(r Region) { r.Set(3, 0, Cell{'x', Plain}) }, "日 x語"},
		{"wide over two halves", func(r Region) { r.Text(1, 0, Plain, "中") }, " 中 語"},
		{"wide as a single cell", func(r Region) { r.Set(0, 0, Cell{'中', Plain}) }, "� 本語"},
		{"tail alone", func(r Region) { r.Set(0, 0, Cell{Tail, Plain}) }, "� 本語"},
	} {
		g := NewGrid(6, 1)
		g.Whole().Text(0, 0, Plain, "日本語")
		c.do(g.Whole())
		if got := g.String(); got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
}

func TestInksHaveNames(t *testing.T) {
	seen := map[string]bool{}
	for i := range Inks {
		if s := i.String(); s == "" || seen[s] {
			t.Errorf("ink %d is called %q", i, s)
		} else {
			seen[s] = true
		}
	}
	if Inks.String() != "unknown" {
		t.Errorf("beyond the last: %q", Inks.String())
	}
}
