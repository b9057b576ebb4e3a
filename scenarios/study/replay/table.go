package replay

import (
	"bytes"
	"math"
	"strconv"

	"antelag/rtloop"
)

// CSV writes the windows of all channels as a table with one header row, SI; what
// is undefined is empty.
func (r *Report) CSV() []byte {
	var b bytes.Buffer
	b.WriteString("channel,start_s,end_s,quiet,nrmse,peak_error_m,delay_s,amplitude_ratio,fei_amplitude,fei_delay_s,fei_frequency_hz," +
		"tracking_indicator_m2,target_amplitude_m,ellipse_major_m,ellipse_minor_m,ellipse_tilt_rad,ellipse_amplitude_ratio,ellipse_delay_s,injected_J,energy_margin\n")
	for _, c := range r.Channels {
		for i := range c.Windows {
			w := &c.Windows[i]
			b.WriteString(quoted(c.Name))
			cells(&b, w.Start, w.End)
			b.WriteByte(',')
			b.WriteString(strconv.FormatBool(w.Quiet))
			cells(&b, w.NRMSE, w.PeakError, w.Delay, w.AmplitudeRatio, w.FEI.Amplitude, w.FEI.Delay, w.FEI.Frequency,
				w.TrackingIndicator, w.Amplitude, w.Subspace.Major, w.Subspace.Minor, w.Subspace.Tilt, w.Subspace.AmplitudeRatio, w.Subspace.Delay, w.Injected, w.Margin)
			b.WriteByte('\n')
		}
	}
	return b.Bytes()
}

func cells(b *bytes.Buffer, figures ...rtloop.Figure) {
	for _, f := range figures {
		b.WriteByte(',')
		if f.Defined() {
			b.WriteString(strconv.FormatFloat(float64(f), 'g', -1, 64))
		}
	}
}

// quoted puts a name in quotes where CSV wants them.
func quoted(name string) string {
	if bytes.ContainsAny([]byte(name), "\",\r\n") {
		return `"` + string(bytes.ReplaceAll([]byte(name), []byte(`"`), []byte(`""`))) + `"`
	}
	return name
}

// series takes one figure out of all windows, in a unit of which there are scale
// to one of SI, NaN where it is undefined.
func series(windows []Window, scale float64, of func(*Window) rtloop.Figure) []float64 {
	out := make([]float64, len(windows))
	for i := range windows {
		if out[i] = scale * float64(of(&windows[i])); math.IsInf(out[i], 0) {
			out[i] = math.NaN()
		}
	}
	return out
}
