package canvas

// Part is how much of a split one piece gets.
type Part struct {
	cells int
	share float64
}

// Cells is a part of exactly n rows or columns, as long as there are so many.
func Cells(n int) Part { return Part{cells: max(n, 0)} }

// Share is a part in proportion to the other shares, of what the parts of fixed
// size leave.
func Share(s float64) Part {
	if !(s > 0) || s > 1e9 { // NaN and Inf too
		s = 0
	}
	return Part{share: s}
}

// SplitRows cuts the region from top to bottom. When there is too little, the
// first parts get theirs.
func (r Region) SplitRows(parts ...Part) []Region {
	out := make([]Region, len(parts))
	at := 0
	for i, n := range divide(r.h, parts) {
		out[i] = r.Sub(0, at, r.w, n)
		at += n
	}
	return out
}

// SplitColumns cuts the region from left to right, like SplitRows.
func (r Region) SplitColumns(parts ...Part) []Region {
	out := make([]Region, len(parts))
	at := 0
	for i, n := range divide(r.w, parts) {
		out[i] = r.Sub(at, 0, n, r.h)
		at += n
	}
	return out
}

// divide gives out total cells. Shares are rounded at their running sum, so they
// fill what is left to the last cell.
func divide(total int, parts []Part) []int {
	sizes := make([]int, len(parts))
	left, shares := total, 0.0
	for i, p := range parts {
		sizes[i] = min(p.cells, left)
		left -= sizes[i]
		shares += p.share
	}
	sum, given := 0.0, 0
	for i, p := range parts {
		if p.share > 0 {
			sum += p.share
			upTo := int(float64(left)*sum/shares + 0.5)
			sizes[i] = upTo - given
			given = upTo
		}
	}
	return sizes
}
