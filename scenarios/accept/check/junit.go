package check

import (
	"encoding/xml"
	"fmt"
	"io"
	"strings"
	"time"
)

// The form of test results that build servers read: a suite for each scenario,
// a case for its run, one for each acceptance limit and one for the baseline,
// so that a case has the same name from build to build.
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
		out = append(out, r.limitCase(row))
	}
	return append(out, r.baselineCase())
}

func (r *Result) limitCase(row Row) junitCase {
	c := junitCase{Name: clean("limit " + row.What), Class: clean(r.Name), Time: "0"}
	if !row.Pass {
		message := fmt.Sprintf("is %s, was %s, allowed %s", row.Is, orDash(row.Was), row.Allowed)
		c.Failure = &junitProblem{Message: clean(message), Type: "limit"}
	}
	return c
}

// baselineCase is skipped where there is none, and lists what moved.
func (r *Result) baselineCase() junitCase {
	c := junitCase{Name: "baseline", Class: clean(r.Name), Time: "0"}
	switch r.State {
	case Absent:
		c.Skipped = &junitProblem{Message: "there is no baseline"}
	case Moved:
		lines := []string{"of version " + r.Baseline.Version}
		for _, s := range r.Comparison.Settings {
			lines = append(lines, fmt.Sprintf("%s: %s → %s", s.Path, orNone(s.Was), orNone(s.Is)))
		}
		for _, row := range r.moves() {
			lines = append(lines, fmt.Sprintf("%s: was %s, is %s, allowed %s", row.What, row.Was, row.Is, row.Allowed))
		}
		c.Failure = &junitProblem{Message: clean(r.kept()), Type: "baseline", Text: clean(strings.Join(lines, "\n"))}
	}
	return c
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
