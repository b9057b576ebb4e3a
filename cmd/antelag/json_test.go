package main

import (
	"bytes"
	"encoding/json"
	"io"
	"math"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

// The shape of run --json. A pointer is a value that may be null.
type (
	verdictJSON struct {
		Scenario string     `json:"scenario"`
		Ticks    int64      `json:"ticks"`
		Rate     float64    `json:"rate_hz"`
		Slowdown float64    `json:"slowdown"`
		Step     float64    `json:"dt_s"`
		Lanes    []laneJSON `json:"lanes"`
		Compute  struct {
			Wall      float64 `json:"wall_s"`
			NsPerTick float64 `json:"ns_per_tick"`
		} `json:"compute"`
	}
	laneJSON struct {
		Name          string        `json:"name"`
		Outcome       string        `json:"outcome"`
		Trip          *tripJSON     `json:"trip"`
		Channels      []channelJSON `json:"channels"`
		Energy        energyJSON    `json:"energy"`
		ResponseError *float64      `json:"response_error"`
		Ran           float64       `json:"ran_s"`
		Accept        []acceptJSON  `json:"accept"`
		Pass          bool          `json:"pass"`
	}
	tripJSON struct {
		Limit   string   `json:"limit"`
		Channel string   `json:"channel"`
		Value   *float64 `json:"value"`
		Allowed *float64 `json:"allowed"`
		Time    float64  `json:"time_s"`
	}
	channelJSON struct {
		Name           string   `json:"name"`
		Compensator    string   `json:"compensator"`
		NRMSE          *float64 `json:"nrmse"`
		PeakError      *float64 `json:"peak_error_m"`
		PeakErrorRatio *float64 `json:"peak_error_ratio"`
		Delay          *float64 `json:"delay_s"`
		AmplitudeRatio *float64 `json:"amplitude_ratio"`
		FEI            struct {
			Amplitude *float64 `json:"amplitude"`
			Delay     *float64 `json:"delay_s"`
			Frequency *float64 `json:"frequency_hz"`
		} `json:"fei"`
		TrackingIndicator *float64            `json:"tracking_indicator_m2"`
		PeakTarget        *float64            `json:"peak_target_m"`
		PeakCommand       *float64            `json:"peak_command_m"`
		PeakVelocity      *float64            `json:"peak_velocity_m_s"`
		PeakHurry         *float64            `json:"peak_command_velocity_m_s"`
		PeakForce         *float64            `json:"peak_force_N"`
		Coefficients      map[string]*float64 `json:"coefficients"`
		Response          []bandJSON          `json:"response,omitempty"`
		SpectrumError     *float64            `json:"spectrum_error"`
	}
	bandJSON struct {
		Frequency *float64 `json:"frequency_hz"`
		Amplitude *float64 `json:"amplitude"`
		Delay     *float64 `json:"delay_s"`
	}
	energyJSON struct {
		Window       *float64 `json:"window_s"`
		MarginMin    *float64 `json:"margin_min"`
		MarginFinal  *float64 `json:"margin_final"`
		Injected     *float64 `json:"injected_J"`
		Damped       *float64 `json:"damped_J"`
		Specimen     *float64 `json:"specimen_J"`
		Input        *float64 `json:"input_J"`
		Kinetic      *float64 `json:"kinetic_J"`
		Strain       *float64 `json:"strain_J"`
		BalanceError *float64 `json:"balance_error"`
		AddedDamping *float64 `json:"added_damping"`
	}
	acceptJSON struct {
		Limit   string   `json:"limit"`
		Channel string   `json:"channel,omitempty"`
		Want    float64  `json:"want"`
		Got     *float64 `json:"got"`
		Pass    bool     `json:"pass"`
	}
)

// verdict decodes the one object that stdout must hold.
func verdict(t *testing.T, o outcome) verdictJSON {
	t.Helper()
	var v verdictJSON
	strictly(t, o.out, &v)
	return v
}

// strictly decodes text that is exactly one object with exactly the fields of
// into: none more, none fewer.
func strictly(t *testing.T, text string, into any) {
	t.Helper()
	d := json.NewDecoder(strings.NewReader(text))
	d.DisallowUnknownFields()
	if err := d.Decode(into); err != nil {
		t.Fatalf("%v in\n%s", err, text)
	}
	if _, err := d.Token(); err != io.EOF {
		t.Fatalf("more than one object on stdout: %v", err)
	}
	again, err := json.Marshal(into)
	if err != nil {
		t.Fatal(err)
	}
	var have, want any
	if err := json.Unmarshal([]byte(text), &have); err != nil {
		t.Fatal(err)
	}
	if err := json.NewDecoder(bytes.NewReader(again)).Decode(&want); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(have, want) {
		t.Fatalf("fields are missing from\n%s\nit should be\n%s", text, again)
	}
}

// number is a figure that must not be null.
func number(t *testing.T, what string, v *float64) float64 {
	t.Helper()
	if v == nil {
		t.Errorf("%s is null", what)
		return math.NaN()
	}
	return *v
}

// near compares a figure of the JSON with the same worked out from the log.
// The log holds every bit, so only the order of summing differs: 1e-9 of the
// figure, or of what it is the small difference of, is far above rounding.
func near(t *testing.T, what string, got *float64, want, scale float64) {
	t.Helper()
	if g := number(t, what, got); !(math.Abs(g-want) <= 1e-9*math.Max(scale, math.Abs(want))) {
		t.Errorf("%s is %.15g; the log says %.15g", what, g, want)
	}
}

// TestFiguresFromTheLog works every figure out again, plainly, from the log.
func TestFiguresFromTheLog(t *testing.T) {
	for _, c := range []struct {
		scenario string
		set      string
		lane     int
	}{
		{"rig.toml", "", 0},
		{"rig.toml", "", 1},
		{"rig.toml", "loop.slowdown=2.5", 0},
		{"archive", "loop.duration=12 s", 0},
		{"gantry-pulse", "loop.duration=3 s", 0},
		{"mast-release", "loop.duration=5 s", 0},
		{"tracking", "loop.duration=9 s", 0},
		{"tank", "loop.duration=12 s", 0},
		{"piperack", "loop.duration=7 s", 1},
		{"rig.toml", "damper.limits.stroke=8 mm", 0},
	} {
		t.Run(c.scenario+" "+c.set, func(t *testing.T) {
			t.Parallel()
			dir := folder(t, "rig.toml", rig)
			args := []string{"run", "--json", c.scenario, "--log", "x.csv"}
			if c.set != "" {
				args = append(args, "--set", c.set)
			}
			name := "configured"
			if c.lane > 0 {
				name = verdict(t, antelag(t, dir, args[:3]...)).Lanes[c.lane].Name
				args = append(args, "--log-lane", name)
			}
			v := verdict(t, antelag(t, dir, args...))
			lane := v.Lanes[c.lane]
			if lane.Name != name {
				t.Fatalf("lane %d is %s", c.lane, lane.Name)
			}
			l := readLog(t, filepath.Join(dir, "x.csv"))
			checkRun(t, &v, &lane, l)
			for _, ch := range lane.Channels {
				checkSums(t, &ch, l, 1/v.Rate)
				checkAlignment(t, &ch, l, 1/v.Rate)
			}
			checkEnergy(t, &lane, l)
			checkAccept(t, &lane)
		})
	}
}

func checkRun(t *testing.T, v *verdictJSON, lane *laneJSON, l *logged) {
	t.Helper()
	if v.Step != 1/v.Rate/v.Slowdown || v.Ticks <= 0 || v.Compute.Wall <= 0 || v.Compute.NsPerTick <= 0 {
		t.Errorf("%g s a tick at %g Hz slowed %g times, %d ticks, %+v", v.Step, v.Rate, v.Slowdown, v.Ticks, v.Compute)
	}
	last := l.column("time_s")[l.rows-1]
	switch lane.Outcome {
	case "completed":
		if lane.Trip != nil || int64(l.rows) != v.Ticks+1 || last != float64(v.Ticks)*v.Step {
			t.Errorf("%d ticks, but %d rows until %g s; trip %+v", v.Ticks, l.rows, last, lane.Trip)
		}
	case "tripped":
		// The log ends with the row of the trip, and that row passes the limit.
		x := l.column("damper.command_m")[l.rows-1]
		y := l.column("damper.measured_m")[l.rows-1]
		value := number(t, "trip value", lane.Trip.Value)
		if lane.Trip.Limit != "stroke" || value != math.Max(math.Abs(x), math.Abs(y)) || !(value > *lane.Trip.Allowed) ||
			lane.Trip.Time != last || int64(l.rows) >= v.Ticks || lane.Pass {
			t.Errorf("%+v with command %g m and measured %g m at %g s", lane.Trip, x, y, last)
		}
	default:
		t.Errorf("outcome %s", lane.Outcome)
	}
}

// checkSums compares the sums and peaks of one channel, ticks of dt physical
// seconds.
func checkSums(t *testing.T, c *channelJSON, l *logged, dt float64) {
	t.Helper()
	x, y := l.column(c.Name+".target_m"), l.column(c.Name+".measured_m")
	u, r := l.column(c.Name+".command_m"), l.column(c.Name+".force_N")
	var ee, xx, yy, area, peak float64
	for k := range x {
		e := x[k] - y[k]
		ee, xx, yy = ee+e*e, xx+x[k]*x[k], yy+y[k]*y[k]
		peak = math.Max(peak, math.Abs(e))
		if k > 0 {
			area += (x[k-1]*y[k] - x[k]*y[k-1]) / 2
		}
	}
	near(t, "nrmse", c.NRMSE, math.Sqrt(ee/xx), 1)
	near(t, "amplitude_ratio", c.AmplitudeRatio, math.Sqrt(yy/xx), 1)
	near(t, "peak_error_m", c.PeakError, peak, 0)
	near(t, "peak_error_ratio", c.PeakErrorRatio, peak/largest(x), 0)
	near(t, "tracking_indicator_m2", c.TrackingIndicator, area, math.Sqrt(xx*yy))
	near(t, "peak_target_m", c.PeakTarget, largest(x), 0)
	near(t, "peak_command_m", c.PeakCommand, largest(u), 0)
	near(t, "peak_force_N", c.PeakForce, largest(r), 0)

	// The velocity is the actuator's, without the noise of the sensor, so the
	// log can only bound it: by the largest mean velocity over ten ticks, and
	// by the largest between two.
	steps, tens := 0.0, 0.0
	for k := 1; k < len(y); k++ {
		steps = math.Max(steps, math.Abs(y[k]-y[k-1])/dt)
		if k >= 10 {
			tens = math.Max(tens, math.Abs(y[k]-y[k-10])/dt/10)
		}
	}
	if v := number(t, "peak_velocity_m_s", c.PeakVelocity); v < 0.9*tens || v > 1.1*steps {
		t.Errorf("peak velocity %g m/s; the log moves by up to %g m/s in a tick, %g m/s in ten", v, steps, tens)
	}
}

// checkAlignment compares what is worked out from the whole record of one
// channel, which does not have the start in it.
func checkAlignment(t *testing.T, c *channelJSON, l *logged, dt float64) {
	t.Helper()
	x, y := l.column(c.Name + ".target_m")[1:], l.column(c.Name + ".measured_m")[1:]
	near(t, "delay_s", c.Delay, delay(x, y, number(t, "delay_s", c.Delay), dt), 1)

	amplitude, late, frequency := evaluationIndex(x, y, dt)
	near(t, "fei.amplitude", c.FEI.Amplitude, amplitude, 1)
	near(t, "fei.delay_s", c.FEI.Delay, late, 1)
	near(t, "fei.frequency_hz", c.FEI.Frequency, frequency, 1)
}

// delay is where the correlation coefficient of the overlapping parts peaks,
// with a parabola through the three lags there. It looks 30 ticks around the
// delay that was found, and says NaN if that is not the highest peak there.
func delay(x, y []float64, found, dt float64) float64 {
	middle := int(math.Round(found / dt))
	rho := make([]float64, 61)
	best := 0
	for i := range rho {
		rho[i] = coefficient(x, y, middle-30+i)
		if rho[i] > rho[best] {
			best = i
		}
	}
	if best == 0 || best == len(rho)-1 {
		return math.NaN()
	}
	a, b, c := rho[best-1], rho[best], rho[best+1]
	return (float64(middle-30+best) + (a-c)/(2*(a-2*b+c))) * dt
}

func coefficient(x, y []float64, lag int) float64 {
	if lag >= 0 {
		x, y = x[:len(x)-lag], y[lag:]
	} else {
		x, y = x[-lag:], y[:len(y)+lag]
	}
	n := float64(len(x))
	var sx, sy float64
	for k := range x {
		sx, sy = sx+x[k], sy+y[k]
	}
	var xx, yy, xy float64
	for k := range x {
		a, b := x[k]-sx/n, y[k]-sy/n
		xx, yy, xy = xx+a*a, yy+b*b, xy+a*b
	}
	return xy / math.Sqrt(xx*yy)
}

// checkEnergy adds up the energies that the log can tell, by the trapezoid
// rule, and closes the balance with the rest.
func checkEnergy(t *testing.T, lane *laneJSON, l *logged) {
	t.Helper()
	e := lane.Energy
	margins := l.column("energy_margin")
	least, final := math.Inf(1), margins[l.rows-1]
	for _, m := range margins {
		if m < least {
			least = m
		}
	}
	if e.Input == nil {
		for what, v := range map[string]*float64{"margin_min": e.MarginMin, "margin_final": e.MarginFinal, "injected_J": e.Injected,
			"damped_J": e.Damped, "specimen_J": e.Specimen, "kinetic_J": e.Kinetic, "strain_J": e.Strain, "balance_error": e.BalanceError,
			"added_damping": e.AddedDamping, "response_error": lane.ResponseError} {
			if v != nil {
				t.Errorf("%s is %g without a structure", what, *v)
			}
		}
		if !math.IsInf(least, 1) {
			t.Errorf("the log has a margin of %g without a structure", least)
		}
		return
	}
	near(t, "margin_min", e.MarginMin, least, 0)
	if math.IsNaN(final) != (e.MarginFinal == nil) || e.MarginFinal != nil && *e.MarginFinal != final {
		t.Errorf("margin_final is %v; the log ends with %g", e.MarginFinal, final)
	}
	var injected, specimen, throughput float64
	for _, c := range lane.Channels {
		x, y, r := l.column(c.Name+".target_m"), l.column(c.Name+".measured_m"), l.column(c.Name+".force_N")
		for k := 1; k < l.rows; k++ {
			mean, dx, dy := (r[k]+r[k-1])/2, x[k]-x[k-1], y[k]-y[k-1]
			injected += mean * (dy - dx)
			specimen += mean * dy
			throughput += math.Abs(mean*dy) + math.Abs(mean*dx)
		}
	}
	near(t, "injected_J", e.Injected, injected, throughput)
	if largest(l.targets(0)) < 1e-3 { // nothing is stored in the specimens at the start
		near(t, "specimen_J", e.Specimen, specimen, throughput)
	}
	// input = kinetic + strain + damped + specimen − injected, as far from it
	// as balance_error says.
	rest := *e.Input - *e.Kinetic - *e.Strain - *e.Damped - *e.Specimen + *e.Injected
	size := largest([]float64{*e.Input, *e.Kinetic, *e.Strain, *e.Damped, *e.Specimen, *e.Injected})
	if b := number(t, "balance_error", e.BalanceError); math.Abs(math.Abs(rest)/size-b) > 1e-9 || b > 1e-3 {
		t.Errorf("the balance is open by %g of its largest term; balance_error is %g", rest/size, b)
	}
	if *e.Kinetic < 0 || *e.Strain < 0 || *e.Damped <= 0 || number(t, "window_s", e.Window) <= 0 {
		t.Errorf("no such energies: %+v", e)
	}
	// Late is damping taken away, early is damping added.
	if a := number(t, "added_damping", e.AddedDamping); (a > 0) != (*e.Injected < 0) {
		t.Errorf("added damping %g with %g J injected", a, *e.Injected)
	}
}

// checkAccept holds the judgements against the figures that they judge.
func checkAccept(t *testing.T, lane *laneJSON) {
	t.Helper()
	all := lane.Outcome == "completed"
	for _, a := range lane.Accept {
		var want *float64
		worst := func(figure func(*channelJSON) *float64) {
			for i := range lane.Channels {
				if v := figure(&lane.Channels[i]); want == nil || math.Abs(*v) > math.Abs(*want) {
					want = v
					if a.Channel != lane.Channels[i].Name && i == len(lane.Channels)-1 {
						t.Errorf("%s: the worst channel is %s, not %s", a.Limit, lane.Channels[i].Name, a.Channel)
					}
				}
			}
		}
		switch a.Limit {
		case "nrmse":
			worst(func(c *channelJSON) *float64 { return c.NRMSE })
		case "delay":
			worst(func(c *channelJSON) *float64 { return c.Delay })
		case "peak_error":
			worst(func(c *channelJSON) *float64 { return c.PeakError })
		case "spectrum_error":
			worst(func(c *channelJSON) *float64 { return c.SpectrumError })
		case "energy_margin":
			want = lane.Energy.MarginMin
		case "response_error":
			want = lane.ResponseError
		default:
			t.Errorf("unknown limit %q", a.Limit)
			continue
		}
		pass := a.Got != nil && (a.Limit == "energy_margin") == (math.Abs(*a.Got) > a.Want)
		if !reflect.DeepEqual(a.Got, want) || a.Pass != pass {
			t.Errorf("%+v; the figure is %v", a, want)
		}
		all = all && a.Pass
	}
	if lane.Pass != all {
		t.Errorf("pass is %v with outcome %s and %+v", lane.Pass, lane.Outcome, lane.Accept)
	}
}

// With one storey the target is the structure's displacement, so that the
// response error follows from the log and that of a run with a perfect
// actuator and perfect sensors, which is the reference response.
func TestResponseErrorFromTwoLogs(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig)
	v := verdict(t, antelag(t, dir, "run", "rig.toml", "--json", "--log", "late.csv", "--log-lane", "late"))
	perfect := []string{"run", "rig.toml", "--json", "--log", "perfect.csv"}
	for _, set := range []string{"actuator.delay=0 s", "actuator.lag=0 s", "compensator.kind=none", "sensor.displacement_noise=0 m", "sensor.force_noise=0 N"} {
		perfect = append(perfect, "--set", "damper."+set)
	}
	p := verdict(t, antelag(t, dir, perfect...).good(t))
	x := readLog(t, filepath.Join(dir, "late.csv")).column("damper.target_m")
	ref := readLog(t, filepath.Join(dir, "perfect.csv")).column("damper.target_m")
	var ee, rr float64
	for k := range x {
		ee, rr = ee+(x[k]-ref[k])*(x[k]-ref[k]), rr+ref[k]*ref[k]
	}
	near(t, "response_error", v.Lanes[1].ResponseError, math.Sqrt(ee/rr), 1)
	if e := *v.Lanes[1].ResponseError; e < 0.01 {
		t.Errorf("a late loop has a response error of %g only", e)
	}
	c := p.Lanes[0].Channels[0]
	if *p.Lanes[0].ResponseError > 1e-12 || *c.NRMSE != 0 || *c.PeakError != 0 || *c.AmplitudeRatio != 1 || *p.Lanes[0].Energy.Injected != 0 {
		t.Errorf("a perfect actuator: response error %g, %+v", *p.Lanes[0].ResponseError, c)
	}
}

