package accept

import (
	"fmt"
	"strings"
	"text/tabwriter"
	"unicode"

	"antelag/rtloop"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Label says in words what the limit judges, "tracking error, rms".
func (j *Judgement) Label() string { return labels[j.Limit] }

// Found writes the figure that was judged, with its unit.
func (j *Judgement) Found() string { return j.found() }

// Allowed writes the limit, with its unit and its direction.
func (j *Judgement) Allowed() string { return j.allowed() }

// Ending says how the lane ended and what became of its limits; whole is the
// length of the run in model seconds.
func (l *Lane) Ending(whole float64) string { return ending(l, whole) }

// Figures are the names of all figures that a limit can judge, in the order in
// which they are judged.
func Figures() []string { return append([]string(nil), limitNames...) }

// Label says in words what the limit of that name judges.
func Label(limit string) string { return labels[limit] }

// Figure finds the figure that the limit of that name would judge, of the worst
// channel, whether there is such a limit or not; SI.
func (l *Lane) Figure(limit string) (value float64, dim quantity.Dim) {
	j := measure(l.LaneResult, limit)
	return float64(j.Got), j.Dim
}

// Printable keeps what a file gave for a name from moving the cursor.
func Printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return ' '
	}, s)
}

// WriteTable writes a blank line and then rows of cells in columns, the headings
// first. Each row but the headings may have a mark of four letters in front, which
// may hold colour.
func WriteTable(b *strings.Builder, rows [][]string, marks []string) {
	var text strings.Builder
	t := tabwriter.NewWriter(&text, 0, 0, 2, ' ', 0)
	for _, row := range rows {
		fmt.Fprintln(t, strings.Join(row, "\t"))
	}
	t.Flush() //nolint:errcheck // a Builder does not fail
	b.WriteString("\n")
	for i, line := range strings.Split(strings.TrimSuffix(text.String(), "\n"), "\n") {
		mark := ""
		switch {
		case len(marks) == 0:
		case i == 0:
			mark = strings.Repeat(" ", len("PASS  "))
		default:
			mark = marks[i-1] + "  "
		}
		fmt.Fprintf(b, "  %s\n", strings.TrimRight(mark+line, " "))
	}
}

// The colours of words that decide.
const (
	Good   = "32;1" // green
	Bad    = "31;1" // red
	Unsure = "33;1" // yellow
)

// Coloured gives a word one of these colours, on a terminal.
func Coloured(word, colour string) string { return "\x1b[" + colour + "m" + word + "\x1b[0m" }

// Word is a verdict in one word of four letters.
func Word(pass, colour bool) string {
	switch {
	case pass && colour:
		return Coloured("PASS", Good)
	case pass:
		return "PASS"
	case colour:
		return Coloured("FAIL", Bad)
	}
	return "FAIL"
}

// Judge holds the figures of a lane that ran elsewhere against limits.
func Judge(res rtloop.LaneResult, limits kind.Values) Lane { return judge(res, limits) }
