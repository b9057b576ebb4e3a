package identify

import (
	"cmp"
	"math"
	"slices"
)

// Group is the stretches of a record that move about equally far. Where they also
// move at other frequencies, as in a sweep, what the fit does not explain there
// shows too.
type Group struct {
	Amplitude  float64 // of a sine of the same rms, m
	Speed      float64 // largest speed that the fit sees in them, m/s
	Delay      float64 // s: phase delay in the band, this group's
	Gain       float64
	DelaySigma float64
	GainSigma  float64
}

const (
	mostGroups    = 6
	fewestWindows = 3    // in a group
	varied        = 1.4  // largest amplitude over the smallest from which there are groups
	tooSmall      = 0.01 // of the largest amplitude: not looked at
)

// window is one stretch of about two periods: what the residual r is of the
// velocity v and displacement y of the fit, r ≈ −Δτ·v + (Δg/g)·y.
type window struct {
	amplitude, speed float64
	vv, vy, yy       float64
	rv, ry, rr       float64
	n                float64
}

// groups sorts stretches of the record by how far they move, and finds for each
// group by how much its delay and gain differ from those of the whole.
func (f *fitter) groups(fit *Fit) (groups []Group, slope Estimate) {
	windows := f.windows(fit)
	if len(windows) < 2*fewestWindows {
		return nil, slope
	}
	largest := 0.0
	for _, w := range windows {
		largest = max(largest, w.amplitude)
	}
	windows = slices.DeleteFunc(windows, func(w window) bool { return w.amplitude < tooSmall*largest })
	slices.SortFunc(windows, func(a, b window) int { return cmp.Compare(a.amplitude, b.amplitude) })
	count := min(mostGroups, len(windows)/fewestWindows)
	if count < 2 || windows[len(windows)-1].amplitude < varied*windows[0].amplitude {
		return nil, slope
	}
	for i := range count {
		var sum window
		for _, w := range windows[i*len(windows)/count : (i+1)*len(windows)/count] {
			sum.add(w)
		}
		if g, ok := sum.group(fit); ok {
			groups = append(groups, g)
		}
	}
	return groups, trend(windows)
}

func (f *fitter) windows(fit *Fit) []window {
	s, r := fit.evid.state, fit.evid.residual
	tick := f.rec.Tick
	period := 1 / max(f.spectrum.speed, 1/(float64(len(r))*tick))
	length := max(int(2*period/tick), 16)
	var out []window
	for from := 1; from+length < len(r); from += length {
		out = append(out, f.window(s, r, fit.evid.skip, from, from+length))
	}
	return out
}

func (f *fitter) window(s *state, r []float64, skip, from, to int) window {
	w := window{n: float64(to - from)}
	at := func(k int) float64 { return s.gain * s.y[k+skip] }
	var my, mv, mr float64
	for k := from; k < to; k++ {
		my += at(k) / w.n
		mv += (at(k+1) - at(k-1)) / (2 * f.rec.Tick) / w.n
		mr += r[k] / w.n
	}
	for k := from; k < to; k++ {
		v := (at(k+1) - at(k-1)) / (2 * f.rec.Tick)
		w.speed = max(w.speed, math.Abs(v))
		v -= mv
		y, e := at(k)-my, r[k]-mr
		w.vv += v * v
		w.vy += v * y
		w.yy += y * y
		w.rv += e * v
		w.ry += e * y
		w.rr += e * e
	}
	w.amplitude = math.Sqrt(2 * w.yy / w.n)
	return w
}

func (w *window) add(o window) {
	w.speed = max(w.speed, o.speed)
	w.vv += o.vv
	w.vy += o.vy
	w.yy += o.yy
	w.rv += o.rv
	w.ry += o.ry
	w.rr += o.rr
	w.n += o.n
}

// group solves the two by two equations.
func (w *window) group(fit *Fit) (Group, bool) {
	det := w.vv*w.yy - w.vy*w.vy
	if !(det > 1e-9*w.vv*w.yy) {
		return Group{}, false
	}
	late := -(w.yy*w.rv - w.vy*w.ry) / det
	more := (w.vv*w.ry - w.vy*w.rv) / det
	left := max(w.rr+late*w.rv-more*w.ry, 0) / w.n
	wide := fit.evid.wider * math.Sqrt(left/det)
	return Group{
		Amplitude: math.Sqrt(2 * w.yy / w.n), Speed: w.speed,
		Delay: fit.Phase.Value + late, DelaySigma: wide * math.Sqrt(w.yy),
		Gain: fit.Gain.Value * (1 + more), GainSigma: math.Abs(fit.Gain.Value) * wide * math.Sqrt(w.vv),
	}, true
}
