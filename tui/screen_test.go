package tui

import (
	"testing"

	"github.com/gdamore/tcell/v2"

	"antelag/tui/canvas"
)

// What must be told apart is told apart in both palettes, without red against
// green in the one and without any colour in the other.
func TestPalettes(t *testing.T) {
	apart := [][2]canvas.Ink{
		{canvas.Good, canvas.Bad}, {canvas.Plain, canvas.Bad}, {canvas.Plain, canvas.Selected},
		{canvas.Plain, canvas.Warn}, {canvas.Plain, canvas.Bold}, {canvas.Plain, canvas.Dim},
	}
	for name, p := range map[string]*palette{"colours": paletteFor(16), "monochrome": paletteFor(0)} {
		for _, pair := range apart {
			if p[pair[0]] == p[pair[1]] {
				t.Errorf("%s: %v looks like %v", name, pair[0], pair[1])
			}
		}
		for ink := range canvas.Inks {
			fg, bg, _ := p[ink].Decompose()
			for _, c := range []tcell.Color{fg, bg} {
				switch {
				case name == "monochrome" && c != tcell.ColorDefault:
					t.Errorf("%s: %v has a colour", name, ink)
				case c == tcell.ColorRed || c == tcell.ColorGreen || c == tcell.ColorMaroon || c == tcell.ColorLime:
					t.Errorf("%s: %v is red or green", name, ink)
				case c != tcell.ColorDefault && c > tcell.ColorWhite:
					t.Errorf("%s: %v is none of the sixteen colours", name, ink)
				}
			}
		}
	}
	for _, pair := range [][2]canvas.Ink{{canvas.Target, canvas.Command}, {canvas.Command, canvas.Measured}, {canvas.Target, canvas.Measured}, {canvas.Measured, canvas.Error}} {
		if p := colours(); p[pair[0]] == p[pair[1]] {
			t.Errorf("%v looks like %v", pair[0], pair[1])
		}
	}
}

// A wide rune is one cell to the terminal, and blanks are blanks.
func TestPaint(t *testing.T) {
	sim := tcell.NewSimulationScreen("UTF-8")
	if err := sim.Init(); err != nil {
		t.Fatal(err)
	}
	defer sim.Fini()
	sim.SetSize(8, 2)
	g := canvas.NewGrid(8, 2)
	g.Whole().Text(0, 0, canvas.Bold, "a語b")
	monochrome().paint(g, sim)
	cells, w, _ := sim.GetContents()
	want := map[int]string{0: "a", 1: "語", 3: "b", 4: " ", w: " "}
	for at, text := range want {
		if got := string(cells[at].Runes); got != text {
			t.Errorf("cell %d is %q, want %q", at, got, text)
		}
	}
}
