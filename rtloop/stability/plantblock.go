package stability

import (
	"cmp"
	"math"
	"slices"

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

// newPlantBlock disturbs what the parts carry by their own code. They are left at
// rest.
func newPlantBlock(a plant.Actuator, specimen *plant.Specimen, force *plant.Sensor) (*plantBlock, error) {
	p := &probe{actuator: a, specimen: specimen, force: force}
	p.memory(func(*float64) { p.n++ })
	p.before, p.after = make([]float64, p.n), make([]float64, p.n)
	p.findFollowers()
	columns := make([][]entry, p.n+1)
	p.columns(0, p.n, columns)
	clear(p.before)
	p.tick(small)
	columns[p.n] = p.column()
	p.memory(func(v *float64) { *v = 0 })
	return reduce(p.n, columns)
}

// probe lets one channel do single ticks.
type probe struct {
	actuator plant.Actuator
	specimen *plant.Specimen
	force    *plant.Sensor

	n             int
	before, after []float64
	r             float64
	follower      []int // who becomes what this value was, as in a dead time; −1: nobody
}

func (p *probe) memory(each func(*float64)) {
	p.actuator.Memory(each)
	p.specimen.Memory(each)
	p.force.Memory(each)
}

// tick does one from the state before, under a command.
func (p *probe) tick(u float64) {
	i := 0
	p.memory(func(v *float64) { *v = p.before[i]; i++ })
	p.actuator.Advance(u, p.specimen)
	p.r = p.force.Read(p.specimen.Force())
	i = 0
	p.memory(func(v *float64) { p.after[i] = *v; i++ })
}

// column is what the last tick made of a disturbance of size small; row n is the
// force.
func (p *probe) column() []entry {
	var column []entry
	for i, v := range p.after {
		if v != 0 {
			column = append(column, entry{i, v / small})
		}
	}
	if p.r != 0 {
		column = append(column, entry{p.n, p.r / small})
	}
	return column
}

// scatter is a disturbance unlike any other's.
func scatter(i int) float64 { return small * (1 + math.Abs(math.Sin(1+float64(i)*math.Sqrt2))) }

// findFollowers disturbs everything at once, each value differently: what then has
// a value that another had before has taken its place.
func (p *probe) findFollowers() {
	was := make(map[float64]int, p.n)
	for i := range p.before {
		p.before[i] = scatter(i)
		was[p.before[i]] = i
	}
	p.tick(0)
	p.follower = make([]int, p.n)
	for i := range p.follower {
		p.follower[i] = -1
	}
	for i, v := range p.after {
		if j, ok := was[v]; ok && j != i {
			p.follower[j] = i
		}
	}
}

// columns finds the columns of the values from low to high. Where all of them
// together do nothing but hand their values on, which is most of a long dead time,
// none of them does.
func (p *probe) columns(low, high int, columns [][]entry) {
	if low >= high {
		return
	}
	clear(p.before)
	if high-low == 1 {
		p.before[low] = small
		p.tick(0)
		columns[low] = p.column()
		return
	}
	for i := low; i < high; i++ {
		p.before[i] = scatter(i)
	}
	p.tick(0)
	if p.onlyHandedOn(low, high) {
		for i := low; i < high; i++ {
			columns[i] = []entry{{p.follower[i], 1}}
		}
		return
	}
	mid := low + (high-low)/2
	p.columns(low, mid, columns)
	p.columns(mid, high, columns)
}

func (p *probe) onlyHandedOn(low, high int) bool {
	if p.r != 0 {
		return false
	}
	for i := low; i < high; i++ {
		f := p.follower[i]
		if f < 0 || p.after[f] != p.before[i] {
			return false
		}
		p.after[f] = 0
	}
	for _, v := range p.after {
		if v != 0 {
			return false
		}
	}
	return true
}

// line says that a value is nothing but the command so many ticks ago, times gain.
type line struct {
	is    bool
	ticks float64
	gain  float64
}

// linesFrom follows the command, value n, along the rows that are fed by one value
// alone.
func linesFrom(n int, columns [][]entry) (lines []line, fed []bool) {
	feeds, from := make([]int, n+1), make([]int, n+1)
	for j, column := range columns {
		for _, e := range column {
			feeds[e.row]++
			from[e.row] = j
		}
	}
	lines, fed = make([]line, n+1), make([]bool, n+1)
	for i := range fed {
		fed[i] = feeds[i] > 0
	}
	lines[n] = line{is: true, gain: 1}
	for queue := []int{n}; len(queue) > 0; queue = queue[1:] {
		j := queue[0]
		for _, e := range columns[j] {
			if i := e.row; i < n && !lines[i].is && feeds[i] == 1 && from[i] == j {
				lines[i] = line{is: true, ticks: lines[j].ticks + 1, gain: lines[j].gain * e.value}
				queue = append(queue, i)
			}
		}
	}
	return lines, fed
}

// reduce parts the values into those that only pass the command on and the core.
// Column n is that of the command, row n that of the force.
func reduce(n int, columns [][]entry) (*plantBlock, error) {
	lines, fed := linesFrom(n, columns)
	place, m := make([]int, n+1), 0 // in the core; −1: none
	for i := range place {
		place[i] = -1
		if i < n && !lines[i].is && fed[i] { // a value that nothing keeps up is none
			place[i] = m
			m++
		}
	}
	a, c := make([]float64, m*m), make([]float64, m)
	terms := map[float64]*delayed{}
	for j, column := range columns {
		for _, e := range column {
			inCore, force := e.row < n && place[e.row] >= 0, e.row == n
			switch {
			case lines[j].is && (inCore || force):
				t := terms[lines[j].ticks]
				if t == nil {
					t = &delayed{ticks: lines[j].ticks, b: make([]float64, m)}
					terms[t.ticks] = t
				}
				if force {
					t.d += e.value * lines[j].gain
				} else {
					t.b[place[e.row]] += e.value * lines[j].gain
				}
			case place[j] >= 0 && inCore:
				a[place[e.row]*m+place[j]] = e.value
			case place[j] >= 0 && force:
				c[place[j]] = e.value
			}
		}
	}
	return newReduced(m, a, c, terms)
}

func newReduced(m int, a, c []float64, terms map[float64]*delayed) (*plantBlock, error) {
	core, err := newTransfer(m, a)
	if err != nil {
		return nil, err
	}
	p := &plantBlock{core: core, c: core.outward(c)}
	for _, t := range terms {
		t.b = core.inward(t.b)
		p.terms = append(p.terms, *t)
	}
	slices.SortFunc(p.terms, func(a, b delayed) int { return cmp.Compare(a.ticks, b.ticks) })
	return p, nil
}
