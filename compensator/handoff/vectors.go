package handoff

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"

	"antelag/compensator"
)

// call is one of the functions that the C offers.
type call int

const (
	initCall  call = iota // at rest at 0
	resetCall             // target and measured were x and y for ever
	primeCall             // the input, and what another method commanded
	stepCall
)

var callWords = [...]string{"init", "reset", "prime", "step"} // by call

// row is one call with what goes in, and the command that stands after it.
type row struct {
	call call
	in   compensator.Input
	u    float64
}

// peaks are the largest magnitudes in some rows.
type peaks struct{ x, v, a, u float64 }

func peaksOf(rows []row) (p peaks) {
	raise := func(peak *float64, v float64) { *peak = max(*peak, math.Abs(v)) }
	for i := range rows {
		raise(&p.x, rows[i].in.X)
		raise(&p.v, rows[i].in.V)
		raise(&p.a, rows[i].in.A)
		raise(&p.u, rows[i].u)
	}
	return p
}

func steps(rows []row) int {
	n := 0
	for i := range rows {
		if rows[i].call == stepCall {
			n++
		}
	}
	return n
}

// The vectors are three tests one after another: a structure's motion from rest
// at zero; a sine, which tells least squares little, about rest elsewhere, with
// the actuator rather early; and the first again, taken over in its middle from
// another method. Each is as long
// as three times the method's memory, or this time, s, whichever is longer, but
// within these bounds, ticks.
const fewestTicks, mostTicks, testTime = 1500, 6000, 2.0

// amplitude is that of the target where no limit stands against it, m.
const amplitude = 20e-3

// headroom is how much of a limit the vectors take up at most, so that no
// rounding trips the guard.
const headroom = 0.9

// vectors makes the test vectors: a rich input that the guard lets through, and
// what the Go code commands for it. Where the limits are narrow, the input is
// made smaller.
func (u *unit) vectors(seed uint64) ([]row, error) {
	comp, err := u.build()
	if err != nil {
		return nil, err
	}
	other, err := u.build()
	if err != nil {
		return nil, err
	}
	scale := 1.0
	for range 100 {
		g := newGenerator(u, seed, scale)
		worst := g.run(comp, other)
		if worst <= headroom {
			return g.rows, nil
		}
		if math.IsNaN(worst) || math.IsInf(worst, 0) {
			worst = 1e3
		}
		scale *= min(0.7, 0.8/worst)
	}
	return nil, fmt.Errorf("no input was found that stays within the limits of the channel: %v", u.Limits)
}

// testKind is one of the tests: where it rests, how far off the sensor then is,
// and whether it is a steady sine under an actuator that answers early, all the
// time alike, or a motion under one that does not know its own mind.
type testKind struct {
	rest, offset float64
	steady       bool
}

// generator makes one try at the vectors.
type generator struct {
	unit  *unit
	rng   *rand.Rand
	scale float64
	n     int     // ticks of each test
	base  float64 // frequency of the slowest part, Hz
	late  float64 // largest lateness of the measured displacement, s
	phase [4]float64
	test  testKind
	rows  []row
	worst float64 // largest part of a limit
	x, u  float64 // of the tick before
}

func newGenerator(u *unit, seed uint64, scale float64) *generator {
	g := &generator{unit: u, rng: rand.New(rand.NewPCG(seed, 0x616e74656c6167)), scale: scale}
	g.n = min(max(fewestTicks, 3*u.code.memory(), int(testTime/u.tick)), mostTicks)
	length := float64(g.n) * u.tick
	// A structure's motion, but some cycles in any case, and no fewer ticks a
	// cycle than a test has.
	g.base = min(max(0.7, 2/length), 1/(100*u.tick))
	g.late = 20e-3
	if u.Values.Has("delay") {
		g.late = max(g.late, 2*u.Values.Num("delay"))
	}
	for i := range g.phase {
		g.phase[i] = 2 * math.Pi * g.rng.Float64()
	}
	return g
}

// memory is the length of the longest member of the state, ticks.
func (c *code) memory() int {
	n := 0
	for _, m := range c.members {
		n = max(n, m.count)
	}
	return n
}

// float rounds to what float holds exactly, so that both builds are given the
// same input.
func float(v float64) float64 { return float64(float32(v)) }

// sines is the motion without its envelope, of amplitude about 1; s is time over
// the period of the slowest part.
func (g *generator) sines(s float64) float64 {
	if g.test.steady {
		return 0.6 * math.Sin(2*math.Pi*3*s+g.phase[0])
	}
	sum := 0.0
	for i, part := range [4]struct{ amplitude, frequency float64 }{{0.6, 1}, {0.25, 2.7}, {0.12, 4.4}, {0.03, 9}} {
		sum += part.amplitude * math.Sin(2*math.Pi*part.frequency*s+g.phase[i])
	}
	return sum
}

