package identified

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"antelag/plant/identify"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// spread writes a standard error in two digits.
func spread(v float64, dim quantity.Dim) string {
	if math.IsNaN(v) || math.IsInf(v, 0) || v > 1e9 {
		return "unknown"
	}
	text := quantity.Format(v, dim)
	number, unit, _ := strings.Cut(text, " ")
	n, err := strconv.ParseFloat(number, 64)
	if err != nil {
		return text
	}
	return strings.TrimSpace(digits(n, 2) + " " + unit)
}

// digits writes so many significant digits without an exponent.
func digits(v float64, n int) string {
	if v == 0 || math.Abs(v) < 1e-9 {
		return "0"
	}
	after := n - 1 - int(math.Floor(math.Log10(math.Abs(v))))
	return strconv.FormatFloat(v, 'f', max(0, after), 64)
}

func ms(t float64) string { return quantity.Format(t, quantity.Time) }
func hz(f float64) string { return quantity.Short(f, quantity.Frequency) }

func estimate(e identify.Estimate, dim quantity.Dim) string {
	return quantity.Format(e.Value, dim) + " ± " + spread(e.Sigma, dim)
}

// WriteText writes the report for people: what the actuator is, in one sentence,
// then both fits, the answer against frequency and amplitude, and what to beware
// of.
func (r *Report) WriteText(w io.Writer) error {
	var b strings.Builder
	r.head(&b)
	r.fits(&b)
	r.response(&b)
	r.groups(&b)
	for _, text := range r.Warnings {
		fmt.Fprintf(&b, "\nWarning: %s\n", text)
	}
	if err := r.Usable(); err != nil {
		fmt.Fprintf(&b, "\nNo block to paste: %v.\n", err)
	} else {
		fmt.Fprintf(&b, "\nTo paste into the scenario:\n\n%s", r.Block())
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (r *Report) head(b *strings.Builder) {
	pace := ""
	if r.Slowdown != 1 {
		pace = ", slowed down " + quantity.Short(r.Slowdown, quantity.None) + " times"
	}
	fmt.Fprintf(b, "%s, channel %s: %s%s, %s samples a second, %d samples\n", accept.Printable(r.Log), accept.Printable(r.Channel),
		quantity.Short(float64(r.Samples-1)*r.Tick, quantity.Time), pace, quantity.Short(1/r.Tick, quantity.None), r.Samples)
	for _, n := range r.Notes {
		fmt.Fprintf(b, "note: %s\n", accept.Printable(n))
	}
	f := r.Best()
	where := fmt.Sprintf("between %s and %s", hz(r.Band[0]), hz(r.Band[1]))
	fmt.Fprintf(b, "\nThe actuator answers %s late %s, with a gain of %s. ", estimate(f.Phase, quantity.Time), where, digits(f.Gain.Value, 4))
	switch {
	case f.Kind == "second-order":
		fmt.Fprintf(b, "A second-order lag explains that better than a first-order one.\n")
	case r.Evidence > -2:
		fmt.Fprintf(b, "A first-order lag explains that about as well as a second-order one.\n")
	default:
		fmt.Fprintf(b, "A first-order lag explains that; a second-order one adds nothing.\n")
	}
}

func table(b *strings.Builder, rows [][]string) { accept.WriteTable(b, rows, nil) }

func (r *Report) fits(b *strings.Builder) {
	l, s := r.LagDelay, r.Second
	kinds := []string{"", "lag-delay", "second-order"}
	if r.Best() == l {
		kinds[1] += " (taken)"
	} else {
		kinds[2] += " (taken)"
	}
	apart := func(e identify.Estimate, dim quantity.Dim) string {
		if s.Vague {
			return "not determined"
		}
		return estimate(e, dim)
	}
	row := func(name string, of func(*identify.Fit) identify.Estimate, dim quantity.Dim) []string {
		return []string{name, estimate(of(l), dim), estimate(of(s), dim)}
	}
	rows := [][]string{kinds,
		row("gain", func(f *identify.Fit) identify.Estimate { return f.Gain }, quantity.None),
		{"delay", estimate(l.Delay, quantity.Time), apart(s.Delay, quantity.Time)},
		{"lag", estimate(l.Lag, quantity.Time), apart(s.Lag, quantity.Time)},
		{"frequency", "", apart(s.Frequency, quantity.Frequency)},
		{"damping ratio", "", apart(s.Damping, quantity.None)},
		row("delay and lag", func(f *identify.Fit) identify.Estimate { return f.Total }, quantity.Time),
		row("late in the band", func(f *identify.Fit) identify.Estimate { return f.Phase }, quantity.Time),
		row("offset", func(f *identify.Fit) identify.Estimate { return f.Offset }, quantity.Length),
		{"not explained", accept.Share(figure(l.NRMSE)), accept.Share(figure(s.NRMSE))},
	}
	table(b, rows)
}

// shown is how many frequencies the text lists.
const shown = 9

func (r *Report) response(b *strings.Builder) {
	rows := [][]string{{"frequency", "gain", "delay", "coherence"}}
	last := -1
	n := len(r.Response)
	for i := range shown {
		// Evenly on a logarithmic axis, and not more than there are.
		k := int(math.Round(float64(n-1) * float64(i) / (shown - 1)))
		if n > shown {
			want := r.Band[0] * math.Pow(r.Band[1]/r.Band[0], float64(i)/(shown-1))
			for k = max(last+1, 0); k+1 < n && r.Response[k].Hz < want*(1-1e-9); k++ {
			}
		}
		if k <= last || k >= n {
			continue
		}
		last = k
		f := r.Response[k]
		rows = append(rows, []string{quantity.Format(f.Hz, quantity.Frequency),
			fmt.Sprintf("%.4f ± %s", f.Gain, spread(f.GainSigma, quantity.None)),
			ms(f.Delay) + " ± " + spread(f.DelaySigma, quantity.Time), fmt.Sprintf("%.4f", f.Coherence)})
	}
	table(b, rows)
	fmt.Fprintf(b, "  (%d frequencies in the band, of %d segments; coherence at least %.4f)\n", n, r.Averages, r.CoherenceMin)
}

func (r *Report) groups(b *strings.Builder) {
	if len(r.Groups) == 0 {
		return
	}
	rows := [][]string{{"amplitude", "delay", "gain"}}
	for _, g := range r.Groups {
		rows = append(rows, []string{quantity.Format(g.Amplitude, quantity.Length),
			estimate(identify.Estimate{Value: g.Delay, Sigma: g.DelaySigma}, quantity.Time),
			fmt.Sprintf("%.4f ± %s", g.Gain, spread(g.GainSigma, quantity.None))})
	}
	table(b, rows)
}
