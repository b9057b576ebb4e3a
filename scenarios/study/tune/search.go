package tune

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"sync"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"

	"antelag/scenarios/kind"
	"antelag/scenarios/study"
)

// How far the search goes, in candidates. A setting more takes some more of each.
const (
	firstLook, firstLookEach = 6, 4 // of the Latin hypercube
	generations              = 5    // of CMA-ES
	population               = 6
	finalists                = 3 // that are judged by all variations
	closeLook, closeLookEach = 14, 12
	wideDraws                = 7 // by which the wide search judges where there are no corners
	wideStep, closeStep      = 0.2, 0.04
	frontier                 = 5   // of the front of the wide search that are judged by all variations too
	mostCounted              = 200 // up to so many choices of whole numbers all are tried
)

// searcher is one search.
type searcher struct {
	*Problem
	ctx    context.Context
	places chan struct{}
	record *Record

	lock  sync.Mutex
	known map[string]*Candidate // all there are, those of the record included
	tried map[string]*Candidate // those of this search, by which it goes on: so it goes the same way with a record and without
	runs  int64                 // made
	of    int64                 // about how many there will be
	err   error
}

// Search looks for the best candidate. record, which may be nil, holds what was
// tried before and takes what is tried. When time or ctx runs out the result is of
// what there is.
func (p *Problem) Search(ctx context.Context, record *Record) (*Result, error) {
	if p.Time > 0 {
		var cancel context.CancelFunc
		ctx, cancel = context.WithTimeout(ctx, p.Time)
		defer cancel()
	}
	workers := p.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	s := &searcher{Problem: p, ctx: ctx, places: make(chan struct{}, workers), record: record, known: map[string]*Candidate{}, tried: map[string]*Candidate{}}
	if record != nil {
		for _, c := range record.had {
			s.known[s.name(c.Values, c.Judged)] = c
		}
	}
	plan := s.plan()
	s.of = plan.runs(p)
	s.search(plan)
	return s.result()
}

// plan says how many candidates each part of the search may try.
type plan struct{ look, generations, finalists, close, frontier int }

// runs is about how many runs a plan takes.
func (pl plan) runs(p *Problem) int64 {
	wide, all := int64(p.wide()+1), int64(p.all()+1)
	return int64(pl.look+1+pl.generations*population)*wide + int64(1+pl.finalists+pl.close+pl.frontier)*all
}

// leastPlan is the least that is a search.
var leastPlan = plan{look: 1, finalists: 1}

// plan fits the search into the runs that are allowed.
func (p *Problem) plan() plan {
	d := len(p.Ranges)
	pl := plan{firstLook + firstLookEach*d, generations + d, finalists, closeLook + closeLookEach*(d-1), frontier}
	for p.Runs > 0 && pl.runs(p) > p.Runs && pl != leastPlan {
		switch { // what is missed least goes first
		case pl.frontier > 0:
			pl.frontier--
		case pl.generations > 1:
			pl.generations--
		case pl.close > 4:
			pl.close--
		case pl.look > 3:
			pl.look--
		case pl.finalists > 1:
			pl.finalists--
		default:
			pl.generations, pl.close, pl.look = 0, max(pl.close-1, 0), max(pl.look-1, 1)
		}
	}
	return pl
}

// all is by how many variations a candidate is judged in the end, wide by how
// many in the wide search: by the corners, or else by the draws farthest out.
func (p *Problem) all() int { return len(p.variations) }

func (p *Problem) wide() int {
	if p.Corners != nil {
		return int(p.Corners.Runs())
	}
	return min(p.all(), wideDraws)
}

