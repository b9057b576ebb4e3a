package accept

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"runtime"
	"runtime/debug"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"antelag/rtloop"
	"antelag/scenarios"
)

// stuck is when a run of some hundred ticks counts as hanging: hundreds of
// times what the slowest takes, so that no loaded machine fails for it.
const stuck = time.Minute

// Scenarios of every kind, with settings drawn from the tables of kinds, end
// as completed, tripped or diverged, or are refused with one message that says
// where; what they find is finite or stated as undefined, and nothing that is
// undefined passes.
func TestDrawnScenarios(t *testing.T) {
	// A panic behind a lane cannot be caught here: then the trace shows the
	// number of the scenario as the argument of try.
	debug.SetTraceback("all")
	f := &fuzzed{dir: t.TempDir(), t: t}
	f.writeRecords()
	began := time.Now()
	var next atomic.Uint64
	var workers sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		workers.Go(func() {
			for n := next.Add(1); n <= fuzzedCases && (os.Getenv("ALL") != "" || !t.Failed()); n = next.Add(1) {
				f.guard(n)
			}
		})
	}
	workers.Wait()
	f.report(time.Since(began))
}

// fuzzed draws scenarios, runs them and counts what became of them.
type fuzzed struct {
	t     *testing.T
	dir   string
	mu    sync.Mutex
	count map[string]int
	slow  time.Duration
	slowN uint64
}

func (f *fuzzed) tally(what string) {
	f.mu.Lock()
	defer f.mu.Unlock()
	if f.count == nil {
		f.count = map[string]int{}
	}
	f.count[what]++
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
	if took := time.Since(began); took > f.slow {
		f.slow, f.slowN = took, number
	}
	f.mu.Unlock()
	if err != nil {
		if os.Getenv("ALL") != "" {
			f.t.Errorf("scenario %d: %v", number, strings.SplitN(err.Error(), "\n", 2)[0])
			return
		}
		text, flags := draw(number)
		f.t.Errorf("scenario %d: %v\n--set %+q\n%s", number, err, flags, text)
	}
}

//go:noinline
func (f *fuzzed) try(number uint64) error {
	v, seen, err := f.run(number)
	if err != nil {
		f.tally("refused")
		f.tally("refused: " + regexp.MustCompile(`[\d.e+-]+`).ReplaceAllString(strings.SplitN(err.Error(), ": ", 2)[1], "#"))
		return refusal(err)
	}
	if err := judged(v); err != nil {
		return err
	}
	if err := shown(v); err != nil {
		return err
	}
	for i := range v.Lanes {
		l := &v.Lanes[i]
		f.tally(l.Outcome.String())
		if l.Pass {
			f.tally("passed")
		}
		if os.Getenv("DUMP") != "" && l.Outcome == rtloop.Completed && l.Energy.Input.Defined() {
			a, b, c := seen[l.Name].rough()
			fmt.Printf("BAL %d %g %g %g %g %d\n", number, float64(l.Energy.BalanceError), a, b, c, v.Ticks)
		}
	}
	if number%20 == 0 {
		return f.again(number, v)
	}
	return nil
}

func (f *fuzzed) scenario(number uint64) (*scenarios.Scenario, error) {
	text, flags := draw(number)
	return scenarios.Parse("drawn.toml", []byte(text), f.dir, flags...)
}

func (f *fuzzed) run(number uint64) (*Verdict, map[string]*roughness, error) {
	s, err := f.scenario(number)
	if err != nil {
		return nil, nil, err
	}
	seen := map[string]*roughness{}
	v, err := Run(context.Background(), s, Options{Observe: func(lane string) func(*rtloop.Loop) error {
		r := &roughness{channels: len(s.Channels)}
		seen[lane] = r
		return r.observe
	}})
	return v, seen, err
}

// roughness sees how well the ticks resolve what moves.
type roughness struct {
	channels int
	ticks    int
	last     []float64 // values one tick ago
	step     []float64 // their change then
	size     []float64 // Σ value²
	slope    []float64 // Σ change²
	bend     []float64 // Σ (change of change)²
	now      []float64
}

