package report

import (
	"fmt"
	"path/filepath"
	"strings"

	"antelag/scenarios/report/figure"
)

// File is a picture with the name of the file that it goes into.
type File struct {
	Name   string
	Figure figure.Figure
}

// Files lists every picture of the page twice, as SVG and as PNG, under names
// that differ.
func (p *Page) Files() []File {
	var out []File
	taken := map[string]bool{}
	for _, t := range p.Tests {
		base := plain(strings.TrimSuffix(filepath.Base(t.Name), ".toml"))
		for _, picture := range t.Pictures() {
			name := base + "-" + plain(picture.Name)
			for n := 2; taken[name]; n++ {
				name = fmt.Sprintf("%s-%d-%s", base, n, plain(picture.Name))
			}
			taken[name] = true
			out = append(out, File{name + ".svg", picture.Figure}, File{name + ".png", picture.Figure})
		}
	}
	return out
}

// plain keeps letters, digits, points and dashes of a name.
func plain(name string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r >= '0' && r <= '9', r == '-', r == '_', r == '.':
			return r
		}
		return '-'
	}, name)
}
