package stability

import (
	"antelag/plant"
)

// plantBlock is one channel's actuator, specimen and force sensor for small
// motions: from the command to the force that goes back. Its dead time is kept as
// powers of 1/z beside a core of few states,
//
//	s⁺ = A s + Σ_i b_i·u_{k−p_i},   r = c s + Σ_i d_i·u_{k−p_i}.
type plantBlock struct {
	core  *transfer
	terms []delayed
	c     []float64 // transformed
}

// delayed is what one delayed command does.
type delayed struct {
	ticks float64
	b     []float64 // transformed
	d     float64
}

// newPlantBlock disturbs what the parts carry, value by value, by their own code.
// They are left at rest.
func newPlantBlock(a plant.Actuator, specimen *plant.Specimen, force *plant.Sensor) (*plantBlock, error) {
	memory := func(each func(*float64)) {
		a.Memory(each)
		specimen.Memory(each)
		force.Memory(each)
	}
	n := 0
	memory(func(*float64) { n++ })
	// tick returns what one tick makes of a disturbance of state j, or, with j = n,
	// of the command; row n is the force.
	tick := func(j int) []entry {
		i := 0
		memory(func(v *float64) {
			*v = 0
			if i == j {
				*v = small
			}
			i++
		})
		u := 0.0
		if j == n {
			u = small
		}
		a.Advance(u, specimen)
		r := force.Read(specimen.Force())
		var column []entry
		i = 0
		memory(func(v *float64) {
			if *v != 0 {
				column = append(column, entry{i, *v / small})
			}
			i++
		})
		if r != 0 {
			column = append(column, entry{n, r / small})
		}
		return column
	}
	columns := make([][]entry, n+1)
	for j := range columns {
		columns[j] = tick(j)
	}
	memory(func(v *float64) { *v = 0 })
	return reduce(n, columns)
}

// line says that a state is nothing but the command so many ticks ago, times gain.
type line struct {
	is    bool
	ticks float64
	gain  float64
}

// reduce parts the states into those that only pass the command on and the core.
// Column n is that of the command, row n that of the force.
func reduce(n int, columns [][]entry) (*plantBlock, error) {
	feeds := make([]int, n+1) // how many feed a row
	from, gain := make([]int, n+1), make([]float64, n+1)
	for j, column := range columns {
		for _, e := range column {
			feeds[e.row]++
			from[e.row], gain[e.row] = j, e.value
		}
	}
	// From the command along the rows that are fed by one value alone.
	lines := make([]line, n+1)
	lines[n] = line{is: true, gain: 1}
	for queue := []int{n}; len(queue) > 0; {
		j := queue[0]
		queue = queue[1:]
		for _, e := range columns[j] {
			if i := e.row; i < n && !lines[i].is && feeds[i] == 1 && from[i] == j {
				lines[i] = line{is: true, ticks: lines[j].ticks + 1, gain: lines[j].gain * gain[i]}
				queue = append(queue, i)
			}
		}
	}
	place := make([]int, n+1)
	m := 0
	for i := range n {
		place[i] = -1
		if !lines[i].is && (feeds[i] > 0) {
			place[i] = m
			m++
		}
	}
	a, c := make([]float64, m*m), make([]float64, m)
	raw := map[float64]*delayed{}
	for j, column := range columns {
		for _, e := range column {
			inCore := e.row < n && place[e.row] >= 0
			switch {
			case !lines[j].is && place[j] < 0: // a value that nothing keeps up
			case !lines[j].is && inCore:
				a[place[e.row]*m+place[j]] = e.value
			case !lines[j].is && e.row == n:
				c[place[j]] = e.value
			case lines[j].is && (inCore || e.row == n):
				t := raw[lines[j].ticks]
				if t == nil {
					t = &delayed{ticks: lines[j].ticks, b: make([]float64, m)}
					raw[t.ticks] = t
				}
				if e.row == n {
					t.d += e.value * lines[j].gain
				} else {
					t.b[place[e.row]] += e.value * lines[j].gain
				}
			}
		}
	}
	core, err := newTransfer(m, a)
	if err != nil {
		return nil, err
	}
	p := &plantBlock{core: core, c: core.outward(c)}
	for _, t := range raw {
		t.b = core.inward(t.b)
		p.terms = append(p.terms, *t)
	}
	sortTerms(p.terms)
	return p, nil
}
