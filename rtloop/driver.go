package rtloop

import "antelag/rtloop/excitation"

// driver turns a stream of samples into the Drive of each tick. A driven
// target needs its derivatives: they are the central differences of its
// samples, so the driver reads one sample ahead.
type driver struct {
	source excitation.Source
	step   float64 // model seconds between samples
	target bool
	was    float64 // sample at t_k
	now    float64 // sample at t_{k+1}, read ahead for a target
	buffer [blockTicks]float64
}

// first returns the sample at t = 0 and readies the stream.
func (d *driver) first(target bool) Drive {
	d.target = target
	d.source.Fill(d.buffer[:1])
	d.was = d.buffer[0]
	if target {
		d.source.Fill(d.buffer[:1])
		d.now = d.buffer[0]
	}
	return Drive{X: d.was}
}

// fill writes the drives of the next len(dst) ticks, at most blockTicks.
func (d *driver) fill(dst []Drive) {
	samples := d.buffer[:len(dst)]
	d.source.Fill(samples)
	if !d.target {
		for i, x := range samples {
			dst[i] = Drive{X: x}
		}
		return
	}
	for i, next := range samples {
		dst[i] = Drive{
			X: d.now,
			V: (next - d.was) / (2 * d.step),
			A: (next - 2*d.now + d.was) / (d.step * d.step),
		}
		d.was, d.now = d.now, next
	}
}
