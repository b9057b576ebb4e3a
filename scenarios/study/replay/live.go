package replay

// What playing a log live needs of a replay.

// Slowdown returns the physical seconds that a second of the log took.
func (p *Replay) Slowdown() float64 { return p.slowdown }

// Words says what the moment is about: "delay 0.181 ms early".
func (m *Moment) Words() string {
	w := said[m.Figure]
	return w.name + " " + w.text(m.Value)
}
