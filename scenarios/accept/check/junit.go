package check

import (
	"encoding/xml"
	"fmt"
	"io"
	"strings"
	"time"
)

// The form of test results that build servers read: a suite for each scenario,
// a case for its run, for each acceptance limit and for each figure of the
// baseline that moved, one for the rest of them.
type (
	junitReport struct {
		XMLName  xml.Name     `xml:"testsuites"`
		Name     string       `xml:"name,attr"`
		Tests    int          `xml:"tests,attr"`
		Failures int          `xml:"failures,attr"`
		Errors   int          `xml:"errors,attr"`
		Time     string       `xml:"time,attr"`
		Suites   []junitSuite `xml:"testsuite"`
	}
	junitSuite struct {
		Name       string          `xml:"name,attr"`
		Tests      int             `xml:"tests,attr"`
		Failures   int             `xml:"failures,attr"`
		Errors     int             `xml:"errors,attr"`
		Skipped    int             `xml:"skipped,attr"`
		Time       string          `xml:"time,attr"`
		Timestamp  string          `xml:"timestamp,attr"`
		Hostname   string          `xml:"hostname,attr"`
		Properties []junitProperty `xml:"properties>property"`
		Cases      []junitCase     `xml:"testcase"`
	}
	junitProperty struct {
		Name  string `xml:"name,attr"`
		Value string `xml:"value,attr"`
	}
	junitCase struct {
		Name    string        `xml:"name,attr"`
		Class   string        `xml:"classname,attr"`
		Time    string        `xml:"time,attr"`
		Failure *junitProblem `xml:"failure"`
		Error   *junitProblem `xml:"error"`
		Skipped *junitProblem `xml:"skipped"`
	}
	junitProblem struct {
		Message string `xml:"message,attr"`
		Type    string `xml:"type,attr,omitempty"`
		Text    string `xml:",chardata"`
	}
)

// WriteJUnit writes the results as XML for build servers. began is when the
// check did.
func (p *Report) WriteJUnit(w io.Writer, version string, began time.Time) error {
	report := junitReport{Name: "antelag check", Suites: []junitSuite{}}
	total := 0.0
	for i := range p.Results {
		s, wall := p.Results[i].suite(version, began)
		report.Suites = append(report.Suites, s)
		report.Tests += s.Tests
		report.Failures += s.Failures
		report.Errors += s.Errors
		total += wall
	}
	report.Time = fmt.Sprintf("%.3f", total)
	if _, err := io.WriteString(w, xml.Header); err != nil {
		return err
	}
	e := xml.NewEncoder(w)
	e.Indent("", " ")
	if err := e.Encode(&report); err != nil {
		return err
	}
	_, err := io.WriteString(w, "\n")
	return err
}

func (r *Result) suite(version string, began time.Time) (junitSuite, float64) {
	wall := 0.0
	if r.Verdict != nil {
		wall = r.Verdict.Compute.Wall
	}
	s := junitSuite{
		Name: clean(r.Name), Time: fmt.Sprintf("%.3f", wall), Hostname: "localhost", Timestamp: began.UTC().Format("2006-01-02T15:04:05"),
		Properties: []junitProperty{{"version", clean(version)}, {"baseline", string(r.State)}},
	}
	if r.Scene != nil {
		s.Properties = append(s.Properties, junitProperty{"title", clean(r.Scene.Title)})
	}
	s.Cases = r.cases(s.Time)
	for _, c := range s.Cases {
		s.Tests++
		switch {
		case c.Failure != nil:
			s.Failures++
		case c.Error != nil:
			s.Errors++
		case c.Skipped != nil:
			s.Skipped++
		}
	}
	return s, wall
}

func (r *Result) cases(wall string) []junitCase {
	run := junitCase{Name: "run", Class: clean(r.Name), Time: wall}
	if r.Err != nil {
		run.Error = &junitProblem{Message: clean(r.Err.Error()), Type: "error"}
	}
	if r.Verdict == nil {
		return []junitCase{run}
	}
	lane := &r.Verdict.Lanes[0]
	if lane.Trip != nil && run.Error == nil {
		run.Failure = &junitProblem{Message: clean(lane.Ending(r.Verdict.Time)), Type: lane.Outcome.String()}
	}
	out := []junitCase{run}
	for _, row := range r.limits() {
		out = append(out, r.junitCase("limit ", row, row.Pass))
	}
	if r.Comparison == nil {
		none := junitCase{Name: "baseline", Class: clean(r.Name), Time: "0"}
		if r.State == Absent {
			none.Skipped = &junitProblem{Message: "there is no baseline"}
		}
		return append(out, none)
	}
	for _, row := range r.moves() {
		out = append(out, r.junitCase("baseline ", row, r.State != Moved))
	}
	return append(out, junitCase{Name: "baseline, " + figures(r.Comparison.Compared-len(r.Comparison.Moved)) + " that hold", Class: clean(r.Name), Time: "0"})
}

func (r *Result) junitCase(what string, row Row, pass bool) junitCase {
	c := junitCase{Name: clean(what + row.What), Class: clean(r.Name), Time: "0"}
	if pass {
		return c
	}
	kind := "baseline"
	message := fmt.Sprintf("is %s, was %s, allowed %s", row.Is, orDash(row.Was), row.Allowed)
	if row.Limit {
		kind = "limit"
	}
	c.Failure = &junitProblem{Message: clean(message), Type: kind, Text: clean(r.context())}
	return c
}

// context says which settings changed: most likely they are why.
func (r *Result) context() string {
	if r.Comparison == nil {
		return ""
	}
	var lines []string
	for _, s := range r.Comparison.Settings {
		lines = append(lines, fmt.Sprintf("%s: %s → %s", s.Path, orNone(s.Was), orNone(s.Is)))
	}
	return strings.Join(lines, "\n")
}

// clean takes out what XML cannot hold, whatever a file gave for a name; the
// encoder escapes the rest.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r == '\n' || r == '\t':
			return r
		case r < 0x20 || r == 0x7f || r >= 0x80 && r < 0xa0 || r == 0xfffe || r == 0xffff:
			return '\ufffd'
		}
		return r
	}, strings.ToValidUTF8(s, "\ufffd"))
}