func (r *roughness) observe(l *rtloop.Loop) error {
	r.now = append(r.now[:0], l.Displacements()...)
	n := len(r.now)
	for j := range r.channels {
		row := l.Row(j)
		r.now = append(r.now, row.Measured, row.Force)
	}
	_ = n
	if r.ticks == 0 {
		k := len(r.now)
		r.last, r.step, r.size, r.slope, r.bend = make([]float64, k), make([]float64, k), make([]float64, k), make([]float64, k), make([]float64, k)
	}
	for i, v := range r.now {
		d := v - r.last[i]
		if r.ticks > 0 {
			r.slope[i] += d * d
			r.size[i] += v * v
		}
		if r.ticks > 1 {
			r.bend[i] += (d - r.step[i]) * (d - r.step[i])
		}
		r.last[i], r.step[i] = v, d
	}
	r.ticks++
	return nil
}

func (r *roughness) rough() (x, y, force float64) {
	n := len(r.now) - 2*r.channels
	for i := range n {
		x = max(x, ratio(r.bend[i], r.slope[i]))
	}
	for j := range r.channels {
		y = max(y, ratio(r.bend[n+2*j], r.slope[n+2*j]))
		force = max(force, ratio(r.slope[n+2*j+1], r.size[n+2*j+1]))
	}
	return x, y, force
}

func ratio(a, b float64) float64 {
	if b == 0 {
		return 0
	}
	return math.Sqrt(a / b)
}

var place = regexp.MustCompile(`^drawn\.toml:[1-9]\d*$`)

// refusal judges the message for a scenario that cannot run: one *Error that
// names the line or the flag, and the key. Every value drawn is within its
// range, so no message may say that one is not.
func refusal(err error) error {
	var e *scenarios.Error
	text := err.Error()
	switch {
	case !errors.As(err, &e) || e.Error() != text:
		return fmt.Errorf("refused without a place: %w", err)
	case !place.MatchString(e.Where) && !strings.HasPrefix(e.Where, "--set "):
		return fmt.Errorf("refused without a line: %w", err)
	case e.Key == "":
		return fmt.Errorf("refused without a key: %w", err)
	case strings.Contains(text, "\n"):
		return fmt.Errorf("refused in several lines: %w", err)
	case strings.Contains(text, "allowed is"):
		return fmt.Errorf("refused a value within its range: %w", err)
	case strings.Contains(text, "NaN") || strings.Contains(text, "Inf"):
		return fmt.Errorf("refused for what is no number: %w", err)
	}
	return nil
}

// judged checks outcomes and figures.
func judged(v *Verdict) error {
	for i := range v.Lanes {
		l := &v.Lanes[i]
		if err := lane(l); err != nil {
			return fmt.Errorf("lane %s: %w", l.Name, err)
		}
	}
	return nil
}

func lane(l *Lane) error {
	switch l.Outcome {
	case rtloop.Completed:
		if l.Trip != nil {
			return fmt.Errorf("completed with a trip %+v", *l.Trip)
		}
	case rtloop.Tripped:
		if l.Trip == nil || !l.Trip.Value.Defined() || !(l.Trip.Value > l.Trip.Allowed) {
			return fmt.Errorf("tripped: %+v", l.Trip)
		}
	case rtloop.Diverged:
		if l.Trip == nil || l.Trip.Limit == "" {
			return errors.New("diverged, of no cause")
		}
	default:
		return fmt.Errorf("ended as %s", l.Outcome)
	}
	pass := l.Outcome == rtloop.Completed
	for _, j := range l.Accept {
		if j.Pass && !j.Got.Defined() {
			return fmt.Errorf("%s passes undefined", j.Limit)
		}
		pass = pass && j.Pass
	}
	if l.Pass != pass {
		return fmt.Errorf("passes: %v, by outcome and limits: %v", l.Pass, pass)
	}
	if l.Outcome == rtloop.Completed {
		return figures(&l.LaneResult)
	}
	return nil
}

