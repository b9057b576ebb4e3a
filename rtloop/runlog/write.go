// Package runlog writes the log of a test: a CSV file with one header row and
// no comments, so that any tool reads it, and beside it a TOML file that says
// where the log came from.
//
// Columns: time_s in model seconds; ground_m_s2 or applied_N as the excitation
// drives, or neither; for each channel target_m, command_m, measured_m and
// force_N with the channel's name in front; last energy_margin, empty while
// undefined. Row k is time t_k: target, command and measured are those meant
// for and found at t_k; row 0 is the start. Numbers have full float64
// precision.
package runlog

import (
	"bufio"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"strconv"
	"time"

	"antelag/rtloop"
	"antelag/rtloop/excitation"
)

// flushEvery is the longest that a row waits in memory.
const flushEvery = time.Second

// Writer writes rows to a log file.
type Writer struct {
	file     *os.File
	out      *bufio.Writer
	line     []byte
	channels int
	drives   excitation.Drives
	flushed  time.Time
	rows     int
}

// Create makes the log file and writes the header, and makes the provenance
// file "<path>.toml" beside it with the given text. Neither may exist unless
// force is set. Call Close at the end.
func Create(path string, channels []string, drives excitation.Drives, provenance string, force bool) (*Writer, error) {
	if err := writeNew(path+".toml", provenance, force); err != nil {
		return nil, err
	}
	f, err := create(path, force)
	if err != nil {
		os.Remove(path + ".toml")
		return nil, err
	}
	w := &Writer{file: f, out: bufio.NewWriterSize(f, 1<<16), channels: len(channels), drives: drives, flushed: time.Now()}
	w.header(channels)
	return w, nil
}

func create(path string, force bool) (*os.File, error) {
	flags := os.O_WRONLY | os.O_CREATE | os.O_TRUNC
	if !force {
		flags |= os.O_EXCL
	}
	f, err := os.OpenFile(path, flags, 0o644)
	if errors.Is(err, fs.ErrExist) {
		return nil, fmt.Errorf("%s exists; --force overwrites it", path)
	}
	return f, err
}

func writeNew(path, text string, force bool) error {
	f, err := create(path, force)
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}

func (w *Writer) header(channels []string) {
	w.line = append(w.line[:0], "time_s"...)
	switch w.drives {
	case excitation.Ground:
		w.line = append(w.line, ",ground_m_s2"...)
	case excitation.Force:
		w.line = append(w.line, ",applied_N"...)
	}
	for _, c := range channels {
		for _, column := range []string{".target_m", ".command_m", ".measured_m", ".force_N"} {
			w.line = append(append(append(w.line, ','), c...), column...)
		}
	}
	w.line = append(w.line, ",energy_margin\n"...)
	w.out.Write(w.line) //nolint:errcheck // bufio keeps the error for the next flush
}

// Row writes the loop as it stands now. It fits Lane.Observe.
func (w *Writer) Row(l *rtloop.Loop) error {
	b := strconv.AppendFloat(w.line[:0], l.Time(), 'g', -1, 64)
	if w.drives != excitation.Target {
		b = number(b, l.Excitation())
	}
	for j := range w.channels {
		r := l.Row(j)
		b = number(number(number(number(b, r.Target), r.Command), r.Measured), r.Force)
	}
	b = append(b, ',')
	if m := l.Margin(); !math.IsNaN(m) {
		b = strconv.AppendFloat(b, m, 'g', -1, 64)
	}
	w.line = append(b, '\n')
	if _, err := w.out.Write(w.line); err != nil {
		return fmt.Errorf("log: %w", err)
	}
	return w.flushInTime()
}

func number(b []byte, v float64) []byte {
	return strconv.AppendFloat(append(b, ','), v, 'g', -1, 64)
}

// flushInTime flushes once a second. The clock is asked only now and then;
// a loop at its real rate makes so many rows in a fraction of a second.
func (w *Writer) flushInTime() error {
	if w.rows++; w.rows%64 != 0 {
		return nil
	}
	if now := time.Now(); now.Sub(w.flushed) > flushEvery {
		w.flushed = now
		if err := w.out.Flush(); err != nil {
			return fmt.Errorf("log: %w", err)
		}
	}
	return nil
}

// Close flushes what is left and closes the file.
func (w *Writer) Close() error {
	err := w.out.Flush()
	if e := w.file.Close(); err == nil {
		err = e
	}
	if err != nil {
		return fmt.Errorf("log: %w", err)
	}
	return nil
}
