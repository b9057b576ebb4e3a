package tui

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"antelag/scenarios"
	"antelag/tui/canvas"
)

// askWrite asks for the name of the file that the lane is written to.
func (s *session) askWrite() {
	s.ask("write lane "+s.laneName(s.lane)+" as scenario file:", s.suggest(), s.write)
}

// suggest is a name for the file: beside the scenario, so that files which it
// names are found, and called after the lane.
func (s *session) suggest() string {
	base := strings.TrimSuffix(filepath.Base(s.now.Name), filepath.Ext(s.now.Name))
	if name := s.laneName(s.lane); name != scenarios.Configured {
		base += "-" + name
	} else {
		base += "-tuned"
	}
	name := strings.Map(func(r rune) rune {
		if r == '/' || r == '\\' || r == 0 {
			return '-'
		}
		return r
	}, base) + ".toml"
	if _, err := os.Stat(s.now.Name); err == nil {
		return filepath.Join(filepath.Dir(s.now.Name), name)
	}
	return name
}

// write writes the lane to a file that does not exist yet, and else asks.
func (s *session) write(name string) {
	name = strings.TrimSpace(name)
	if name == "" {
		s.say("no name given; nothing written")
		return
	}
	err := s.writeTo(name, os.O_EXCL)
	if errors.Is(err, fs.ErrExist) {
		s.ask(strconv.Quote(name)+" exists; overwrite it? type yes:", "", func(text string) {
			if strings.TrimSpace(text) != "yes" {
				s.say("nothing written")
				return
			}
			s.wrote(name, s.writeTo(name, os.O_TRUNC))
		})
		return
	}
	s.wrote(name, err)
}

// writeTo writes the scenario of the lane alone. It is put together first, so
// that nothing is lost of an old file when that fails.
func (s *session) writeTo(name string, flag int) error {
	alone, err := s.now.Alone(s.laneName(s.lane))
	if err != nil {
		return err
	}
	var text strings.Builder
	if _, err := alone.WriteTo(&text); err != nil {
		return err
	}
	return writeFile(name, text.String(), flag)
}

func writeFile(name, text string, flag int) error {
	f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|flag, 0o666)
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}

// wrote says what became of the file: a scenario that does not read back is
// worth knowing about.
func (s *session) wrote(name string, err error) {
	if err != nil {
		s.say("not written: %v", err)
		s.log(true, "not written: %v", err)
		return
	}
	s.say("lane %s written to %s", s.laneName(s.lane), name)
	s.log(false, "lane %s written to %s", s.laneName(s.lane), name)
	back, err := scenarios.Load(name)
	if err == nil {
		_, err = back.Build()
	}
	if err != nil {
		s.say("written to %s, but it does not run from there: %v", name, err)
		s.log(true, "%s does not run from there: %v", name, err)
	}
}

// screenshots are numbered up to here in one directory.
const mostScreenshots = 9999

// screenshot writes the screen as text, to a name that is free.
func screenshot(g *canvas.Grid) string {
	for i := 1; i <= mostScreenshots; i++ {
		name := fmt.Sprintf("antelag-screen-%d.txt", i)
		err := writeFile(name, g.String()+"\n", os.O_EXCL)
		switch {
		case errors.Is(err, fs.ErrExist):
			continue
		case err != nil:
			return fmt.Sprintf("no screenshot: %v", err)
		}
		return "screen written to " + name
	}
	return fmt.Sprintf("no screenshot: there are %d already", mostScreenshots)
}
