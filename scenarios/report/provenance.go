package report

import (
	"crypto/sha256"
	"fmt"
	"io"
	"strings"
)

// provenance is where the report comes from: enough to do it again.
func (r *run) provenance() (Part, error) {
	var text strings.Builder
	r.s.WriteTo(&text) //nolint:errcheck // a Builder does not fail
	t := Table{Caption: "Where this report comes from", Head: []string{"what", "value"}, Rows: []Row{
		{"scenario", r.s.Name},
		{"SHA-256 of the resolved scenario", fmt.Sprintf("%x", sha256.Sum256([]byte(text.String())))},
	}}
	for _, set := range r.options.Sets {
		t.Rows = append(t.Rows, Row{"changed by --set", set})
	}
	motion, err := r.s.OpenMotion()
	if err != nil {
		return Part{}, err
	}
	if motion != nil {
		defer motion.Close()
		h := sha256.New()
		if _, err := io.Copy(h, motion); err != nil {
			return Part{}, err
		}
		t.Rows = append(t.Rows, Row{"motion read from", r.s.Excitation.Part.Values.Text("file")}, Row{"SHA-256 of the motion", fmt.Sprintf("%x", h.Sum(nil))})
	}
	return Part{Heading: "Provenance", Tables: []Table{t},
		Text:    []string{"The whole resolved scenario, every value spelled out in SI, follows. Saved as a file it runs again to the same figures."},
		Listing: text.String()}, nil
}
