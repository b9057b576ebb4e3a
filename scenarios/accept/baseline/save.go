package baseline

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"

	"antelag/scenarios/outfile"
)

// Save writes the baseline to a file: a new one takes the place of an old one
// only when it is wholly there, so that nothing is lost on a full disk.
func (b *Baseline) Save(path, scenario string) error {
	var text bytes.Buffer
	if err := b.WriteTo(&text, filepath.Base(scenario)); err != nil {
		return err
	}
	_, was := os.Stat(path)
	err := outfile.Write(path, text.Bytes(), true)
	if err != nil && was == nil {
		return fmt.Errorf("%s is as it was: %w", path, err)
	}
	return err
}
