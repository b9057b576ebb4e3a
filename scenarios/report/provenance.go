package report

import (
	"crypto/sha256"
	"fmt"
	"strings"
)

// provenance is where the report comes from: enough to do it again.
func (r *run) provenance() Part {
	var text strings.Builder
	r.s.WriteTo(&text) //nolint:errcheck // a Builder does not fail
	t := Table{Caption: "Where this report comes from", Head: []string{"what", "value"}, Rows: []Row{
		{"scenario", r.s.Name},
		{"digest of the resolved scenario, SHA-256", fmt.Sprintf("%x", sha256.Sum256([]byte(text.String())))},
	}}
	for _, set := range r.options.Sets {
		t.Rows = append(t.Rows, Row{"changed by --set", set})
	}
	if file, ok := r.s.Excitation.Part.Values["file"]; ok {
		t.Rows = append(t.Rows, Row{"motion read from", file.Text})
	}
	return Part{Heading: "Provenance", Tables: []Table{t},
		Text:    []string{"The whole resolved scenario, every value spelled out in SI, follows. Saved as a file it runs again to the same figures."},
		Listing: text.String()}
}
