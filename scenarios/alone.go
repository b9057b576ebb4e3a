package scenarios

import "strconv"

// Alone returns the scenario with one lane only: that lane's compensators are
// the configured ones, and there are no others. It is how a lane is judged by
// itself, and written back as a scenario of its own.
func (s *Scenario) Alone(lane string) (*Scenario, error) {
	if err := s.CheckLane(lane); err != nil {
		return nil, err
	}
	doc := s.doc.clone()
	for i := range s.Lanes {
		if s.Lanes[i].Name == lane {
			doc.configure(i, s)
		}
	}
	delete(doc.tree, "lane")
	return read(doc, s.dir)
}

// Compensators returns the compensator of every channel in a lane, in the order
// of the channels.
func (s *Scenario) Compensators(lane string) ([]Part, error) {
	if err := s.CheckLane(lane); err != nil {
		return nil, err
	}
	out := make([]Part, len(s.Channels))
	for j := range s.Channels {
		out[j] = s.Channels[j].Compensator
	}
	for i := range s.Lanes {
		for j := range s.Channels {
			if s.Lanes[i].Name == lane && (s.Lanes[i].Channel == "" || s.Lanes[i].Channel == s.Channels[j].Name) {
				out[j] = s.Lanes[i].Compensator
			}
		}
	}
	return out, nil
}

// configure makes the compensator of lane i the configured one of the channels
// that it is for.
func (d *document) configure(i int, s *Scenario) {
	lanes, _ := d.tree["lane"].([]any)
	lane, _ := lanes[i].(map[string]any)
	channels, _ := d.tree["channel"].([]any)
	for j := range s.Channels {
		if s.Lanes[i].Channel != "" && s.Lanes[i].Channel != s.Channels[j].Name {
			continue
		}
		if c, ok := channels[j].(map[string]any); ok {
			c["compensator"] = cloneTree(lane["compensator"])
			d.where["channel["+strconv.Itoa(j)+"].compensator"] = d.where["lane["+strconv.Itoa(i)+"].compensator"]
		}
	}
}

// WithLane returns the scenario with one more lane, a copy of the compensators
// of an existing one under a new name. A lane holds one compensator for one
// channel or for all; the copy of a configured lane whose channels differ takes
// that of the given channel and applies it there alone.
func (s *Scenario) WithLane(name, from, channel string) (*Scenario, error) {
	if err := s.CheckLane(from); err != nil {
		return nil, err
	}
	doc := s.doc.clone()
	lanes, _ := doc.tree["lane"].([]any)
	table := map[string]any{"name": name}
	for i := range s.Lanes {
		if s.Lanes[i].Name == from {
			table = cloneTree(lanes[i]).(map[string]any)
			table["name"] = name
		}
	}
	if from == Configured {
		channels, _ := doc.tree["channel"].([]any)
		for j := range s.Channels {
			if c, ok := channels[j].(map[string]any); ok && s.Channels[j].Name == channel {
				table["compensator"] = cloneTree(c["compensator"])
			}
		}
		if len(s.Channels) > 1 {
			table["channel"] = channel
		}
	}
	doc.tree["lane"] = append(lanes, table)
	return read(doc, s.dir)
}

// Plain returns the scenario without [spread], so that settings may be changed
// without minding how far they are meant to spread.
func (s *Scenario) Plain() (*Scenario, error) {
	if len(s.Spread) == 0 {
		return s, nil
	}
	doc := s.doc.clone()
	delete(doc.tree, "spread")
	return read(doc, s.dir)
}
