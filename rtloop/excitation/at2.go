package excitation

import (
	"bytes"
	"regexp"
	"strconv"
	"strings"
)

// at2Header is what the heading of a PEER NGA file says.
type at2Header struct {
	line   int // where NPTS and DT stand
	points int
	step   float64 // s
	unit   string
}

const (
	at2Titles = 12  // lines that are searched; NPTS stands in line 4, a few more are allowed for
	at2Width  = 300 // bytes of each that are searched
)

var (
	// "NPTS=  4000, DT=  .0050 SEC", with or without blanks, commas, colons.
	atPoints = regexp.MustCompile(`(?i)\bNPTS\s*[=:]\s*([^\s,;]+)`)
	atStep   = regexp.MustCompile(`(?i)\bDT\s*[=:]\s*([^\s,;]+)`)
	// "4000  0.0050  NPTS, DT", the older form.
	atOlder = regexp.MustCompile(`(?i)^([^\s,;]+)[\s,;]+([^\s,;]+)[\s,;]+NPTS\s*,?\s*DT\b`)
	atUnits = regexp.MustCompile(`(?i)\bUNITS?\s+OF\s+([A-Za-z/0-9*^]+)`)
	atSec   = regexp.MustCompile(`(?i)S(EC)?\.?$`)
)

// findAT2 looks for the heading of a PEER NGA file in the first lines. ok is
// false where there is none; an error says what is wrong with the one found.
func findAT2(s lines) (h at2Header, ok bool, err error) {
	h.unit = "g" // by the definition of the form
	for s.line < at2Titles && s.next() {
		if s.text = s.text[:min(len(s.text), at2Width)]; s.idle() {
			continue
		}
		if m := atUnits.FindSubmatch(s.text); m != nil {
			h.unit = at2Unit(string(m[1]))
		}
		var points, step []byte
		if m := atOlder.FindSubmatch(s.text); m != nil {
			points, step = m[1], m[2]
		} else if m := atPoints.FindSubmatch(s.text); m != nil {
			points = m[1]
			if d := atStep.FindSubmatch(s.text); d != nil {
				step = d[1]
			}
		} else {
			continue
		}
		h.line = s.line
		if h.points, err = strconv.Atoi(string(points)); err != nil || h.points < 2 {
			return h, false, s.errorf("NPTS= %s is not a whole number of at least 2", points)
		}
		if step == nil {
			return h, false, s.errorf("NPTS= %s found, but no DT= in the same line", points)
		}
		if h.step, err = number(atSec.ReplaceAll(step, nil)); err != nil || !(h.step > 0) {
			return h, false, s.errorf("DT= %s is not a time above zero", step)
		}
		return h, true, nil
	}
	return h, false, nil
}

// at2Unit turns a unit as PEER writes it into one that quantity reads.
func at2Unit(text string) string {
	switch u := strings.ToLower(text); u {
	case "cm/s/s", "cm/sec/sec", "cm/s2", "cm/s**2", "cm/sec2", "cm/sec**2":
		return "cm/s^2"
	case "cm/s", "cm/sec":
		return "cm/s"
	case "g", "cm":
		return u
	}
	return text
}

// readAT2 reads the values behind the heading. A step given beside it must be
// the one that the heading says.
func readAT2(s *lines, h at2Header, step float64) (Record, error) {
	rec := Record{Step: h.step, Unit: h.unit}
	for s.line < h.line && s.next() {
	}
	if step > 0 && step != h.step {
		return rec, s.errorf("the file says DT= %g s, but step says %g s; leave step out", h.step, step)
	}
	var cols [][]byte
	for s.next() {
		if len(bytes.TrimSpace(s.text)) == 0 {
			continue
		}
		var err error
		if cols, err = s.fields(cols[:0]); err != nil {
			return rec, err
		}
		if rec.Values, err = s.numbers(rec.Values, cols); err != nil {
			return rec, err
		}
	}
	if n := len(rec.Values); n != h.points {
		s.line = h.line
		return rec, s.errorf("NPTS= %d, but %d values follow", h.points, n)
	}
	return rec, nil
}
