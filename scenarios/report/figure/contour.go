package figure

import (
	"cmp"
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// contours draws the lines of equal value with their values. The lines are
// found by marching squares (Lorensen & Cline 1987, in the plane); the plot
// library's own come in an order that changes from run to run, are not
// labelled and do not know blanks.
func (c *cells) contours(canvas draw.Canvas, tx, ty func(float64) vg.Length, taken *notes) {
	levels := slices.Clone(c.Contours)
	if c.Below != "" {
		levels = append(levels, c.Edge)
	}
	slices.Sort(levels)
	var all []isoline
	for _, level := range slices.Compact(levels) {
		if !finite(level) {
			continue
		}
		line := isoline{level: level}
		for _, path := range c.lines(level) {
			points := make([]vg.Point, len(path))
			for i, p := range path {
				points[i] = vg.Point{X: tx(p[0]), Y: ty(p[1])}
			}
			line.pieces = append(line.pieces, canvas.ClipLinesXY(points)...)
		}
		style := draw.LineStyle{Color: ink, Width: 0.8}
		if c.Below != "" && level == c.Edge {
			style.Width = 2
		}
		canvas.StrokeLines(style, line.pieces...)
		all = append(all, line)
	}
	for i := range all {
		if places := all[i].places(all); len(places) > 0 {
			taken.place(canvas, contWords, number(all[i].level), false, places)
		}
	}
}

// isoline is a drawn contour.
type isoline struct {
	level  float64
	pieces [][]vg.Point
}

// places are where the value may stand, lower left corners, on the longest piece:
// the furthest from the other contours first.
func (l *isoline) places(all []isoline) []vg.Point {
	var longest []vg.Point
	for _, piece := range l.pieces {
		if length(piece) > length(longest) {
			longest = piece
		}
	}
	if len(longest) == 0 {
		return nil
	}
	type place struct {
		at   vg.Point
		room vg.Length
	}
	var places []place
	for share := 1; share < 20; share++ {
		p := place{at: along(longest, vg.Length(share)/20), room: vg.Length(math.Inf(1))}
		for _, other := range all {
			if other.level == l.level {
				continue
			}
			for _, piece := range other.pieces {
				for _, q := range piece {
					p.room = min(p.room, length([]vg.Point{p.at, q}))
				}
			}
		}
		places = append(places, p)
	}
	slices.SortStableFunc(places, func(a, b place) int { return cmp.Compare(b.room, a.room) })
	wide := contWords.Width(number(l.level))
	out := make([]vg.Point, len(places))
	for i, p := range places {
		out[i] = vg.Point{X: p.at.X - wide/2, Y: p.at.Y - contWords.Font.Size/3}
	}
	return out
}

func length(path []vg.Point) vg.Length {
	sum := vg.Length(0)
	for i := 1; i < len(path); i++ {
		sum += vg.Length(math.Hypot(float64(path[i].X-path[i-1].X), float64(path[i].Y-path[i-1].Y)))
	}
	return sum
}

// along is the point at a share of a path's length.
func along(path []vg.Point, share vg.Length) vg.Point {
	left := share * length(path)
	for i := 1; i < len(path); i++ {
		step := length(path[i-1 : i+1])
		if step >= left && step > 0 {
			t := left / step
			return vg.Point{X: path[i-1].X + t*(path[i].X-path[i-1].X), Y: path[i-1].Y + t*(path[i].Y-path[i-1].Y)}
		}
		left -= step
	}
	return path[len(path)-1]
}

// lines traces where the map crosses a level, in the map's coordinates. Squares
// with an undefined corner are left out.
func (m *Map) lines(level float64) [][][2]float64 {
	t := &tracer{Map: m, level: level}
	t.joints = make([][2]int, 2*len(m.X)*len(m.Y))
	for iy := range len(m.Y) - 1 {
		for ix := range len(m.X) - 1 {
			t.square(ix, iy)
		}
	}
	return t.join()
}

// tracer collects segments. The crossing of the side from point (ix, iy) to its
// right neighbour has the number 2·(iy·nx + ix), to its upper neighbour one more.
type tracer struct {
	*Map
	level    float64
	segments [][2]int
	joints   [][2]int // up to two segments that meet in a crossing, +1
}

func (t *tracer) square(ix, iy int) {
	z := [4]float64{t.Z[iy][ix], t.Z[iy][ix+1], t.Z[iy+1][ix+1], t.Z[iy+1][ix]} // counterclockwise
	middle, above := 0.0, [4]bool{}
	for i, v := range z {
		if math.IsNaN(v) {
			return
		}
		middle += v / 4
		above[i] = v >= t.level
	}
	nx := len(t.X)
	sides := [4]int{2 * (iy*nx + ix), 2*(iy*nx+ix+1) + 1, 2 * ((iy+1)*nx + ix), 2*(iy*nx+ix) + 1}
	var crossed []int
	for i := range 4 {
		if above[i] != above[(i+1)%4] {
			crossed = append(crossed, sides[i])
		}
	}
	switch len(crossed) {
	case 2:
		t.add(crossed[0], crossed[1])
	case 4: // a saddle: its middle decides which corners are joined
		if above[0] == (middle >= t.level) {
			t.add(crossed[0], crossed[1])
			t.add(crossed[2], crossed[3])
		} else {
			t.add(crossed[3], crossed[0])
			t.add(crossed[1], crossed[2])
		}
	}
}

func (t *tracer) add(a, b int) {
	t.segments = append(t.segments, [2]int{a, b})
	for _, side := range [2]int{a, b} {
		j := &t.joints[side]
		if j[0] == 0 {
			j[0] = len(t.segments)
		} else {
			j[1] = len(t.segments)
		}
	}
}

// join strings segments together.
func (t *tracer) join() [][][2]float64 {
	used := make([]bool, len(t.segments))
	walk := func(from int) []int { // sides reached by going on from a side
		var out []int
		for {
			next := -1
			for _, s := range t.joints[from] {
				if s > 0 && !used[s-1] {
					next = s - 1
					break
				}
			}
			if next < 0 {
				return out
			}
			used[next] = true
			s := t.segments[next]
			from = s[0] + s[1] - from
			out = append(out, from)
		}
	}
	var out [][][2]float64
	for i, s := range t.segments {
		if used[i] {
			continue
		}
		used[i] = true
		sides := walk(s[0])
		slices.Reverse(sides)
		sides = append(append(sides, s[0], s[1]), walk(s[1])...)
		path := make([][2]float64, len(sides))
		for k, side := range sides {
			path[k] = t.crossing(side)
		}
		out = append(out, path)
	}
	return out
}

// crossing interpolates on a side.
func (t *tracer) crossing(side int) [2]float64 {
	nx := len(t.X)
	ix, iy := side/2%nx, side/2/nx
	jx, jy := ix+1, iy
	if side%2 == 1 {
		jx, jy = ix, iy+1
	}
	a, b := t.Z[iy][ix], t.Z[jy][jx]
	share := 1.0
	if !math.IsInf(a, 0) {
		share = (t.level - a) / (b - a)
	}
	return [2]float64{t.X[ix] + share*(t.X[jx]-t.X[ix]), t.Y[iy] + share*(t.Y[jy]-t.Y[iy])}
}