// envelope lets the motion begin and end at rest, and rest for a while within,
// unless it is steady; p is the part of the test that is over.
func (g *generator) envelope(p float64) float64 {
	smooth := func(from, to float64) float64 {
		s := min(max((p-from)/(to-from), 0), 1)
		return s * s * s * (10 - 15*s + 6*s*s)
	}
	e := smooth(0, 0.2) - smooth(0.85, 0.95)
	if !g.test.steady {
		e += smooth(0.55, 0.65) - smooth(0.4, 0.5)
	}
	return e
}

// target is the target at a time since the beginning of a test, ticks.
func (g *generator) target(at float64) float64 {
	return g.test.rest + g.scale*amplitude*g.envelope(at/float64(g.n))*g.sines(at*g.unit.tick*g.base)
}

// input is the input of tick k of a test: the structure's motion with the noise of an integration, and an actuator that answers
// sometimes early, sometimes late, sometimes weak.
func (g *generator) input(k int) compensator.Input {
	noise := func(size float64) float64 { return g.scale * size * g.rng.NormFloat64() }
	tick, at := g.unit.tick, float64(k)
	before, now, after := g.target(at), g.target(at+1), g.target(at+2)
	slow := 2 * math.Pi * at * tick * g.base
	lateness, gain := -0.4*g.late, 0.95
	if !g.test.steady {
		lateness = g.late * (0.5 + 0.6*math.Sin(0.37*slow))
		gain = 1 + 0.15*math.Sin(0.23*slow+1)
	}
	y := g.test.rest + g.test.offset + gain*(g.target(at-lateness/tick)-g.test.rest)
	force := min(g.unit.Limits.Force, 1e5)
	return compensator.Input{
		X: float(now + noise(1e-7)),
		V: float((after-before)/(2*tick) + noise(1e-6)),
		A: float((after-2*now+before)/(tick*tick) + noise(1e-5)),
		Y: float(y + noise(1e-5)),
		R: float(0.5 * force * math.Sin(slow+g.phase[0])),
	}
}

// run makes the rows and returns the largest part of a limit that they take up.
func (g *generator) run(comp, other compensator.Compensator) float64 {
	away := float(0.3 * g.scale * amplitude)
	g.test = testKind{}
	g.start(comp, initCall)
	g.steps(comp, 0)
	g.test = testKind{away, float(-0.02 * g.scale * amplitude), true}
	g.start(comp, resetCall)
	g.steps(comp, 0)
	// Taken over where the motion rests: a method that has learned and one that
	// has not do not command the same.
	const half = 0.54
	g.test = testKind{}
	g.start(comp, resetCall)
	other.Start(0, 0)
	from := int(half * float64(g.n))
	for k := range from {
		in := g.input(k)
		u := float(other.Command(in))
		comp.Prime(in, u)
		g.add(row{primeCall, in, u})
	}
	g.steps(comp, from)
	return g.worst
}

// start is what init and reset do: at rest, and commanded what keeps it there.
func (g *generator) start(comp compensator.Compensator, how call) {
	in := compensator.Input{X: g.test.rest, Y: float(g.test.rest + g.test.offset)}
	comp.Start(in.X, in.Y)
	u := comp.Command(in)
	comp.Start(in.X, in.Y)
	g.x, g.u = in.X, u
	g.add(row{how, in, u})
}

func (g *generator) steps(comp compensator.Compensator, from int) {
	for k := from; k < g.n; k++ {
		in := g.input(k)
		g.add(row{stepCall, in, comp.Command(in)})
	}
}

func (g *generator) add(r row) {
	g.worst = max(g.worst, g.unit.Limits.worst(g.unit.tick, g.x, g.u, &r.in, r.u))
	g.x, g.u = r.in.X, r.u
	g.rows = append(g.rows, r)
}

// vectorsHeader names the columns. u_m is given in a row of prime, and what is
// to come out in the others.
const vectorsHeader = "channel,call,x_m,v_m_s,a_m_s2,y_m,r_N,u_m\n"

// vectorsCSV writes the vectors of all channels, one after another.
func vectorsCSV(units []*unit) []byte {
	var b bytes.Buffer
	b.WriteString(vectorsHeader)
	for _, u := range units {
		for i := range u.rows {
			r := &u.rows[i]
			b.WriteString(u.ident + "," + callWords[r.call])
			for _, v := range []float64{r.in.X, r.in.V, r.in.A, r.in.Y, r.in.R, r.u} {
				b.WriteByte(',')
				b.Write(strconv.AppendFloat(b.AvailableBuffer(), v, 'g', -1, 64))
			}
			b.WriteByte('\n')
		}
	}
	return b.Bytes()
}
