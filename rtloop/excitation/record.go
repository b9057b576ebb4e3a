package excitation

import (
	"errors"
	"fmt"
	"math"
	"sort"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var recordKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name: "record",
		Doc:  "a time history from a file: PEER NGA AT2, columns of time and value, or values with a given step",
		Equation: "x(t) = scale·record(start + t/√λ), linear between the record's samples, displacements times λ; " +
			"after the end 0 for ground and force, the last value for a target. A target of an acceleration record: " +
			"x(t) = ∬ a dt², a the record without its straight-line trend and below the corner frequency, at rest at both ends",
		Source: "common practice; AT2 is the file form of the PEER NGA ground motion database; " +
			"baseline correction after Converse & Brady 1992 and Boore 2005 (zero pads, acausal Butterworth high-pass)",
		Settings: []kind.Setting{
			kind.FreeText("file", "file of the record, relative to the scenario; a name that begins with embedded: ships with the program"),
			kind.Number("step", quantity.Time, "time between values; every number of the file is then a value").
				Range(1e-6, 3600).Optional(),
			kind.FreeText("unit", "unit of the file's values; AT2 files say theirs").Optional().Sample(`"g"`),
			kind.Number("scale", quantity.None, "factor on the values").Default(1).Range(-1e6, 1e6),
			kind.Number("start", quantity.Time, "record time that becomes t = 0; without it the first sample").
				Range(-longest, longest).Optional(),
			kind.Number("end", quantity.Time, "record time at which the motion ends; without it the last sample").
				Range(-longest, longest).Optional(),
			kind.Number("length_factor", quantity.None, "similitude: model length over prototype length λ; time is multiplied by √λ, displacement by λ, acceleration kept").
				Default(1).Range(1e-4, 1e4),
			kind.Number("corner_frequency", quantity.Frequency, "where an acceleration drives a target: corner of the high-pass, in the record's own time").
				Default(0.1).Range(lowestFrequency, highestFrequency),
		},
	},
	New: newRecord,
}

func newRecord(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	rec, err := openRecord(c, v)
	if err != nil {
		return nil, err
	}
	dim, err := toSI(&rec, c, v)
	if err != nil {
		return nil, err
	}
	start, end, err := window(&rec, v)
	if err != nil {
		return nil, err
	}
	factor := v.Num("length_factor")
	if c.Drives == Force && factor != 1 {
		return nil, fmt.Errorf("length_factor: %g; with drives = %q it must be 1, for how forces scale hangs on the material too", factor, Words[Force])
	}
	if c.Drives == Target && dim == quantity.Acceleration {
		return newIntegrated(clk, &rec, start, end, v)
	}
	start, end = stretch(&rec, start, end, factor, c.Drives)
	if rec.Times != nil {
		return newUneven(clk, &rec, start, end, c.Drives), nil
	}
	return newEven(clk, &rec, start, end, c.Drives), nil
}

func openRecord(c Context, v kind.Values) (Record, error) {
	if c.Open == nil {
		return Record{}, errors.New("file: no files can be opened here")
	}
	name := v.Text("file")
	f, err := c.Open(name)
	if err != nil {
		return Record{}, fmt.Errorf("file: %w", err)
	}
	defer f.Close()
	step := 0.0
	if v.Has("step") {
		step = v.Num("step")
	}
	return ReadRecord(f, name, step)
}

// toSI scales the values and turns them into SI: into the unit of what is
// driven, or for a target from an acceleration into m/s². It returns which.
func toSI(rec *Record, c Context, v kind.Values) (quantity.Dim, error) {
	text := rec.Unit
	if v.Has("unit") {
		text = v.Text("unit")
	}
	want := c.Drives.Dim().String()
	if c.Drives == Target {
		want += " or " + quantity.Acceleration.String()
	}
	if text == "" {
		return quantity.None, fmt.Errorf("unit: %s does not say the unit of its values; give one, it must be %s", v.Text("file"), want)
	}
	u, err := quantity.ParseUnit(text)
	if err != nil {
		return quantity.None, fmt.Errorf("unit: %w", err)
	}
	if u.Dim != c.Drives.Dim() && !(c.Drives == Target && u.Dim == quantity.Acceleration) {
		return quantity.None, fmt.Errorf("unit: %q is %s; with drives = %q it must be %s", text, u.Dim, Words[c.Drives], want)
	}
	scale := v.Num("scale")
	for i, x := range rec.Values {
		si := u.SI(x) * scale
		if math.IsNaN(si) || math.IsInf(si, 0) {
			return quantity.None, fmt.Errorf("unit: %g %s is beyond the largest number", x, text)
		}
		rec.Values[i] = si
	}
	return u.Dim, nil
}

