package tui

// playViews is how many views a log has where the screen has no room for all.
const playViews = 2

var playViewNames = [playViews]string{"tracking", "energy and events"}

// allPlayed reports whether a screen has room for all panels of a log.
func allPlayed(w, h int) bool { return w >= 110 && h >= 36 }

// recordRows is the height of the figures of a log: a title and six rows.
const recordRows = 7

// playLayout places the panels of a log that is played.
func playLayout(w, h int, v View) []place {
	out, body := headAndFoot(w, h)
	c := body.columns(-8, -5)
	switch {
	case allPlayed(w, h):
		left, right := c[0].rows(-12, -8, -9, -6), c[1].rows(-14, recordRows, -9)
		return append(out,
			place{panelTrace, left[0]}, place{panelError, left[1]}, place{panelDelay, left[2]}, place{panelEvents, left[3]},
			place{panelSubspace, right[0]}, place{panelRecord, right[1]}, place{panelEnergy, right[2]})
	case v == ViewTracking:
		left, right := c[0].rows(-3, -2), c[1].rows(-1, recordRows)
		return append(out,
			place{panelTrace, left[0]}, place{panelError, left[1]},
			place{panelSubspace, right[0]}, place{panelRecord, right[1]})
	}
	left, right := c[0].rows(-1, -1), c[1].rows(-1, recordRows)
	return append(out,
		place{panelDelay, left[0]}, place{panelEvents, left[1]},
		place{panelEnergy, right[0]}, place{panelRecord, right[1]})
}
