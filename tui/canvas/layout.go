package canvas

import "strconv"

// The smallest regions that keep a part of the furniture. Below, the room goes to
// the dots: the legend leaves first, then the labels, then the axes.
const (
	headHeight, headWidth   = 7, 24
	labelHeight, labelWidth = 5, 16
	axisHeight, axisWidth   = 4, 8
	leastColumns            = 8 // of dots beside labels
)

// layout divides the region and marks both axes.
//
//	mm  ⠒⠒⠒ target          head: unit of y, legend
//	10┤                     area, between the labels of y
//	 0┤                     and the edge
//	  └─┬─────┬────
//	    0     1   s         foot: labels and unit of x
func (p *Plot) layout() {
	w, h := p.region.Size()
	p.head = len(p.Legend) > 0 && h >= headHeight && w >= headWidth
	axes := h >= axisHeight && w >= axisWidth
	labels := h >= labelHeight && w >= labelWidth

	top, below, left := 0, 0, 0
	if p.head {
		top = 1
	}
	if axes {
		below, left = 1, 1
	}
	if labels {
		below = 2
	}
	rows := h - top - below
	p.markY(rows, labels)
	if labels {
		if gutter := p.gutter() + 1; w-gutter >= leastColumns {
			left = gutter
		} else {
			below, rows, labels = 1, rows+1, false
			p.markY(rows, false)
		}
	}
	p.markX(w-left, labels)
	p.area = p.region.Sub(left, top, w-left, rows)
}

// gutter is the columns that the labels of y need. Without a legend the unit
// stands behind the topmost label.
func (p *Plot) gutter() int {
	unit := Width(p.Y.Unit)
	if p.head {
		return max(p.y.widest, unit)
	}
	n := p.y.widest
	if i := p.y.topmost(); i >= 0 && unit > 0 {
		n = max(n, Width(p.y.labels[i])+1+unit)
	}
	return n
}

// topmost is the index of the label nearest the top, −1 without labels.
func (a *axis) topmost() int {
	switch {
	case len(a.labels) == 0:
		return -1
	case a.hi < a.lo:
		return 0
	}
	return len(a.labels) - 1
}

// markY takes ticks three rows apart, closer in low plots.
func (p *Plot) markY(rows int, labels bool) {
	apart := max(1.34, min(float64(rows)/4, 3))
	p.y.mark(&p.Y, apart/float64(max(rows, 1)), labels)
}

// markX takes the finest ticks whose labels keep two blanks between them, at
// least eight columns apart.
func (p *Plot) markX(columns int, labels bool) {
	n := float64(max(columns, 1))
	apart := 8.0
	for range 4 { // wider steps may have wider labels, but not for ever
		p.x.mark(&p.X, apart/n, labels)
		got := n * p.x.step.times(1) / p.x.span()
		need := float64(p.x.widest + 2)
		if need <= got || need <= apart {
			return
		}
		apart = need
	}
}

// drawAxes writes rules, ticks, labels and units around the area.
func (p *Plot) drawAxes() {
	left := p.area.x - p.region.x - 1 // column of the y axis
	foot := p.area.y - p.region.y + p.area.h
	_, h := p.region.Size()
	if left < 0 || foot >= h {
		return
	}
	r := p.region
	for y := range p.area.h {
		r.Set(left, foot-1-y, Cell{'│', Frame})
	}
	r.Set(left, foot, Cell{'└', Frame})
	for x := range p.area.w {
		r.Set(left+1+x, foot, Cell{'─', Frame})
	}
	top := foot - p.area.h
	last := -1
	for i, v := range p.y.ticks {
		row := top + between(nearest(p.y.at(v))/4, 0, p.area.h-1)
		r.Set(left, row, Cell{'┤', Frame})
		if i < len(p.y.labels) && left > 0 && row != last {
			p.labelY(i, left, row)
			last = row
		}
	}
	if p.head {
		r.TextRight(left, 0, Dim, p.Y.Unit)
	}
	for _, v := range p.x.ticks {
		r.Set(left+1+p.column(v), foot, Cell{'┬', Frame})
	}
	if foot+1 < h {
		p.labelsX(left+1, foot+1)
	}
}

// labelY writes one label of y to the left of the axis. A label that is wider
// than planned is left out: half a number is a wrong number.
func (p *Plot) labelY(i, left, row int) {
	text, unit := p.y.labels[i], 0
	if !p.head && i == p.y.topmost() && p.Y.Unit != "" {
		unit = Width(p.Y.Unit) + 1
	}
	if Width(text)+unit > left {
		return
	}
	p.region.TextRight(left-unit, row, Plain, text)
	if unit > 0 {
		p.region.TextRight(left, row, Dim, p.Y.Unit)
	}
}

// labelsX writes the labels of x under their ticks, and the unit at the right.
func (p *Plot) labelsX(left, row int) {
	w, _ := p.region.Size()
	end := w
	if unit := Width(p.X.Unit); unit > 0 {
		end = w - unit - 1
		p.region.TextRight(w, row, Dim, p.X.Unit)
	}
	taken, backwards := 0, p.x.hi < p.x.lo
	for i := range p.x.labels {
		if backwards {
			i = len(p.x.labels) - 1 - i
		}
		n := Width(p.x.labels[i])
		from := left + p.column(p.x.ticks[i]) - n/2
		if from < taken || from+n > end || n == 0 {
			continue
		}
		p.region.Text(from, row, Plain, p.x.labels[i])
		taken = from + n + 1
	}
}

// column is the column of the area where a value of x lies.
func (p *Plot) column(v float64) int {
	return between(nearest(p.x.at(v))/2, 0, max(p.area.w-1, 0))
}

// drawLegend writes a sample of every line and its name into the head. When
// there is little room the samples get shorter, then the longest names; series
// that cannot be named are counted.
func (p *Plot) drawLegend() {
	head := p.region.Sub(p.area.x-p.region.x+1, 0, p.area.w-1, 1)
	sample, gap, cut := 4, 2, 99
	if legendWidth(p.Legend, sample, gap, cut) > head.w {
		sample, gap = 3, 1
	}
	for cut > 2 && legendWidth(p.Legend, sample, gap, cut) > head.w {
		cut--
	}
	x := 0
	for i, k := range p.Legend {
		left := len(p.Legend) - i
		room := head.w - x
		if left > 1 {
			room -= 3 // for "+9"
		}
		name := min(Width(k.Name), cut)
		if room < sample+1+name {
			head.Text(x, 0, Dim, "+"+strconv.Itoa(left))
			return
		}
		drawSample(head.Sub(x, 0, sample, 1), k)
		head.Sub(x+sample+1, 0, name, 1).write(0, 0, k.Ink, k.Name, name)
		x += sample + 1 + name + gap
	}
}

// legendWidth is the columns of a legend with names of at most cut columns.
func legendWidth(keys []Key, sample, gap, cut int) int {
	n := -gap
	for _, k := range keys {
		n += sample + 1 + min(Width(k.Name), cut) + gap
	}
	return n
}

// drawSample draws a flat line in the second row of dots, from where in the
// pattern three cells show what it is.
func drawSample(r Region, k Key) {
	for x := range r.w {
		bits := uint8(0)
		for side := range 2 {
			if k.Style.on(3 + 2*x + side) {
				bits |= brailleBit[1][side]
			}
		}
		if bits != 0 {
			r.Set(x, 0, Cell{brailleBlank + rune(bits), k.Ink})
		}
	}
}