// Of a test in which nothing moves most figures are undefined, and null.
func TestNothingMoves(t *testing.T) {
	t.Parallel()
	text := strings.Replace(edited(t, "kind = \"filtered-noise\"\npeak = \"0.2 g\"\nrise = \"1 s\"\nstrong = \"4 s\"\n",
		"kind = \"sine\"\namplitude = 0\nfrequency = \"1 Hz\"\n"), "displacement_noise = \"0.01 mm\"\nforce_noise = \"20 N\"\n", "", 1)
	dir := folder(t, "still.toml", text)
	o := antelag(t, dir, "run", "still.toml", "--json")
	v := verdict(t, o)
	lane, c := v.Lanes[0], v.Lanes[0].Channels[0]
	if o.code != exitFail || lane.Pass || lane.Outcome != "completed" {
		t.Errorf("exit %d, %s, pass %v", o.code, lane.Outcome, lane.Pass)
	}
	for what, v := range map[string]*float64{"nrmse": c.NRMSE, "delay_s": c.Delay, "amplitude_ratio": c.AmplitudeRatio,
		"peak_error_ratio": c.PeakErrorRatio, "fei.delay_s": c.FEI.Delay, "margin_min": lane.Energy.MarginMin,
		"added_damping": lane.Energy.AddedDamping, "response_error": lane.ResponseError} {
		if v != nil {
			t.Errorf("%s is %g", what, *v)
		}
	}
	for _, a := range lane.Accept {
		if a.Got != nil || a.Pass {
			t.Errorf("%+v", a)
		}
	}
	if text := antelag(t, dir, "run", "still.toml").out; !strings.Contains(text, "not defined") || strings.Contains(text, "NaN") {
		t.Errorf("printed\n%s", text)
	}
}
