package stability

import (
	"errors"
	"math"
	"math/cmplx"
	"slices"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/rtloop/substructure"
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

// setStructure disturbs what the integrator carries: displacements, velocities,
// accelerations, and its memory.
func (m *Model) setStructure(linear *rtloop.Loop) error {
	st := &stepper{in: linear.Integrator(), s: linear.Structure()}
	st.load = make([]float64, m.levels)
	n := 3*m.levels + len(st.in.Memory())
	st.state = make([]float64, n)
	velocity, acceleration := linear.Rates()
	rows := make([][3][]float64, linear.Channels())
	for j := range rows {
		rows[j] = [3][]float64{make([]float64, n), make([]float64, n), make([]float64, n)}
	}
	a := make([]float64, n*n)
	for k := range n {
		for i, v := range st.step(k, -1) {
			a[i*n+k] = v
		}
		for j := range rows {
			rows[j][0][k], rows[j][1][k], rows[j][2][k] = st.target(j, velocity, acceleration)
		}
	}
	var err error
	if m.structure, err = newTransfer(n, a); err != nil {
		return err
	}
	m.states += n
	for j := range rows {
		m.forces = append(m.forces, complexes(m.structure.inward(st.step(-1, j))))
		c := channelBlock{gain: 1}
		for i := range c.c {
			c.c[i] = m.structure.outward(rows[j][i])
		}
		m.channels = append(m.channels, c)
	}
	st.set(-1)
	return nil
}

// stepper lets an integrator do single steps.
type stepper struct {
	in          substructure.Integrator
	s           *substructure.Structure
	state, load []float64
	aimed       [3][]float64 // displacements, velocities, accelerations after Predict
}

// set puts the integrator at rest, but for value k, which is 1; −1: none.
func (st *stepper) set(k int) {
	n := len(st.load)
	clear(st.state)
	if k >= 0 {
		st.state[k] = 1
	}
	st.in.SetState(st.state[:n], st.state[n:2*n], st.state[2*n:3*n])
	copy(st.in.Memory(), st.state[3*n:])
}

// step does one from value k, under a unit of force of a channel; −1: none.
func (st *stepper) step(k, channel int) []float64 {
	st.set(k)
	st.in.Predict()
	st.aimed = [3][]float64{slices.Clone(st.in.X()), slices.Clone(st.in.V()), slices.Clone(st.in.A())}
	clear(st.load)
	if channel >= 0 {
		st.s.AddForce(st.load, channel, 1)
	}
	st.in.Correct(st.load)
	return slices.Concat(st.in.X(), st.in.V(), st.in.A(), st.in.Memory())
}

// target is what a channel was told in the last step, in physical units.
func (st *stepper) target(channel int, velocity, acceleration float64) (x, v, a float64) {
	return st.s.Project(st.aimed[0], channel), st.s.Project(st.aimed[1], channel) * velocity, st.s.Project(st.aimed[2], channel) * acceleration
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
