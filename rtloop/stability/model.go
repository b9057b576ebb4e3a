package stability

import (
	"cmp"
	"errors"
	"math"
	"math/cmplx"
	"slices"

	"antelag/compensator"
	"antelag/rtloop"
)

// Model is a linear loop as its characteristic function. With
//
//	s_{k+1} = A s_k + Σ_j b_j r_j        the structure and its integrator
//	(x, v, a)_j = C_j s_k               what channel j is told to do
//	u_j = Σ_p (h^x_p x + h^v_p v + h^a_p a)_{k−p}   its compensator
//	r_j = T_j(z) u_j                    actuator, specimen and force sensor
//
// the loop once around is the matrix L_ij(z) = T_i·(h_i C_i)(zI − A)⁻¹b_j of the
// channels' forces, and
//
//	F(z) = det(zI − A)·Π_j det(zI − A_j)·det(I − L(z)),
//
// A_j the core of channel j, is zero at the poles of the loop. All blocks are found
// by disturbing the parts that run. A dead time costs a power of z, however long.
type Model struct {
	dt, tick  float64 // model and physical seconds
	structure *transfer
	forces    [][]complex128 // b_j, transformed
	channels  []channelBlock
	states    int // of all cores
	levels    int
	starts    []complex128
	angles    []float64 // where F may turn quickly
	longest   float64   // dead time of a channel, compensator included, ticks
}

// channelBlock is one channel.
type channelBlock struct {
	plant *plantBlock
	fir   [3]taps      // of x, v, a
	c     [3][]float64 // rows of x, v, a, transformed, in physical units
	gain  float64      // of the force
}

// tap is the weight of an input so many ticks ago.
type tap struct {
	ago    float64
	weight float64
}

type taps []tap

var errNotFinite = errors.New("a compensator's command does not end with its input")

// NewModel sets the model of a loop up that Linear has made. The loop is left at
// rest.
func NewModel(linear *rtloop.Loop) (*Model, error) {
	m := &Model{dt: linear.Step(), tick: linear.Period(), levels: linear.Structure().N()}
	rest := linear.State(nil)
	clear(rest)
	linear.SetState(rest)
	if err := m.setStructure(linear); err != nil {
		return nil, err
	}
	for j := range linear.Channels() {
		part := linear.Part(j)
		c := &m.channels[j]
		var err error
		if c.plant, err = newPlantBlock(part.Actuator, part.Specimen, part.Force); err != nil {
			return nil, err
		}
		if c.fir, err = response(part.Compensator); err != nil {
			return nil, err
		}
		m.states += c.plant.core.n
	}
	m.guess(linear)
	m.measure()
	return m, nil
}

// measure finds the longest dead time.
func (m *Model) measure() {
	m.longest = 0
	for j := range m.channels {
		ticks := 0.0
		for _, t := range m.channels[j].plant.terms {
			ticks = max(ticks, t.ticks)
		}
		oldest := 0.0
		for _, t := range m.channels[j].fir {
			if len(t) > 0 {
				oldest = max(oldest, t[len(t)-1].ago)
			}
		}
		m.longest = max(m.longest, ticks+oldest)
	}
}