// search tries candidates until the plan is carried out or there is an end.
func (s *searcher) search(pl plan) {
	s.try(s.start, s.all(), s.parts()) // what there was before
	if all := s.counted(); all != nil {
		s.tryAll(all, s.all())
		return
	}
	look := [][]float64{s.start}
	for i := range pl.look {
		look = append(look, s.at(study.LatinPoint(s.Seed, int64(i), int64(pl.look), len(s.Ranges))))
	}
	s.tryAll(look, s.wide())
	s.evolve(pl.generations)
	best := s.ranked(s.wide())
	s.tryAll(values(best[:min(len(best), pl.finalists)]), s.all())
	s.closeIn(pl.close)
	s.tryAll(values(thinned(s.front(s.ranked(s.wide())), pl.frontier)), s.all())
}

func values(candidates []*Candidate) [][]float64 {
	var out [][]float64
	for _, c := range candidates {
		out = append(out, c.Values)
	}
	return out
}

// at turns a point of the unit cube, or beyond, where it is folded back, into
// settings.
func (s *searcher) at(u []float64) []float64 {
	out := make([]float64, len(u))
	for i := range u {
		out[i] = s.Ranges[i].At(fold(u[i]))
	}
	return out
}

// fold mirrors a number at 0 and 1 until it lies between them.
func fold(u float64) float64 {
	if u = math.Abs(math.Mod(u, 2)); u > 1 {
		return 2 - u
	}
	return u
}

// part is the reverse of at, for what lies within the ranges; what does not goes
// to the nearest end.
func (s *searcher) part(values []float64) []float64 {
	u := make([]float64, len(values))
	for i := range values {
		if u[i] = min(max(s.Ranges[i].Part(values[i]), 0), 1); math.IsNaN(u[i]) { // the logarithm of nothing
			u[i] = 0
		}
	}
	return u
}

// counted are all choices there are, where all settings are whole numbers and the
// choices few; else nil.
func (s *searcher) counted() [][]float64 {
	all := [][]float64{{}}
	for i := range s.Ranges {
		r := &s.Ranges[i]
		if r.Setting.Type != kind.IntegerType || r.High-r.Low >= mostCounted {
			return nil
		}
		var next [][]float64
		for _, head := range all {
			for v := r.Low; v <= r.High; v++ {
				next = append(next, append(slices.Clone(head), v))
			}
		}
		if all = next; len(all) > mostCounted {
			return nil
		}
	}
	return all
}

// evolve searches wide, from the best so far.
func (s *searcher) evolve(generations int) {
	best := s.ranked(s.wide())
	if generations < 1 || len(best) == 0 || s.over() {
		return
	}
	d := len(s.Ranges)
	var chol mat.Cholesky
	spread := mat.NewDiagDense(d, nil)
	for i := range d {
		spread.SetDiag(i, wideStep*wideStep)
	}
	chol.Factorize(spread)
	method := &optimize.CmaEsChol{
		InitStepSize: wideStep, InitCholesky: &chol, Population: population, ForgetBest: true,
		StopLogDet: 2 * float64(d) * math.Log(0.005), Src: rand.NewPCG(uint64(s.Seed), 'c'),
	}
	s.minimize(method, s.part(best[0].Values), optimize.Settings{Concurrent: population, MajorIterations: generations, Converger: optimize.NeverTerminate{}},
		func(u []float64) float64 { return s.meritOf(s.at(u), s.wide(), 1) })
}

// closeIn searches near the best so far, in the settings that are not whole
// numbers, by all variations.
func (s *searcher) closeIn(most int) {
	best := s.ranked(s.all())
	var free []int
	for i := range s.Ranges {
		if s.Ranges[i].Setting.Type != kind.IntegerType {
			free = append(free, i)
		}
	}
	if len(best) == 0 || len(free) == 0 || most < 1 || s.over() {
		return
	}
	fixed, u := best[0].Values, s.part(best[0].Values)
	whole := func(part []float64) []float64 {
		v := slices.Clone(fixed)
		for k, i := range free {
			v[i] = s.Ranges[i].At(fold(part[k]))
		}
		return v
	}
	first := make([]float64, len(free))
	for k, i := range free {
		first[k] = u[i]
	}
	s.minimize(&optimize.NelderMead{SimplexSize: closeStep}, first,
		optimize.Settings{FuncEvaluations: most, Converger: &optimize.FunctionConverge{Absolute: 1e-7, Iterations: 8 + 4*len(free)}},
		func(part []float64) float64 { return s.meritOf(whole(part), s.all(), s.parts()) })
}

