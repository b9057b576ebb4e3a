package pace

import (
	"math"
	"time"
)

// margin is how long before a deadline the sleep is meant to end:
//
//	margin = m + 4·v,  m += (o − m)/64,  v += (|o − m| − v)/16
//
// with o the time by which the last sleep overslept, m its running mean and v
// its running mean deviation, ns (the estimator of Jacobson, "Congestion
// avoidance and control", 1988, for retransmission timers, with longer
// memory). It is kept between 5 µs and the lesser of 200 µs and a quarter of
// the period: where sleeps end later than that, spinning longer would waste a
// processor without catching the worst of them.
type margin struct {
	mean, deviation float64 // ns
	least, most     float64 // ns
}

func (m *margin) limit(period time.Duration) {
	m.most = min(200e3, float64(period)/4)
	m.least = min(5e3, m.most)
}

func (m *margin) length() time.Duration {
	return time.Duration(max(m.least, min(m.most, m.mean+4*m.deviation)))
}

func (m *margin) learn(overslept time.Duration) {
	// One sleep in which the thread was kept off the processor for long says
	// nothing about the timer.
	o := max(0, min(float64(overslept), 2*m.most))
	d := o - m.mean
	m.mean += d / 64
	m.deviation += (math.Abs(d) - m.deviation) / 16
}
