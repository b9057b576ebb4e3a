package accept

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"runtime/debug"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

const (
	// stuck is when a run of some hundred ticks counts as hanging: many times
	// what the slowest takes, so that no loaded machine fails for it.
	stuck = 2 * time.Minute
	// Every so many scenarios is run again.
	everyAgain = 20
	// At most this share may be refused, at least this share must be resolved
	// by its ticks: else the draw has gone astray and tests nothing.
	mostRefused, fewestResolved = 0.6, 0.05
)

// Scenarios of every kind, with settings drawn from the tables of kinds, end
// as completed, tripped or diverged, or are refused with one message that says
// where; what they find is finite or undefined where that is described, and
// nothing undefined passes; where the ticks resolve the motion, energy adds up.
func TestDrawnScenarios(t *testing.T) {
	// A panic in the goroutine of a lane cannot be caught here: the trace then
	// shows the number of the scenario as the last argument of try.
	debug.SetTraceback("all")
	f := &fuzzed{t: t, dir: t.TempDir(), count: map[string]int{}, ran: map[string]int{}}
	for name, text := range records {
		if err := os.WriteFile(filepath.Join(f.dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	began := time.Now()
	var next atomic.Uint64
	var workers sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		workers.Go(func() {
			for n := next.Add(1); n <= fuzzedCases && !t.Failed(); n = next.Add(1) {
				f.guard(n)
			}
		})
	}
	workers.Wait()
	if !t.Failed() {
		f.report(time.Since(began))
	}
}

// fuzzed draws scenarios, runs them and counts what became of them.
type fuzzed struct {
	t   *testing.T
	dir string // where the records lie

	mu      sync.Mutex
	count   map[string]int
	ran     map[string]int // runs by kind
	slowest time.Duration
	slow    uint64
}

// guard runs one scenario and turns a panic or a hang into a failure.
func (f *fuzzed) guard(number uint64) {
	done := make(chan error, 1)
	began := time.Now()
	go func() {
		defer func() {
			if p := recover(); p != nil {
				done <- fmt.Errorf("panic: %v\n%s", p, debug.Stack())
			}
		}()
		done <- f.try(number)
	}()
	var err error
	select {
	case err = <-done:
	case <-time.After(stuck):
		err = fmt.Errorf("still runs after %v", stuck)
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	if took := time.Since(began); took > f.slowest {
		f.slowest, f.slow = took, number
	}
	if err != nil {
		text, flags := draw(number)
		f.t.Errorf("scenario %d: %v\n--set %q\n%s", number, err, flags, text)
	}
}

//go:noinline
func (f *fuzzed) try(number uint64) error {
	text, flags := draw(number)
	v, seen, err := f.run(text, flags)
	if err != nil {
		f.tally("refused")
		return refusal(err, text)
	}
	if err := sound(v); err != nil {
		return err
	}
	f.tallyKinds(v.Scene)
	for i := range v.Lanes {
		l := &v.Lanes[i]
		f.tally(l.Outcome.String())
		if l.Pass {
			f.tally("passed")
		}
		if m := seen[l.Name]; m != nil && l.Outcome == rtloop.Completed && m.resolved() {
			f.tally("resolved")
			if err := m.balanced(l); err != nil {
				return fmt.Errorf("lane %s: %w", l.Name, err)
			}
		}
	}
	if number%everyAgain == 0 {
		return f.again(text, flags, v)
	}
	return nil
}

// run also returns what was seen of lanes with a structure.
func (f *fuzzed) run(text string, flags []scenarios.Change) (*Verdict, map[string]*motion, error) {
	s, err := scenarios.Parse("drawn.toml", []byte(text), f.dir, flags...)
	if err != nil {
		return nil, nil, err
	}
	seen := map[string]*motion{}
	v, err := Run(context.Background(), s, Options{Observe: func(lane string) func(*rtloop.Loop) error {
		if s.Excitation.Drives == excitation.Target {
			return nil
		}
		m := &motion{dt: 1 / (s.Loop.Num("rate") * s.Loop.Num("slowdown"))}
		seen[lane] = m
		return func(l *rtloop.Loop) error {
			m.observe(l, len(s.Channels))
			return nil
		}
	}})
	return v, seen, err
}

// again runs a scenario a second time, and as it writes itself: to the last
// bit the verdict must be the same.
func (f *fuzzed) again(text string, flags []scenarios.Change, v *Verdict) error {
	var written bytes.Buffer
	if _, err := v.Scene.WriteTo(&written); err != nil {
		return err
	}
	first, err := encode(v)
	if err != nil {
		return err
	}
	for what, second := range map[string]func() (*Verdict, map[string]*motion, error){
		"a second time":        func() (*Verdict, map[string]*motion, error) { return f.run(text, flags) },
		"as it writes itself,": func() (*Verdict, map[string]*motion, error) { return f.run(written.String(), nil) },
	} {
		w, _, err := second()
		if err != nil {
			return fmt.Errorf("%s: %w", what, err)
		}
		if got, err := encode(w); err != nil || !bytes.Equal(first, got) {
			return fmt.Errorf("%s it runs otherwise: %v\n%s\n%s\n%s", what, err, first, got, written.Bytes())
		}
	}
	return nil
}

var place = regexp.MustCompile(`^drawn\.toml:([1-9]\d*)$`)

// refusal judges the message for a scenario that cannot run: one *Error whose
// place has to do with its key. Every value drawn is within its range, so that
// no message may say that one is not.
func refusal(err error, text string) error {
	var e *scenarios.Error
	message := err.Error()
	switch {
	case !errors.As(err, &e) || e.Error() != message || e.Key == "":
		return fmt.Errorf("refused without place or key: %w", err)
	case strings.Contains(message, "\n"):
		return fmt.Errorf("refused in several lines: %w", err)
	case strings.Contains(message, "allowed is"):
		return fmt.Errorf("refused a value within its range: %w", err)
	case strings.Contains(message, "NaN") || strings.Contains(message, "Inf"):
		return fmt.Errorf("refused for what is no number: %w", err)
	}
	last := e.Key[strings.LastIndexByte(e.Key, '.')+1:]
	if flag, ok := strings.CutPrefix(e.Where, "--set "); ok {
		if !strings.HasSuffix(flag, "."+last) {
			return fmt.Errorf("refused at another flag than its key's: %w", err)
		}
		return nil
	}
	at := place.FindStringSubmatch(e.Where)
	if at == nil {
		return fmt.Errorf("refused without a line: %w", err)
	}
	number, _ := strconv.Atoi(at[1])
	line := strings.Split(text, "\n")[number-1]
	section := strings.Trim(line, "[]")
	if !strings.HasPrefix(line, last+" = ") && section != e.Key && !strings.HasPrefix(e.Key, section+".") {
		return fmt.Errorf("refused at the line %q: %w", line, err)
	}
	return nil
}

func (f *fuzzed) tally(what string) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.count[what]++
}

func (f *fuzzed) tallyKinds(s *scenarios.Scenario) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.ran[s.Excitation.Kind.Name]++
	if s.Substructure != nil {
		f.ran[s.Substructure.Values.Text("integrator")]++
	}
	for _, c := range s.Channels {
		f.ran[c.Actuator.Kind.Name]++
		f.ran[c.Compensator.Kind.Name]++
		for _, e := range c.Specimen {
			f.ran[e.Kind.Name]++
		}
	}
}

// report says what became of the scenarios, and fails where the draw has gone
// astray.
func (f *fuzzed) report(took time.Duration) {
	lanes := f.count["completed"] + f.count["tripped"] + f.count["diverged"]
	share := func(what string, of int) float64 { return float64(f.count[what]) / float64(max(1, of)) }
	f.t.Logf("%d scenarios in %.1f s, the slowest, %d, in %.1f s: %.1f %% refused", fuzzedCases, took.Seconds(), f.slow, f.slowest.Seconds(), 100*share("refused", fuzzedCases))
	for _, what := range []string{"completed", "tripped", "diverged", "passed", "resolved"} {
		f.t.Logf("of %d lanes %.1f %% %s", lanes, 100*share(what, lanes), what)
	}
	if share("refused", fuzzedCases) > mostRefused || share("resolved", lanes) < fewestResolved {
		f.t.Error("too many are refused, or too few resolved by their ticks")
	}
	for _, kinds := range [][]*kind.Kind{compensator.Kinds.Kinds(), plant.Actuators.Kinds(), plant.Elements.Kinds(), excitation.Kinds.Kinds(), substructure.Integrators.Kinds()} {
		for _, k := range kinds {
			if f.ran[k.Name] < fuzzedCases/200 {
				f.t.Errorf("%s ran %d times", k.Name, f.ran[k.Name])
			}
		}
	}
}