func (s *searcher) minimize(method optimize.Method, from []float64, settings optimize.Settings, f func([]float64) float64) {
	problem := optimize.Problem{Func: f, Status: func() (optimize.Status, error) {
		if s.over() {
			return optimize.RuntimeLimit, nil
		}
		return optimize.NotTerminated, nil
	}}
	// What it found is in the candidates; that it did not converge is no error.
	optimize.Minimize(problem, from, &settings, method) //nolint:errcheck
}

// parts is into how many parts the runs of one candidate are dealt when it is
// tried alone.
func (s *searcher) parts() int { return cap(s.places) }

func (s *searcher) over() bool {
	s.lock.Lock()
	defer s.lock.Unlock()
	return s.err != nil || s.ctx.Err() != nil
}

// meritOf is the merit of settings, +Inf when there is no time to try them.
func (s *searcher) meritOf(values []float64, by, parts int) float64 {
	if c := s.try(values, by, parts); c != nil {
		return s.merit(c)
	}
	return math.Inf(1)
}

// tryAll tries several settings at once.
func (s *searcher) tryAll(all [][]float64, by int) {
	var group sync.WaitGroup
	for _, values := range all {
		group.Go(func() { s.try(values, by, 1) })
	}
	group.Wait()
}

// try evaluates settings by so many variations, unless that has been done.
func (s *searcher) try(values []float64, by, parts int) *Candidate {
	name := s.name(values, by)
	s.lock.Lock()
	c := s.known[name]
	if c != nil {
		s.tried[name] = c
	}
	s.lock.Unlock()
	if c == nil && !s.over() {
		var err error
		if c, err = (&job{s.Problem, values, s.variations[:by]}).evaluate(s.ctx, s.places, parts); err != nil {
			s.fail(err)
			return nil
		}
		s.keep(name, c)
	}
	return c
}

func (s *searcher) fail(err error) {
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.err == nil && !errors.Is(err, context.Canceled) && !errors.Is(err, context.DeadlineExceeded) {
		s.err = err
	}
}

// keep takes a candidate in.
func (s *searcher) keep(name string, c *Candidate) {
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.known[name] != nil { // two were at it
		return
	}
	s.known[name], s.tried[name] = c, c
	s.runs += int64(c.Judged + 1)
	if s.Progress != nil {
		s.Progress(min(s.runs, s.of), s.of)
	}
	if s.record != nil && s.err == nil {
		s.err = s.record.append(c)
	}
}

// name is the same for the same settings judged by the same variations.
func (p *Problem) name(values []float64, by int) string {
	return string(appendValues(nil, append(slices.Clone(values), float64(by))))
}

// ranked are the candidates of this search judged by so many variations, best
// first; of equals the one with the smaller settings.
func (s *searcher) ranked(by int) []*Candidate {
	s.lock.Lock()
	defer s.lock.Unlock()
	return s.rank(s.tried, by)
}

func (s *searcher) rank(from map[string]*Candidate, by int) []*Candidate {
	var out []*Candidate
	for _, c := range from {
		if c.Judged == by && s.inRange(c) {
			out = append(out, c)
		}
	}
	slices.SortFunc(out, func(a, b *Candidate) int {
		switch x, y := s.merit(a), s.merit(b); {
		case x < y:
			return -1
		case x > y:
			return 1
		}
		return slices.Compare(a.Values, b.Values)
	})
	return out
}

// inRange reports whether a candidate lies within the ranges, as the settings of
// the scenario need not.
func (s *searcher) inRange(c *Candidate) bool {
	for i, v := range c.Values {
		if v < s.Ranges[i].Low || v > s.Ranges[i].High {
			return false
		}
	}
	return true
}
