package study

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"antelag/rtloop"
)

// Row is what one run came to.
type Row struct {
	Run     int64
	Values  []float64 // of what varies, in the order of Paths
	Outcome string    // a word of rtloop.Outcome, or Refused
	Limit   string    // which limit ended the run, "" if none did
	Channel string    // whose
	Ran     float64   // model seconds; 0 when refused
	Pass    bool
	Figures []float64 // in the order of Columns, NaN where undefined

	// Why is why the run was refused. It is not kept in the table.
	Why error
}

// Refused is the outcome of a run whose values, together, make no test that can
// be built.
const Refused = "refused"

var completed = rtloop.Completed.String()

// Completed reports whether the run came to its end.
func (r *Row) Completed() bool { return r.Outcome == completed }

// row gathers what a run came to.
func (st *Study) row(run int64, l *Judged) Row {
	if l.Refused != nil {
		return st.refused(run, l.Refused)
	}
	r := Row{Run: run, Values: st.Values(nil, run), Outcome: l.Outcome.String(), Ran: l.Ran, Pass: l.Pass}
	if l.Trip != nil {
		r.Limit, r.Channel = l.Trip.Limit, l.Trip.Channel
	}
	r.Figures = make([]float64, len(st.columns))
	for i := range st.columns {
		r.Figures[i] = st.columns[i].Of(&l.Lane)
	}
	return r
}

// refused is the row of a run that could not be built.
func (st *Study) refused(run int64, why error) Row {
	r := Row{Run: run, Values: st.Values(nil, run), Outcome: Refused, Why: why, Figures: make([]float64, len(st.columns))}
	for i := range r.Figures {
		r.Figures[i] = math.NaN()
	}
	return r
}

// Header is the first line of the table, without its end.
func (st *Study) Header() string {
	names := []string{"run"}
	settings := st.Settings()
	for i, path := range st.Paths() {
		names = append(names, SettingName(path, &settings[i]))
	}
	names = append(names, "outcome", "limit", "channel", "ran_s", "pass")
	for i := range st.columns {
		names = append(names, st.columns[i].Name())
	}
	return strings.Join(names, ",")
}

// appendRow appends a line of the table. Numbers have all their digits; what is
// undefined is empty.
func (st *Study) appendRow(dst []byte, r *Row) []byte {
	dst = st.appendStart(dst, r.Run, r.Values)
	dst = append(append(dst, ','), r.Outcome...)
	dst = append(append(dst, ','), r.Limit...)
	dst = append(append(dst, ','), r.Channel...)
	dst = appendFloat(append(dst, ','), r.Ran)
	dst = strconv.AppendBool(append(dst, ','), r.Pass)
	for _, v := range r.Figures {
		dst = appendFloat(append(dst, ','), v)
	}
	return append(dst, '\n')
}

// appendStart appends the cells that are known before the run.
func (st *Study) appendStart(dst []byte, run int64, values []float64) []byte {
	dst = strconv.AppendInt(dst, run, 10)
	for _, v := range values {
		dst = appendFloat(append(dst, ','), v)
	}
	return dst
}

func appendFloat(dst []byte, v float64) []byte {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return dst
	}
	return strconv.AppendFloat(dst, v, 'g', -1, 64)
}

// parseRow reads the line of run i, without its end. It must begin with the
// values that run i has.
func (st *Study) parseRow(line string, i int64) (Row, error) {
	r := Row{Run: i, Values: st.Values(nil, i)}
	rest, ok := strings.CutPrefix(line, string(st.appendStart(nil, i, r.Values))+",")
	if !ok {
		return r, fmt.Errorf("is not run %d of this study", i)
	}
	cells := strings.Split(rest, ",")
	if len(cells) != 5+len(st.columns) {
		return r, fmt.Errorf("has %d cells where %d belong", 1+len(r.Values)+len(cells), 6+len(r.Values)+len(st.columns))
	}
	r.Outcome, r.Limit, r.Channel = cells[0], cells[1], cells[2]
	var err error
	if r.Ran, err = parseFloat(cells[3]); err != nil {
		return r, err
	}
	if cells[4] != "true" && cells[4] != "false" {
		return r, fmt.Errorf("%q is neither true nor false", cells[4])
	}
	r.Pass = cells[4] == "true"
	r.Figures = make([]float64, len(st.columns))
	for k := range r.Figures {
		if r.Figures[k], err = parseFloat(cells[5+k]); err != nil {
			return r, err
		}
	}
	if back := st.appendRow(nil, &r); string(back[:len(back)-1]) != line {
		return r, errors.New("was not written by this program")
	}
	return r, nil
}

func parseFloat(cell string) (float64, error) {
	if cell == "" {
		return math.NaN(), nil
	}
	v, err := strconv.ParseFloat(cell, 64)
	if err != nil {
		return 0, fmt.Errorf("%q is no number", cell)
	}
	return v, nil
}
