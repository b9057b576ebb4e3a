package canvas

import (
	"unicode"

	"github.com/mattn/go-runewidth"
)

const (
	ellipsis    = '…'
	replacement = '�'
)

// cells measures runes the same way on every machine; the package's default
// would depend on the locale.
var cells = runewidth.Condition{}

// width is the number of cells a rune takes: 0 for combining marks, which are
// dropped, 2 for wide ones.
func width(r rune) int {
	if r >= ' ' && r < 0x7f || r >= 0x2500 && r < 0x2600 || r >= 0x2800 && r < 0x2900 {
		return 1 // ASCII, lines and blocks, braille: nearly everything drawn
	}
	if r < 0 || unicode.Is(unicode.Cf, r) {
		return 0
	}
	return cells.RuneWidth(r)
}

// printable replaces what must never reach a terminal: control characters.
// White space of any kind becomes a blank.
func printable(r rune) rune {
	switch {
	case r >= ' ' && r < 0x7f:
		return r
	case unicode.IsSpace(r):
		return ' '
	case unicode.IsControl(r):
		return replacement
	}
	return r
}

// Width is the number of cells that Text needs for s.
func Width(s string) int {
	n := 0
	for _, r := range s {
		n += width(printable(r))
	}
	return n
}
