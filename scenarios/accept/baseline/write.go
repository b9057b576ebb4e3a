package baseline

import (
	"fmt"
	"io"
	"regexp"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// format is the version of the form of the file.
const format = 1

const heading = `# The figures of %s, kept by antelag check --record.
# A run passes while each figure is within its tolerance of what it was. Widen
# a tolerance where a figure may move; recording again keeps it as it is here.
`

// WriteTo writes the baseline as TOML, a line for every figure, so that two of
// them compare well. name is that of the scenario, for the reader.
func (b *Baseline) WriteTo(w io.Writer, name string) error {
	p := &printer{}
	p.printf(heading, accept.Printable(name))
	p.printf("format = %d\nversion = %s\n", format, scenarios.Quote(b.Version))
	lane, channel := "", ""
	for i := range b.Entries {
		e := &b.Entries[i]
		if i == 0 || e.Lane != lane {
			p.printf("\n[lane.%s]\n", key(e.Lane))
		}
		if e.Channel != "" && (e.Channel != channel || e.Lane != lane) {
			p.printf("\n[lane.%s.channel.%s]\n", key(e.Lane), key(e.Channel))
		}
		lane, channel = e.Lane, e.Channel
		p.entry(e)
	}
	p.printf("\n# What the scenario was set to then, defaults included.\n[settings]\n")
	for _, s := range b.Settings {
		p.printf("%s = %s\n", scenarios.Quote(s.Path), scenarios.Quote(s.Text))
	}
	_, err := io.WriteString(w, p.String())
	return err
}

type printer struct{ strings.Builder }

func (p *printer) printf(format string, args ...any) { fmt.Fprintf(p, format, args...) }

func (p *printer) entry(e *Entry) {
	if e.word() {
		p.printf("%s = %s\n", e.Figure, scenarios.Quote(e.Word))
		return
	}
	dim, _, _ := described(e.Figure)
	p.printf("%s = { was = %s, within = %s }\n", e.Figure,
		scenarios.Quote(value(e.Was, dim, fileDigits)), scenarios.Quote(value(e.Within, dim, 2)))
}

var bare = regexp.MustCompile(`^[A-Za-z0-9_-]+$`)

// key writes a TOML key, bare where it can be.
func key(name string) string {
	if bare.MatchString(name) {
		return name
	}
	return scenarios.Quote(name)
}
