package scenarios

import (
	"fmt"
	"io"
	"maps"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"antelag/scenarios/kind"
)

// ChannelNames lists the channels in order.
func (s *Scenario) ChannelNames() []string { return channelNames(s.Channels) }

// CheckLane complains about a lane that the scenario does not have.
func (s *Scenario) CheckLane(name string) error {
	known := []string{Configured}
	for _, l := range s.Lanes {
		known = append(known, l.Name)
	}
	if !slices.Contains(known, name) {
		return &kind.UnknownError{What: "lane", Got: name, Known: known}
	}
	return nil
}

// Provenance writes where a log comes from: the whole resolved scenario, which
// reads as a scenario again, with version, lane and start.
func (s *Scenario) Provenance(version, lane string, start time.Time) string {
	return s.Resolved() + fmt.Sprintf("\n[provenance]\nversion = %s\nscenario = %s\nlane = %s\nstart = %s\n",
		Quote(version), Quote(s.Name), Quote(lane), start.UTC().Format(time.RFC3339))
}

// Resolved writes the whole resolved scenario so that it reads as the same
// scenario wherever the text is kept.
func (s *Scenario) Resolved() string {
	var out strings.Builder
	here := *s
	here.Excitation.Part.Values = maps.Clone(s.Excitation.Part.Values)
	if file, ok := here.Excitation.Part.Values["file"]; ok && !strings.HasPrefix(file.Text, embedded) {
		// The text may lie elsewhere than the scenario: a relative name would
		// lead nowhere from there.
		if full, err := filepath.Abs(s.path(file.Text)); err == nil {
			here.Excitation.Part.Values["file"] = kind.Text(full)
		}
	}
	here.WriteTo(&out) //nolint:errcheck // a Builder does not fail
	return out.String()
}

// OpenMotion opens the data file that the excitation is read from; nil where it
// is read from none.
func (s *Scenario) OpenMotion() (io.ReadCloser, error) {
	file, ok := s.Excitation.Part.Values["file"]
	if !ok {
		return nil, nil
	}
	f, err := s.open(file.Text)
	if err != nil {
		return nil, s.doc.errorAt("excitation.file", err)
	}
	return f, nil
}