// window returns the record times between which the record is used.
func window(rec *Record, v kind.Values) (start, end float64, err error) {
	first, last := rec.First(), rec.Last()
	start, end = first, last
	if v.Has("start") {
		start = v.Num("start")
	}
	if v.Has("end") {
		end = math.Min(v.Num("end"), last)
	}
	switch {
	case start < first || start >= last:
		return 0, 0, fmt.Errorf("start: %g s is outside the record, which runs from %g s to %g s", start, first, last)
	case end <= start:
		return 0, 0, fmt.Errorf("end: %g s is not after the start of the motion at %g s", v.Num("end"), start)
	}
	return start, end, nil
}

// stretch carries a record into the time of a model whose lengths are factor
// times those of the prototype, with the gravity of both: times grow by
// √factor, displacements by factor, and accelerations stay. It returns the
// window in that time.
func stretch(rec *Record, start, end, factor float64, d Drives) (float64, float64) {
	r := math.Sqrt(factor)
	rec.Step *= r
	for i := range rec.Times {
		rec.Times[i] *= r
	}
	if d == Target {
		for i := range rec.Values {
			rec.Values[i] *= factor
		}
	}
	return start * r, end * r
}

// even is a record of evenly spaced samples, linear between them:
// position p = t/Δ + offset, x = v[j] + (p−j)(v[j+1]−v[j]), j = ⌊p⌋.
type even struct {
	clock
	values []float64
	every  float64 // Δ, s
	offset float64 // of t = 0 behind values[0], samples, in [0, 1)
	last   float64 // position of the end, samples
	after  float64 // value after the end
}

// endSlack lets the last instant of a record be met although t was rounded:
// a part of the record's length, several times what float64 rounds away.
const endSlack = 1e-13

func newEven(clk clock, rec *Record, start, end float64, d Drives) *even {
	p, q := start/rec.Step, end/rec.Step
	n := len(rec.Values)
	if end == rec.Last() {
		q = float64(n - 1)
	}
	j := min(int(p), n-2)
	k := max(min(int(math.Ceil(q))+1, n), j+2)
	s := &even{clock: clk, values: rec.Values[j:k], every: rec.Step, offset: p - float64(j)}
	s.last = (q - float64(j)) + q*endSlack
	if d == Target {
		s.after = s.at(q - float64(j))
	}
	return s
}

// at interpolates at a position within the samples.
func (s *even) at(p float64) float64 {
	j := min(int(p), len(s.values)-2)
	a, b := s.values[j], s.values[j+1]
	return a + (p-float64(j))*(b-a)
}

func (s *even) Fill(dst []float64) {
	for i := range dst {
		p := s.tick()/s.every + s.offset
		if p <= s.last {
			dst[i] = s.at(p)
		} else {
			dst[i] = s.after
		}
	}
}

// uneven is a record with an instant for every sample, linear between them.
type uneven struct {
	clock
	times, values []float64 // record time, s; what is driven
	start         float64   // record time at t = 0, s
	end           float64   // record time of the end, s
	slack         float64   // s
	after         float64   // value after the end
	j             int       // the interval of the sample before
}

func newUneven(clk clock, rec *Record, start, end float64, d Drives) *uneven {
	// One sample at or before the start, one at or after the end.
	from := sort.SearchFloat64s(rec.Times, start)
	if rec.Times[from] > start {
		from--
	}
	to := sort.SearchFloat64s(rec.Times, end) + 1
	s := &uneven{clock: clk, times: rec.Times[from:to], values: rec.Values[from:to], start: start, end: end}
	s.slack = endSlack * math.Max(math.Abs(start), math.Abs(end))
	if d == Target {
		s.after = s.at(end)
		s.j = 0
	}
	return s
}

// at interpolates at a record time not before that of the call before.
func (s *uneven) at(t float64) float64 {
	for s.j < len(s.times)-2 && s.times[s.j+1] <= t {
		s.j++
	}
	t0, a := s.times[s.j], s.values[s.j]
	return a + (t-t0)/(s.times[s.j+1]-t0)*(s.values[s.j+1]-a)
}

func (s *uneven) Fill(dst []float64) {
	for i := range dst {
		if t := s.tick() + s.start; t <= s.end+s.slack {
			dst[i] = s.at(min(t, s.end))
		} else {
			dst[i] = s.after
		}
	}
}
