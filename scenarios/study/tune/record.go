package tune

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"antelag/scenarios/study"
)

// Record is a journal of all candidates that were tried, so that a search that was
// broken off does not try them again.
type Record struct {
	problem *Problem
	journal *study.Journal
	had     []*Candidate // before this search
}

// OpenRecord opens or creates the record of a problem: study.OpenJournal.
func (p *Problem) OpenRecord(path, version string, force bool) (*Record, error) {
	provenance, err := p.provenance(version)
	if err != nil {
		return nil, err
	}
	r := &Record{problem: p}
	check := func(line string) error {
		_, err := p.parse(line)
		return err
	}
	r.journal, err = study.OpenJournal(path, p.header(), provenance, force, check, func(line string) error {
		c, err := p.parse(line)
		r.had = append(r.had, c)
		return err
	})
	return r, err
}

// Had returns how many candidates there were before this search.
func (r *Record) Had() int { return len(r.had) }

// Close closes the record.
func (r *Record) Close() error { return r.journal.Close() }

func (r *Record) append(c *Candidate) error {
	return r.journal.Append([]byte(r.problem.line(c) + "\n"))
}

// provenance says of what the candidates are: scenario, settings and their ranges,
// figure and draws. Limits and budget are left out: they change nothing of what a
// candidate is measured to be.
func (p *Problem) provenance(version string) (string, error) {
	over := make([]string, len(p.Ranges))
	for i := range p.Ranges {
		over[i] = p.Ranges[i].String()
	}
	pairs := []study.Pair{{Key: "over", Value: over}, {Key: "figure", Value: p.Figure}, {Key: "quantile", Value: p.Quantile}, {Key: "draws", Value: p.Draws}}
	if p.Draws > 0 {
		pairs = append(pairs, study.Pair{Key: "law", Value: string(p.Law)}, study.Pair{Key: "seed", Value: p.Seed})
	}
	return study.Provenance(p.Scenario, p.Lane, version, "tune", pairs)
}

func (p *Problem) header() string {
	var names []string
	for i := range p.Ranges {
		names = append(names, study.SettingName(p.Ranges[i].Path, &p.Ranges[i].Setting))
	}
	names = append(names, "variations", p.Column.Name())
	for i := range p.Measures {
		names = append(names, p.Measures[i].Name)
	}
	return strings.Join(append(names, "refused"), ",")
}

// line writes a candidate. Undefined is empty, infinity inf.
func (p *Problem) line(c *Candidate) string {
	row := appendValues(nil, c.Values)
	row = strconv.AppendInt(append(row, ','), int64(c.Judged), 10)
	row = append(row, ',')
	row = appendValues(row, append([]float64{c.Figure}, c.Measured...))
	return string(row) + "," + strings.NewReplacer(",", ";", "\n", " ", "\r", " ").Replace(c.Refused)
}

func appendValues(dst []byte, values []float64) []byte {
	for i, v := range values {
		if i > 0 {
			dst = append(dst, ',')
		}
		switch {
		case math.IsInf(v, 1):
			dst = append(dst, "inf"...)
		case !math.IsNaN(v):
			dst = strconv.AppendFloat(dst, v, 'g', -1, 64)
		}
	}
	return dst
}

// parse reads a line back.
func (p *Problem) parse(line string) (*Candidate, error) {
	n := len(p.Ranges)
	cells := strings.Split(line, ",")
	if want := n + 3 + len(p.Measures); len(cells) != want {
		return nil, fmt.Errorf("has %d cells where %d belong", len(cells), want)
	}
	var numbers []float64
	for i, cell := range cells[:len(cells)-1] {
		v, err := strconv.ParseFloat(cell, 64)
		switch {
		case cell == "" && i > n:
			v = math.NaN()
		case err != nil || math.IsNaN(v) || i <= n && math.IsInf(v, 0):
			return nil, fmt.Errorf("%q is no number that belongs here", cell)
		}
		numbers = append(numbers, v)
	}
	c := &Candidate{Values: numbers[:n:n], Judged: int(numbers[n]), Figure: numbers[n+1], Measured: numbers[n+2:], Refused: cells[len(cells)-1]}
	if p.line(c) != line {
		return nil, errors.New("was not written by this program")
	}
	return c, nil
}
