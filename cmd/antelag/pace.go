package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"runtime"
	"text/tabwriter"
	"time"

	"github.com/spf13/cobra"

	"antelag/rtloop/pace"
	"antelag/scenarios/quantity"
)

// The rates and times that can be measured. A tick is waited for to its end,
// after Ctrl-C too, so that it cannot be longer than a second.
const (
	slowestRate, fastestRate = 1.0, 100e3 // Hz
	longestTime              = 7 * 24 * 3600.0
)

type paceOptions struct {
	rate, time string
	json       bool
}

func newPace() *cobra.Command {
	o := &paceOptions{}
	cmd := &cobra.Command{
		Use:   "pace",
		Short: "measure how well this machine holds a rate",
		Long: `Measure how well this machine holds a rate: release ticks that do nothing at that
rate, and measure how late each was. The rate is held if none was later than a
whole period and 99.9 % were no later than a tenth of it; if none was later than
a period, but more than one in a thousand later than a tenth, it is held with late
ticks. Exit code: 0 the rate was held, 1 it was not, 2 bad input.`,
		Args:              noArgument,
		ValidArgsFunction: cobra.NoFileCompletions,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringVar(&o.rate, "rate", "2048 Hz", "the `RATE` to hold")
	f.StringVar(&o.time, "time", "10 s", "how much `TIME` to measure")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *paceOptions) run(cmd *cobra.Command, _ []string) error {
	rate, ticks, err := o.read()
	if err != nil {
		return err
	}
	p, err := pace.New(1 / rate)
	if err != nil {
		return fmt.Errorf("--rate: %w", err)
	}
	measure(cmd.Context(), p, ticks)
	r := p.Report()
	print := printPace
	if o.json {
		print = printPaceJSON
	}
	if err := print(cmd.OutOrStdout(), r, rate, ticks); err != nil {
		return &failure{err}
	}
	if r.Verdict() == pace.Fails {
		return errVerdict
	}
	return nil
}

func (o *paceOptions) read() (rate float64, ticks int64, err error) {
	rate, err = between("--rate", o.rate, quantity.Frequency, slowestRate, fastestRate)
	if err != nil {
		return 0, 0, err
	}
	t, err := between("--time", o.time, quantity.Time, 1/rate, longestTime)
	if err != nil {
		return 0, 0, err
	}
	return rate, int64(math.Round(t * rate)), nil
}

func between(flag, text string, dim quantity.Dim, least, most float64) (float64, error) {
	v, err := quantity.ParseAs(text, dim)
	switch {
	case err != nil:
		return 0, fmt.Errorf("%s: %w", flag, err)
	case v < least:
		return 0, fmt.Errorf("%s: %s is below %s", flag, text, quantity.Short(least, dim))
	case v > most:
		return 0, fmt.Errorf("%s: %s is above %s", flag, text, quantity.Short(most, dim))
	}
	return v, nil
}

// measure releases the ticks here, and shows from elsewhere how far it is.
func measure(ctx context.Context, p *pace.Pacer, ticks int64) {
	bar := newProgress("pace")
	watch, over := context.WithCancel(ctx)
	shown := make(chan struct{})
	go func() {
		defer close(shown)
		defer bar.clear()
		t := time.NewTicker(patience)
		defer t.Stop()
		for {
			select {
			case <-watch.Done():
				return
			case <-t.C:
				bar.report(p.Report().Ticks, ticks)
			}
		}
	}()
	p.LockProgram()
	defer p.Unlock()
	p.Run(ctx, ticks, func() {})
	over()
	<-shown
}

func printPace(out io.Writer, r pace.Report, rate float64, asked int64) error {
	fmt.Fprintln(out, paceSentence(&r, rate))
	if r.Ticks < asked {
		fmt.Fprintf(out, "Interrupted after %s of %s; the figures are of what ran.\n",
			quantity.Short(float64(r.Ticks)/rate, quantity.Time), quantity.Short(float64(asked)/rate, quantity.Time))
	}
	fmt.Fprintln(out)
	t := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	if r.Ticks > 0 {
		for _, row := range []struct {
			name string
			late time.Duration
		}{{"50 % of the ticks", r.P50}, {"90 %", r.P90}, {"99 %", r.P99}, {"99.9 %", r.P999}, {"all", r.Max}} {
			fmt.Fprintf(t, "%s\tat most %s late\n", row.name, span(row.late.Seconds()))
		}
	}
	fmt.Fprintf(t, "late\t%d of %d, by more than a tenth of the period, %s\n", r.Late, r.Ticks, span(pace.Tolerance*r.Period))
	fmt.Fprintf(t, "overruns\t%d of %d, by more than the period, %s; no tick is skipped\n", r.Overruns, r.Ticks, span(r.Period))
	moved := "never moved"
	if r.Shifts > 0 {
		moved = fmt.Sprintf("moved %d times, by %s in all", r.Shifts, span(r.Shifted.Seconds()))
	}
	fmt.Fprintf(t, "deadlines\t%s\n", moved)
	column(t, "granted or not", r.Granted)
	column(t, "would help", paceAdvice(&r))
	return t.Flush()
}

// column prints lines below each other, the first behind its name.
func column(out io.Writer, name string, lines []string) {
	for _, line := range lines {
		fmt.Fprintf(out, "%s\t%s\n", name, line)
		name = ""
	}
}

// paceSentence says whether the rate is held.
func paceSentence(r *pace.Report, rate float64) string {
	hz := quantity.Short(rate, quantity.Frequency)
	switch r.Verdict() {
	case pace.Holds:
		return fmt.Sprintf("This machine holds %s: 99.9 %% of %d ticks came within %s of their time, the worst %s late.",
			hz, r.Ticks, span(r.P999.Seconds()), span(r.Max.Seconds()))
	case pace.HoldsLate:
		return fmt.Sprintf("This machine holds %s with late ticks: %d of %d came more than a tenth of the period late, the worst %s, none a whole period.",
			hz, r.Late, r.Ticks, span(r.Max.Seconds()))
	}
	if r.Ticks == 0 {
		return fmt.Sprintf("Nothing can be said about %s: no tick was released.", hz)
	}
	return fmt.Sprintf("This machine does not hold %s: %d of %d ticks came more than a whole period late, the worst %s.",
		hz, r.Overruns, r.Ticks, span(r.Max.Seconds()))
}

// paceAdvice is what commonly helps and is not there.
func paceAdvice(r *pace.Report) (advice []string) {
	switch {
	case r.RealTime:
	case runtime.GOOS != "linux":
		advice = append(advice, "Linux, where real-time priority can be had")
	default:
		advice = append(advice,
			"permission for real-time priority: run it as root, or allow it once for this program:",
			`sudo setcap cap_sys_nice,cap_ipc_lock+ep "$(command -v antelag)"`)
	}
	if r.Verdict() != pace.Holds {
		advice = append(advice,
			"no other work on the machine, and no virtual machine",
			"processors that do not change their frequency: the governor \"performance\", idle states off")
		if runtime.GOOS == "linux" {
			advice = append(advice, "a kernel with PREEMPT_RT, and a processor kept free (isolcpus)")
		}
	}
	return advice
}

// span prints a time, s, with three digits, as many as are measured.
func span(s float64) string {
	unit := "s"
	switch {
	case s < 1e-3:
		unit = "us"
	case s < 1:
		unit = "ms"
	}
	u, _ := quantity.ParseUnit(unit)
	return quantity.FormatIn(s, u, unit, 3)
}

func printPaceJSON(out io.Writer, r pace.Report, rate float64, _ int64) error {
	type lateness struct {
		P50  float64 `json:"p50"`
		P90  float64 `json:"p90"`
		P99  float64 `json:"p99"`
		P999 float64 `json:"p999"`
		Max  float64 `json:"max"`
	}
	object := struct {
		Rate     float64   `json:"rate_hz"`
		Time     float64   `json:"time_s"`
		Ticks    int64     `json:"ticks"`
		Late     int64     `json:"late"`
		Overruns int64     `json:"overruns"`
		Shifts   int64     `json:"shifts"`
		Lateness *lateness `json:"lateness_s"` // null without a tick
		Granted  []string  `json:"granted"`
		Holds    bool      `json:"holds"`
	}{rate, float64(r.Ticks) / rate, r.Ticks, r.Late, r.Overruns, r.Shifts, nil, r.Granted, r.Verdict() != pace.Fails}
	if r.Ticks > 0 {
		object.Lateness = &lateness{r.P50.Seconds(), r.P90.Seconds(), r.P99.Seconds(), r.P999.Seconds(), r.Max.Seconds()}
	}
	return writeJSON(out, object)
}
