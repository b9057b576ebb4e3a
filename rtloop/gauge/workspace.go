package gauge

import (
	"sync"

	"gonum.org/v1/gonum/dsp/fourier"
)

// workspace is the memory and the transforms of one evaluation. Runs of a study
// are mostly of one length, so a used workspace goes back to a pool with its
// twiddle factors.
type workspace struct {
	x, y           []float64 // mean-removed; exact zeros for a constant
	movesX, movesY bool
	padded         []float64
	fx, fy         []complex128 // spectra of the record
	gx, gy         []complex128 // spectra of the padded record
	sums           []float64
	record, lagged *fourier.FFT
}

var workspaces = sync.Pool{New: func() any { return new(workspace) }}

func takeWorkspace() *workspace { return workspaces.Get().(*workspace) }
func (w *workspace) release()   { workspaces.Put(w) }

// sized returns s with length n, contents undefined.
func sized[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}

// planned returns a transform of length n, the one given if it is that.
func planned(f *fourier.FFT, n int) *fourier.FFT {
	switch {
	case f == nil:
		return fourier.NewFFT(n)
	case f.Len() != n:
		f.Reset(n)
	}
	return f
}

// load takes samples apart and removes the means.
func (w *workspace) load(samples []point) {
	n := len(samples)
	w.x, w.y = sized(w.x, n), sized(w.y, n)
	if n == 0 {
		w.movesX, w.movesY = false, false
		return
	}
	// About the first sample: a constant is then exactly zero.
	first := samples[0]
	x, y := w.x[:len(samples)], w.y[:len(samples)]
	var sx, sy float64
	w.movesX, w.movesY = false, false
	for k, s := range samples {
		u, v := s.x-first.x, s.y-first.y
		x[k], y[k] = u, v
		sx += u
		sy += v
		w.movesX = w.movesX || u != 0
		w.movesY = w.movesY || v != 0
	}
	mx, my := sx/float64(n), sy/float64(n)
	for k := range x {
		x[k] -= mx
		y[k] -= my
	}
}

// transform works out the spectra fx and fy of the record and returns how many
// samples, the last ones, went in.
func (w *workspace) transform() int {
	n := smooth(len(w.x))
	if n < 2 {
		w.fx, w.fy = w.fx[:0], w.fy[:0]
		return 0
	}
	w.record = planned(w.record, n)
	w.fx, w.fy = sized(w.fx, n/2+1), sized(w.fy, n/2+1)
	skip := len(w.x) - n
	w.record.Coefficients(w.fx, w.x[skip:])
	w.record.Coefficients(w.fy, w.y[skip:])
	return n
}

// correlate returns Σ x_k·y_{k+l·stride} over every stride-th k of the overlap,
// for l = −most … most; the slice is good until the next call. It goes by
// transforms, padded by just as many zeros as keep the ends apart.
func (w *workspace) correlate(stride, most int) []float64 {
	count := (len(w.x) + stride - 1) / stride
	n := smoothAbove(count + most)
	w.lagged = planned(w.lagged, n)
	w.padded = sized(w.padded, n)
	w.gx, w.gy = sized(w.gx, n/2+1), sized(w.gy, n/2+1)
	w.spectrum(w.gx, w.x, stride)
	w.spectrum(w.gy, w.y, stride)
	for i, a := range w.gx {
		b := w.gy[i]
		w.gy[i] = complex(real(a)*real(b)+imag(a)*imag(b), real(a)*imag(b)-imag(a)*real(b))
	}
	w.lagged.Sequence(w.padded, w.gy)

	w.sums = sized(w.sums, 2*most+1)
	scale := 1 / float64(n)
	for l := -most; l <= most; l++ {
		i := l
		if l < 0 {
			i += n
		}
		w.sums[l+most] = w.padded[i] * scale
	}
	return w.sums
}

func (w *workspace) spectrum(dst []complex128, s []float64, stride int) {
	k := 0
	for i := 0; i < len(s); i += stride {
		w.padded[k] = s[i]
		k++
	}
	clear(w.padded[k:])
	w.lagged.Coefficients(dst, w.padded)
}

// stride is how many ticks apart samples may lie so that the fastest motion of
// the target, all but a thousandth of its power, still has 16 of them a period.
// It is a power of two up to 16. The spectrum of x must be there.
func (w *workspace) stride() int {
	n := len(w.fx)
	var power float64
	for _, c := range w.fx[min(1, n):] {
		power += real(c)*real(c) + imag(c)*imag(c)
	}
	rest := power / 1000
	top := n - 1
	for ; top > 0 && rest >= 0; top-- {
		c := w.fx[top]
		rest -= real(c)*real(c) + imag(c)*imag(c)
	}
	stride := 16
	for stride > 1 && 16*stride*(top+1) > 2*(n-1) {
		stride /= 2
	}
	return stride
}

// smooth returns the largest length up to n without a prime factor above 13, the
// lengths for which a transform does not cost many times its neighbours.
func smooth(n int) int {
	for n > 1 && !isSmooth(n) {
		n--
	}
	return n
}

func isSmooth(n int) bool {
	if n < 1 {
		return false
	}
	for _, p := range [...]int{2, 3, 5, 7, 11, 13} {
		for n%p == 0 {
			n /= p
		}
	}
	return n == 1
}

// smoothAbove returns the smallest even 5-smooth length of at least n, for which
// the transform is fastest.
func smoothAbove(n int) int {
	best := 2
	for best < n {
		best *= 2
	}
	for five := 1; five < best; five *= 5 {
		for odd := five; odd < best; odd *= 3 {
			length := 2 * odd
			for length < n {
				length *= 2
			}
			best = min(best, length)
		}
	}
	return best
}
