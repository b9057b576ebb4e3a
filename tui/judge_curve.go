package tui

import (
	"cmp"
	"context"
	"math"
	"slices"

	"antelag/compensator"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// A curve has points evenly over its range first, the ends and the present
// value among them, then the intervals beside the best one are halved, and
// halved again: enough to see where the best lies within a second.
const (
	coarse, between = 5, 4 // points of the first look, and what the second adds
	perHalving      = 4
	halvings        = 2 // 17 points in all
)

// variation is a setting that is varied, in a scenario that has one lane only.
type variation struct {
	setting kind.Setting
	at      []part // the channels' own compensators
	now     float64
	figure  string // what is to be best, a name of accept.Figures
}

// bounds are the ends of the range over which the setting is varied: from
// nothing to twice the present value, as far as the table allows.
func (v *variation) bounds() (lo, hi float64) {
	s := &v.setting
	reach := math.Abs(v.now)
	if reach == 0 {
		reach = typical(s)
	}
	lo, hi = v.now-reach, v.now+reach
	if s.Type == kind.IntegerType {
		lo, hi = min(lo, v.now-4), max(hi, v.now+4)
	}
	return max(lo, s.Min), min(hi, s.Max)
}

// typical is a small value of a setting that stands at zero: that of its
// example, or else a hundredth of its range.
func typical(s *kind.Setting) float64 {
	if example, ok := s.ExampleValue(); ok {
		if v, err := s.Read(unquote(example)); err == nil && v.Num != 0 && s.Type != kind.ListType {
			return math.Abs(v.Num)
		}
	}
	if s.HasDefault() && s.Fallback.Num != 0 {
		return math.Abs(s.Fallback.Num)
	}
	if s.HasRange() {
		return max(math.Abs(s.Min), math.Abs(s.Max)) / 100
	}
	return 1
}

// curve judges the scenario at one value of the setting after another and says
// what came out, coarse first.
func (j *judge) curve(ctx context.Context, q question) {
	v := q.vary
	lo, hi := v.bounds()
	have := map[float64]accepted{}
	batch := v.whole(append(evenly(lo, hi, coarse), v.now))
	for step := 0; ; step++ {
		points, err := j.points(ctx, q, missing(batch, have))
		if ctx.Err() != nil {
			return
		}
		for _, p := range points {
			have[p.x] = accepted{p.lane.Pass, score(&p, v.figure)}
		}
		last := step == halvings+1
		if !j.say(ctx, answer{number: q.number, points: points, done: last, err: err}) || last || err != nil {
			return
		}
		if step == 0 {
			batch = v.whole(evenly(lo, hi, coarse+between))
			continue
		}
		batch = v.whole(beside(have))
	}
}

// accepted is what the search for the best point needs to know of one.
type accepted struct {
	pass  bool
	score float64
}

// points judges the scenario at each value. Values that a method refuses beside
// its other settings are left out.
func (j *judge) points(ctx context.Context, q question, values []float64) ([]point, error) {
	var tests []*scenarios.Scenario
	var at []float64
	for _, x := range values {
		s, err := q.alone.With(q.vary.changes(x)...)
		if err != nil || !builds(s, q.vary.at[0]) {
			continue
		}
		tests, at = append(tests, s), append(at, x)
	}
	if len(tests) == 0 {
		return nil, nil
	}
	lanes, err := j.run(ctx, tests)
	if err != nil {
		return nil, err
	}
	points := make([]point, len(lanes))
	for i := range lanes {
		points[i] = point{at[i], lanes[i]}
	}
	return points, nil
}

// changes set the setting to x wherever the lane has it.
func (v *variation) changes(x float64) []scenarios.Change {
	out := make([]scenarios.Change, len(v.at))
	for i, at := range v.at {
		out[i] = at.change(&v.setting, kind.Num(x))
	}
	return out
}

// builds reports whether the compensator of a part can be built.
func builds(s *scenarios.Scenario, at part) bool {
	p := at.in(s)
	entry, err := compensator.Kinds.Find(p.Kind.Name)
	if err != nil {
		return false
	}
	_, err = entry.New(1/s.Loop.Num("rate"), p.Values)
	return err == nil
}

func evenly(lo, hi float64, n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		f := float64(i) / float64(n-1)
		out[i] = lo + f*(hi-lo)
	}
	out[n-1] = hi
	return out
}

// whole rounds the values of a whole-numbered setting, each once.
func (v *variation) whole(values []float64) []float64 {
	if v.setting.Type == kind.IntegerType {
		for i, x := range values {
			values[i] = math.Round(x)
		}
	}
	slices.Sort(values)
	return slices.Compact(values)
}

func missing(values []float64, have map[float64]accepted) []float64 {
	return slices.DeleteFunc(values, func(x float64) bool { _, ok := have[x]; return ok })
}

// beside are the middles and thirds of the intervals on both sides of the best
// point: perHalving new values.
func beside(have map[float64]accepted) []float64 {
	xs := make([]float64, 0, len(have))
	for x := range have {
		xs = append(xs, x)
	}
	slices.Sort(xs)
	best := bestOf(xs, have)
	var out []float64
	for _, i := range []int{best - 1, best} {
		if i >= 0 && i+1 < len(xs) {
			d := (xs[i+1] - xs[i]) / (perHalving/2 + 1)
			for k := 1; k <= perHalving/2; k++ {
				out = append(out, xs[i]+float64(k)*d)
			}
		}
	}
	return out
}

// bestOf is the index of the best value: one that passes before one that does
// not, then the smaller score.
func bestOf(xs []float64, have map[float64]accepted) int {
	best := 0
	for i := range xs {
		a, b := have[xs[i]], have[xs[best]]
		if c := cmp.Compare(order(a), order(b)); c < 0 || c == 0 && a.score < b.score {
			best = i
		}
	}
	return best
}

func order(a accepted) int {
	if a.pass {
		return 0
	}
	return 1
}

// score is a figure so turned that less is better; +Inf where it is undefined
// or the lane did not complete.
func score(p *point, figure string) float64 {
	v, _ := p.lane.Figure(figure)
	if figure == "energy_margin" {
		v = -v
	} else {
		v = math.Abs(v)
	}
	if math.IsNaN(v) || !completed(&p.lane) {
		return math.Inf(1)
	}
	return v
}
