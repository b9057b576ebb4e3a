package canvas

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the golden pictures anew; look at them before keeping them")

// golden compares a picture with testdata/name.txt.
func golden(t *testing.T, name, got string) {
	t.Helper()
	file := filepath.Join("testdata", name+".txt")
	if *update {
		if err := os.WriteFile(file, []byte(got+"\n"), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got+"\n" != string(want) {
		t.Errorf("%s differs.\ngot:\n%s\nwant:\n%s", name, got, want)
	}
}

// lit reads the dots back out of braille cells by the numbering of the Unicode
// names, not by the package's table. The key is column, row in dots.
func lit(r Region) map[[2]int]Ink {
	place := [9][2]int{1: {0, 0}, 2: {0, 1}, 3: {0, 2}, 4: {1, 0}, 5: {1, 1}, 6: {1, 2}, 7: {0, 3}, 8: {1, 3}}
	out := map[[2]int]Ink{}
	w, h := r.Size()
	for y := range h {
		for x := range w {
			c := r.At(x, y)
			if c.Rune < 0x2800 || c.Rune > 0x28ff {
				continue
			}
			for dot := 1; dot <= 8; dot++ {
				if (c.Rune-0x2800)>>(dot-1)&1 == 1 {
					out[[2]int{2*x + place[dot][0], 4*y + place[dot][1]}] = c.Ink
				}
			}
		}
	}
	return out
}

// bare is a plot without room for anything but dots: its ranges are the dot
// coordinates, so that values are columns and, from the bottom, rows of dots.
func bare(cols, rows int) (*Grid, *Plot) {
	g := NewGrid(cols, rows)
	p := &Plot{}
	p.X = Axis{Lo: 0, Hi: float64(2*cols - 1)}
	p.Y = Axis{Lo: 0, Hi: float64(4*rows - 1)}
	if cols >= axisWidth && rows >= axisHeight {
		panic("a bare plot must be too small for axes")
	}
	p.Begin(g.Whole())
	return g, p
}

// checkRows holds what String writes to the size of the grid.
func checkRows(t *testing.T, g *Grid) {
	t.Helper()
	w, h := g.Size()
	rows := strings.Split(g.String(), "\n")
	if h > 0 && len(rows) != h {
		t.Fatalf("%d rows of %d", len(rows), h)
	}
	for y, row := range rows {
		if n := Width(row); n > w {
			t.Fatalf("row %d is %d columns wide of %d: %q", y, n, w, row)
		}
		for _, c := range row {
			if c < ' ' || c >= 0x7f && c < 0xa0 {
				t.Fatalf("row %d holds the control character %U", y, c)
			}
		}
	}
}
