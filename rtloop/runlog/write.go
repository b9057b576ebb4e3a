// Package runlog writes the log of a test, and reads that and the logs of others.
//
// A log is a CSV file with one header row and no comments, so that any tool reads
// it, and beside it a TOML file that says where the log came from.
//
// Columns: time_s in model seconds; ground_m_s2 or applied_N as the excitation
// drives, or neither; for each channel target_m, command_m, measured_m and
// force_N with the channel's name in front; last energy_margin, empty while
// undefined. Row k is time t_k: target, command and measured are those meant
// for and found at t_k; row 0 is the start. Numbers have full float64
// precision.
//
// Reader reads any table of numbers with time stamps or a rate, and gives it out
// evenly sampled and in SI. It knows nothing of scenarios or gauges.
package runlog

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"os"
	"strconv"
	"time"

	"antelag/rtloop"
	"antelag/rtloop/excitation"
)

const (
	// flushEvery is the longest that a row waits in memory while rows come.
	flushEvery = time.Second
	// bufferSize is how much is gathered for one write, bytes.
	bufferSize = 1 << 16
)

// Writer writes rows to a log file. The file grows by whole rows, so that it
// reads to its end at any time; only a program killed in the very middle of a
// write leaves a last row that is cut off.
type Writer struct {
	file     *os.File
	rows     []byte // whole rows that are not in the file yet
	written  int64  // bytes in the file
	channels int
	drives   excitation.Drives
	flushed  time.Time
	err      error // of the first write that failed; nothing is written after it
}

// Create makes the log file and writes the header, and makes the provenance
// file "<path>.toml" beside it with the given text. Neither may exist unless
// force is set; the error is then fs.ErrExist. When Create fails nothing new
// is left behind, and when it could not open both files nothing has changed.
// Call Close at the end.
func Create(path string, channels []string, drives excitation.Drives, provenance string, force bool) (*Writer, error) {
	log, err := open(path, force)
	if err != nil {
		return nil, err
	}
	beside, err := open(path+".toml", force)
	if err != nil {
		log.discard()
		return nil, err
	}
	w := &Writer{
		file: log.File, rows: make([]byte, 0, bufferSize+bufferSize/4),
		channels: len(channels), drives: drives, flushed: time.Now(),
	}
	err = errors.Join(log.empty(), beside.empty())
	if err == nil {
		_, err = beside.WriteString(provenance)
	}
	if e := beside.Close(); err == nil {
		err = e
	}
	if err != nil {
		beside.discard()
		log.discard()
		return nil, err
	}
	w.header(channels)
	return w, nil
}

func (w *Writer) header(channels []string) {
	b := append(w.rows, "time_s"...)
	switch w.drives {
	case excitation.Ground:
		b = append(b, ",ground_m_s2"...)
	case excitation.Force:
		b = append(b, ",applied_N"...)
	}
	for _, c := range channels {
		for _, column := range []string{".target_m", ".command_m", ".measured_m", ".force_N"} {
			b = append(append(append(b, ','), c...), column...)
		}
	}
	w.rows = append(b, ",energy_margin\n"...)
}

// Row writes the loop as it stands now. It fits Lane.Observe.
func (w *Writer) Row(l *rtloop.Loop) error {
	b := strconv.AppendFloat(w.rows, l.Time(), 'g', -1, 64)
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
	w.rows = append(b, '\n')
	if len(w.rows) < bufferSize && time.Since(w.flushed) < flushEvery {
		return nil
	}
	return w.flush()
}

func number(b []byte, v float64) []byte {
	return strconv.AppendFloat(append(b, ','), v, 'g', -1, 64)
}

// flush writes what has gathered. What did not fit, on a full disk, is cut off
// behind the last whole row.
func (w *Writer) flush() error {
	w.flushed = time.Now()
	if w.err == nil {
		n, err := w.file.Write(w.rows)
		if err != nil {
			whole := bytes.LastIndexByte(w.rows[:n], '\n') + 1
			w.file.Truncate(w.written + int64(whole)) //nolint:errcheck // the first error counts
			w.err = fmt.Errorf("log: %w", err)
		}
		w.written += int64(n)
	}
	w.rows = w.rows[:0]
	return w.err
}

// Close writes what is left and closes the file.
func (w *Writer) Close() error {
	err := w.flush()
	if e := w.file.Close(); err == nil && e != nil {
		err = fmt.Errorf("log: %w", e)
	}
	return err
}