// figures checks those of a completed lane: finite, or undefined where the
// figure's own description has such a case; then NaN, never infinite.
func figures(l *rtloop.LaneResult) error {
	var bad []string
	need := func(name string, may bool, f rtloop.Figure) {
		if math.IsInf(float64(f), 0) || !may && !f.Defined() {
			bad = append(bad, fmt.Sprintf("%s %v", name, float64(f)))
		}
	}
	for _, c := range l.Channels {
		still := c.PeakTarget == 0
		need("nrmse", still, c.NRMSE)
		need("peak_error", false, c.PeakError)
		need("peak_error_ratio", still, c.PeakErrorRatio)
		need("delay", true, c.Delay)
		need("amplitude_ratio", still, c.AmplitudeRatio)
		need("fei.amplitude", true, c.FEI.Amplitude)
		need("fei.delay", true, c.FEI.Delay)
		need("fei.frequency", true, c.FEI.Frequency)
		need("tracking_indicator", false, c.TrackingIndicator)
		need("peak_target", false, c.PeakTarget)
		need("peak_command", false, c.PeakCommand)
		need("peak_velocity", false, c.PeakVelocity)
		need("peak_force", false, c.PeakForce)
		need("spectrum_error", true, c.SpectrumError)
		for name, v := range c.Coefficients {
			need(name, false, v)
		}
		for _, b := range c.Response {
			need("response frequency", false, b.Frequency)
			need("response amplitude", false, b.Amplitude)
			need("response delay", false, b.Delay)
		}
	}
	e := &l.Energy
	none := math.IsNaN(float64(e.Input)) // a driven target
	need("window", false, e.Window)
	need("margin_min", true, e.MarginMin)
	need("margin_final", true, e.MarginFinal)
	need("injected", none, e.Injected)
	need("damped", none, e.Damped)
	need("specimen", none, e.Specimen)
	need("kinetic", none, e.Kinetic)
	need("strain", none, e.Strain)
	need("balance_error", none, e.BalanceError)
	need("added_damping", true, e.AddedDamping)
	need("response_error", true, l.ResponseError)
	if bad != nil {
		return errors.New(strings.Join(bad, ", "))
	}
	return nil
}

// shown checks that the verdict can be written for programs and for people.
func shown(v *Verdict) error {
	if _, err := encode(v); err != nil {
		return err
	}
	for _, colour := range []bool{false, true} {
		var text strings.Builder
		if err := v.WriteText(&text, colour); err != nil {
			return err
		}
		if s := text.String(); strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
			return fmt.Errorf("the text shows what is no number:\n%s", s)
		}
	}
	return nil
}

// encode is the verdict as JSON without what the run cost.
func encode(v *Verdict) ([]byte, error) {
	w := *v
	w.Compute = Compute{}
	return json.Marshal(&w)
}

// again runs the scenario a second time, and once more as it writes itself.
func (f *fuzzed) again(number uint64, v *Verdict) error {
	first, err := encode(v)
	if err != nil {
		return err
	}
	second, _, err := f.run(number)
	if err != nil {
		return fmt.Errorf("the second run: %w", err)
	}
	if text, err := encode(second); err != nil || !bytes.Equal(first, text) {
		return fmt.Errorf("the second run differs: %v\n%s\n%s", err, first, text)
	}
	var written bytes.Buffer
	if _, err := v.Scene.WriteTo(&written); err != nil {
		return err
	}
	read, err := scenarios.Parse("drawn.toml", written.Bytes(), f.dir)
	if err != nil {
		return fmt.Errorf("as it writes itself: %w", err)
	}
	third, err := Run(context.Background(), read, Options{})
	if err != nil {
		return fmt.Errorf("as it writes itself: %w", err)
	}
	if text, err := encode(third); err != nil || !reflect.DeepEqual(first, text) {
		return fmt.Errorf("as it writes itself the run differs: %v\n%s\n%s\n%s", err, first, text, written.Bytes())
	}
	return nil
}

// writeRecords writes the data files that drawn scenarios name.
func (f *fuzzed) writeRecords() {
	for name, text := range records {
		if err := os.WriteFile(filepath.Join(f.dir, name), []byte(text), 0o600); err != nil {
			f.t.Fatal(err)
		}
	}
}

func (f *fuzzed) report(took time.Duration) {
	for k, v := range f.count {
		f.t.Logf("%6d %s", v, k)
	}
	f.t.Logf("%d scenarios in %v, the slowest, %d, in %v", fuzzedCases, took, f.slowN, f.slow)
}