// setStructure disturbs what the integrator carries.
func (m *Model) setStructure(linear *rtloop.Loop) error {
	in, s := linear.Integrator(), linear.Structure()
	levels, extra := s.N(), len(in.Memory())
	n := 3*levels + extra
	state, load := make([]float64, n), make([]float64, levels)
	a := make([]float64, n*n)
	rows := make([][3][]float64, linear.Channels())
	for j := range rows {
		rows[j] = [3][]float64{make([]float64, n), make([]float64, n), make([]float64, n)}
	}
	velocity, acceleration := linear.Rates()
	set := func(i int) {
		clear(state)
		if i >= 0 {
			state[i] = 1
		}
		in.SetState(state[:levels], state[levels:2*levels], state[2*levels:3*levels])
		copy(in.Memory(), state[3*levels:])
	}
	read := func(each func(i int, v float64)) {
		for i := range levels {
			each(i, in.X()[i])
			each(levels+i, in.V()[i])
			each(2*levels+i, in.A()[i])
		}
		for i, v := range in.Memory() {
			each(3*levels+i, v)
		}
	}
	for k := range n {
		set(k)
		in.Predict()
		for j := range rows {
			rows[j][0][k] = s.Project(in.X(), j)
			rows[j][1][k] = s.Project(in.V(), j) * velocity
			rows[j][2][k] = s.Project(in.A(), j) * acceleration
		}
		clear(load)
		in.Correct(load)
		read(func(i int, v float64) { a[i*n+k] = v })
	}
	var err error
	if m.structure, err = newTransfer(n, a); err != nil {
		return err
	}
	m.states += n
	for j := range rows {
		set(-1)
		in.Predict()
		clear(load)
		s.AddForce(load, j, 1)
		in.Correct(load)
		b := make([]float64, n)
		read(func(i int, v float64) { b[i] = v })
		m.forces = append(m.forces, complexes(m.structure.inward(b)))
		c := channelBlock{gain: 1}
		for i := range c.c {
			c.c[i] = m.structure.outward(rows[j][i])
		}
		m.channels = append(m.channels, c)
	}
	set(-1)
	return nil
}

// response is what a compensator makes of one tick of displacement, velocity and
// acceleration.
func response(c compensator.Compensator) (out [3]taps, err error) {
	ticks := 1
	c.Memory(func(*float64) { ticks++ })
	for i := range out {
		forget(c)
		for k := range ticks + 1 {
			var in compensator.Input
			if k == 0 {
				*[...]*float64{&in.X, &in.V, &in.A}[i] = small
			}
			if u := c.Command(in); u != 0 {
				if k == ticks {
					return out, errNotFinite
				}
				out[i] = append(out[i], tap{float64(k), u / small})
			}
		}
	}
	forget(c)
	return out, nil
}

// forget is Start of a compensator that does not learn, without its whole history,
// most of which no command is made of.
func forget(c compensator.Compensator) { c.Memory(func(v *float64) { *v = 0 }) }

func complexes(v []float64) []complex128 {
	out := make([]complex128, len(v))
	for i, x := range v {
		out[i] = complex(x, 0)
	}
	return out
}

// guess says where the poles of the structure with perfect actuators are, from
// which those of the loop may have come.
func (m *Model) guess(linear *rtloop.Loop) {
	s := linear.Structure()
	for i, w := range s.Frequencies() {
		shape := make([]float64, s.N())
		for k := range shape {
			shape[k] = s.Shapes().At(k, i)
		}
		zeta := s.VCV(shape) / (2 * w) // φᵀMφ = 1
		pole := complex(-zeta*w, w*math.Sqrt(max(0, 1-zeta*zeta)))
		if zeta >= 1 {
			pole = complex(-w*(zeta-math.Sqrt(zeta*zeta-1)), 0)
		}
		z := cmplx.Exp(pole * complex(m.dt, 0))
		m.starts = append(m.starts, z)
		m.angles = append(m.angles, math.Abs(cmplx.Phase(z)))
	}
	slices.Sort(m.angles)
}

// sum is Σ_p weight_p·z^−p, with lz = log z and w = 1/z.
func (t taps) sum(lz, w complex128) complex128 {
	var sum complex128
	power, at := complex(1, 0), 0.0
	for i := range t {
		switch gap := t[i].ago - at; gap {
		case 0:
		case 1:
			power *= w
		case 2:
			power *= w * w
		default:
			power = cmplx.Exp(-lz * complex(t[i].ago, 0))
		}
		at = t[i].ago
		sum += complex(t[i].weight, 0) * power
	}
	return sum
}

func sortTerms(terms []delayed) {
	slices.SortFunc(terms, func(a, b delayed) int { return cmp.Compare(a.ticks, b.ticks) })
}
