package baseline

import (
	"fmt"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode"
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
	p.printf(heading, printable(name))
	p.printf("format = %d\nversion = %s\n", format, quote(b.Version))
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
		p.printf("%s = %s\n", quote(s.Path), quote(s.Text))
	}
	_, err := io.WriteString(w, p.String())
	return err
}

type printer struct{ strings.Builder }

func (p *printer) printf(format string, args ...any) { fmt.Fprintf(p, format, args...) }

func (p *printer) entry(e *Entry) {
	if e.word() {
		p.printf("%s = %s\n", e.Figure, quote(e.Word))
		return
	}
	dim, _, _ := described(e.Figure)
	p.printf("%s = { was = %s, within = %s }\n", e.Figure,
		quote(value(e.Was, dim, fileDigits)), quote(value(e.Within, dim, 2)))
}

var bare = regexp.MustCompile(`^[A-Za-z0-9_-]+$`)

// key writes a TOML key, bare where it can be.
func key(name string) string {
	if bare.MatchString(name) {
		return name
	}
	return quote(name)
}

// quote writes a TOML basic string.
func quote(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r < 0x20 || r == 0x7f:
			b.WriteString(`\u00` + strconv.FormatInt(0x100|int64(r), 16)[1:])
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// printable keeps a file's name from ending the comment that it stands in.
func printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return ' '
	}, s)
}
