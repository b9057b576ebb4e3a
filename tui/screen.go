package tui

import (
	"github.com/gdamore/tcell/v2"

	"antelag/tui/canvas"
)

// terminal is what the dashboard needs of a screen. tcell's screens have it,
// the simulated one too.
type terminal interface {
	Init() error
	Fini()
	Size() (w, h int)
	SetContent(x, y int, primary rune, combining []rune, style tcell.Style)
	Show()
	Sync()
	Colors() int
	EnableMouse(...tcell.MouseFlags)
	HideCursor()
	ChannelEvents(ch chan<- tcell.Event, quit <-chan struct{})
}

// palette says how each role looks.
type palette [canvas.Inks]tcell.Style

// A palette of sixteen colours, of which those are told apart by people who
// see red and green alike: blue against yellow, light against dark. No colour
// says anything that its text or its pattern does not say too.
func colours() *palette {
	plain := tcell.StyleDefault
	ink := func(c tcell.Color) tcell.Style { return plain.Foreground(c) }
	return &palette{
		canvas.Plain:    plain,
		canvas.Dim:      ink(tcell.ColorGray),
		canvas.Bold:     plain.Bold(true),
		canvas.Target:   ink(tcell.ColorWhite).Bold(true),
		canvas.Command:  ink(tcell.ColorTeal),
		canvas.Measured: ink(tcell.ColorYellow),
		canvas.Error:    ink(tcell.ColorFuchsia),
		canvas.Good:     ink(tcell.ColorAqua).Bold(true),
		canvas.Bad:      ink(tcell.ColorBlack).Background(tcell.ColorOlive).Bold(true),
		canvas.Warn:     ink(tcell.ColorYellow).Bold(true),
		canvas.Accent:   ink(tcell.ColorAqua),
		canvas.Selected: plain.Reverse(true),
		canvas.Frame:    ink(tcell.ColorGray),
		canvas.Limit:    ink(tcell.ColorYellow),
		canvas.Cursor:   plain.Reverse(true).Bold(true),
	}
}

// monochrome does without colours.
func monochrome() *palette {
	plain := tcell.StyleDefault
	return &palette{
		canvas.Plain: plain, canvas.Dim: plain.Dim(true), canvas.Bold: plain.Bold(true),
		canvas.Target: plain.Bold(true), canvas.Command: plain, canvas.Measured: plain, canvas.Error: plain,
		canvas.Good: plain.Bold(true), canvas.Bad: plain.Reverse(true), canvas.Warn: plain.Bold(true),
		canvas.Accent: plain.Underline(true), canvas.Selected: plain.Reverse(true),
		canvas.Frame: plain.Dim(true), canvas.Limit: plain.Bold(true), canvas.Cursor: plain.Reverse(true),
	}
}

// fewColours is how many a terminal must have to be drawn on in colour.
const fewColours = 8

func paletteFor(colourCount int) *palette {
	if colourCount >= fewColours {
		return colours()
	}
	return monochrome()
}

// paint puts a grid on the terminal.
func (p *palette) paint(g *canvas.Grid, t terminal) {
	w, h := g.Size()
	for y := range h {
		for x := range w {
			c := g.At(x, y)
			switch c.Rune {
			case canvas.Tail:
				continue // the wide rune to the left covers it
			case 0:
				c.Rune = ' '
			}
			style := tcell.StyleDefault
			if c.Ink < canvas.Inks {
				style = p[c.Ink]
			}
			t.SetContent(x, y, c.Rune, nil, style)
		}
	}
	t.Show()
}
