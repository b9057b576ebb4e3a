package report

import (
	"bufio"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/report/figure"
	"antelag/scenarios/study"
)

// spreadTable is what the table of a sweep says of the figures that the
// scenario judges.
type spreadTable struct {
	name    string
	note    string   // what is odd about it, "" if nothing
	figures []string // the names of the limits
	values  [][]float64
	runs    int
	passed  int // −1: the table does not say
}

// mostRuns bounds a table that is read.
const mostRuns = 2_000_000

// columnOf is the column of a sweep's table for each limit.
var columnOf = map[string]string{
	"nrmse": "nrmse", "delay": "delay_s", "peak_error": "peak_error_m", "energy_margin": "energy_margin",
	"response_error": "response_error", "spectrum_error": "spectrum_error",
}

// readSpread reads the table of a sweep; "" is none.
func readSpread(path string, s *scenarios.Scenario) (*spreadTable, error) {
	if path == "" {
		return nil, nil
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	t, err := parseSpread(f, s)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	t.name = filepath.Base(path)
	t.note, err = belongs(path+".toml", s)
	return t, err
}

// belongs says what is odd about the scenario that a table is of, by the
// provenance beside it.
func belongs(beside string, s *scenarios.Scenario) (string, error) {
	text, err := os.ReadFile(beside)
	if errors.Is(err, fs.ErrNotExist) {
		return "Nothing beside the table says that it is of this scenario.", nil
	}
	if err != nil {
		return "", err
	}
	st, _, _, err := study.Recorded(beside, text, filepath.Dir(beside))
	if err != nil {
		return "", err
	}
	theirs, ours := strings.Split(st.Scenario.Resolved(), "\n"), strings.Split(s.Resolved(), "\n")
	for i := range max(len(theirs), len(ours)) {
		a, b := lineOf(theirs, i), lineOf(ours, i)
		if a != b {
			return fmt.Sprintf("The table is of a scenario that differs from this one: there %s, here %s.", a, b), nil
		}
	}
	return "", nil
}

func lineOf(lines []string, i int) string {
	if i < len(lines) {
		return lines[i]
	}
	return "nothing more"
}

func parseSpread(in io.Reader, s *scenarios.Scenario) (*spreadTable, error) {
	r := csv.NewReader(bufio.NewReader(in))
	r.ReuseRecord = true
	head, err := r.Read()
	if errors.Is(err, io.EOF) {
		return nil, errors.New("is empty; a sweep writes one row a run")
	}
	if err != nil {
		return nil, err
	}
	t := &spreadTable{passed: -1}
	var at []int
	for _, name := range accept.Figures() {
		if k := slices.Index(head, columnOf[name]); k >= 0 && s.Accept.Has(name) {
			t.figures, at = append(t.figures, name), append(at, k)
		}
	}
	if len(at) == 0 {
		return nil, errors.New("has no column of a figure that the scenario judges; it must be the table that a sweep of this scenario wrote")
	}
	t.values = make([][]float64, len(at))
	pass := slices.Index(head, "pass")
	if pass >= 0 {
		t.passed = 0
	}
	for {
		row, err := r.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return nil, err
		}
		if t.runs++; t.runs > mostRuns {
			return nil, fmt.Errorf("has more than %d runs", mostRuns)
		}
		for i, k := range at {
			v, err := cell(row[k])
			if err != nil {
				line, _ := r.FieldPos(k)
				return nil, fmt.Errorf("line %d: %s: %w", line, columnOf[t.figures[i]], err)
			}
			t.values[i] = append(t.values[i], v)
		}
		if pass >= 0 && row[pass] == "true" {
			t.passed++
		}
	}
	if t.runs == 0 {
		return nil, errors.New("has no runs")
	}
	return t, nil
}

// cell is a number, or undefined where it is empty.
func cell(text string) (float64, error) {
	if text == "" {
		return math.NaN(), nil
	}
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		return 0, fmt.Errorf("%q is no number", text)
	}
	return v, nil
}

// spreadPart shows how the judged figures spread over the runs of a sweep.
func (r *run) spreadPart() Part {
	p := Part{Heading: "Spread"}
	if r.spread == nil {
		return p
	}
	t := r.spread
	text := fmt.Sprintf("%d runs of a sweep (%s)", t.runs, t.name)
	if t.passed >= 0 {
		text += fmt.Sprintf(": %d passed, %d did not", t.passed, t.runs-t.passed)
	}
	p.Text = []string{text + ". A figure that is undefined counts as worse than any other."}
	if t.note != "" {
		p.Text = append(p.Text, t.note)
	}
	panel := figure.Panel{X: figure.Axis{Label: "used up of the limit", Unit: "%", Low: 0, High: math.NaN()}, Y: figure.Axis{Label: "share of the runs at or below", Unit: "%", Low: 0, High: 105},
		Levels: []figure.Level{{Name: "limit", Value: 100, Vertical: true}}}
	table := Table{Caption: "Figures over the runs of the sweep", Head: []string{"figure", "median run", "95th of 100 runs", "worst run", "allowed", "runs beyond"}}
	for i, name := range t.figures {
		want := r.s.Accept.Num(name)
		used := make([]float64, len(t.values[i]))
		beyond := 0
		for k, v := range t.values[i] {
			used[k] = usedUp(name, v, want)
			if !(used[k] <= 1) {
				beyond++
			}
		}
		order := make([]int, len(used))
		for k := range order {
			order[k] = k
		}
		slices.SortStableFunc(order, func(a, b int) int {
			switch {
			case used[a] < used[b]:
				return -1
			case used[a] > used[b]:
				return 1
			}
			return 0
		})
		at := func(share float64) string {
			k := order[min(len(order)-1, max(0, int(math.Ceil(share*float64(len(order))))-1))]
			return judged(name, t.values[i][k])
		}
		table.Rows = append(table.Rows, Row{accept.Label(name), at(0.5), at(0.95), at(1), allowed(r.lane.Accept, name), fmt.Sprint(beyond)})
		line := figure.Line{Name: accept.Label(name)}
		for n, k := range order {
			if n > 0 && len(order) > 2000 && n%(len(order)/1000) != 0 && n < len(order)-100 {
				continue // a curve of a thousand points is as good
			}
			line.X = append(line.X, math.Min(100*used[k], 400))
			line.Y = append(line.Y, 100*float64(n+1)/float64(len(order)))
		}
		panel.Lines = append(panel.Lines, line)
	}
	p.Tables = []Table{table}
	p.Pictures = []Picture{{Name: "spread", Caption: "How much of each limit the runs of the sweep used up, at most four times it. Right of 100 % the limit is failed.",
		Figure: figure.Figure{Title: "Spread of the judged figures", Height: 75, Panels: []figure.Panel{panel}}}}
	return p
}

// usedUp is how much of a limit a figure uses up, 1 at the limit.
func usedUp(limit string, got, want float64) float64 {
	switch {
	case math.IsNaN(got):
		return math.Inf(1)
	case limit == "energy_margin":
		if want >= 1 {
			return 1 + want - got
		}
		return (1 - got) / (1 - want)
	case want == 0:
		if got == 0 {
			return 0
		}
		return math.Inf(1)
	}
	return math.Abs(got) / want
}

// judged writes a figure as the verdict does.
func judged(limit string, v float64) string {
	j := accept.NewJudgement(limit, v)
	return j.Found()
}

func allowed(judgements []accept.Judgement, limit string) string {
	for i := range judgements {
		if judgements[i].Limit == limit {
			return judgements[i].Allowed()
		}
	}
	return "–"
}
