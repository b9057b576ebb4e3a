package runlog

import (
	"bytes"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
	"math"
)

// Options say what a file does not say itself.
type Options struct {
	Map   Map   // which column is what; nothing: as the headings say
	Units Units // of columns whose headings name none
	// Rate, rows a second, is for tables without time stamps, or with stamps that
	// are no good: rows are then evenly spaced, the first at time 0.
	Rate    float64
	Channel string // the one channel to read; "": all
	Need    []Role // what every channel must have
	Lean    bool   // read nothing but the time and what is needed; what else there is, holes and slips in it too, is passed over
}

// Reader reads a log of any form in constant memory and gives it out evenly
// sampled, in SI, block by block. It works like bufio.Scanner:
//
//	for r.Next() {
//		b := r.Block()
//		…
//	}
//	if err := r.Err(); err != nil …
//
// What it reads: tables of numbers separated by commas, semicolons, tabs or
// blanks, below any number of other lines, of which the last may name the columns
// and a further one their units; points or commas for decimal marks; blank lines
// and comments (#, %, !, //) anywhere; gzip; UTF-8, UTF-16 with its mark, and
// headings in Windows-1252; lines ended by LF, CR LF or CR.
//
// What it mends, and says so in Notes: see grid for time stamps, and holes for
// missing numbers. A last row that is cut off is left out. Everything else that is
// no row of numbers is an error that names file and line.
type Reader struct {
	path   string
	source *source
	layout layout
	chosen *chosen

	buf      []byte
	pos, end int // the unread part of buf
	over     bool
	line     int // of the line just taken
	rowLine  int // of the row just read

	cells [][]byte  // of a row that is taken apart first
	order []int     // columns by their place in the table
	row   []float64 // SI, by column

	grid  grid
	holes holes
	tail  badTail
	block Block
	err   error

	expected int64
	ended    bool
	notes    []string
}

// Block is a stretch of a log: evenly spaced samples in SI. Its slices are
// overwritten by the next.
type Block struct {
	First    int64     // index of the first sample; sample k is at Start + k·Step
	N        int       // samples
	Channels []Samples // by channel
	Margin   []float64 // energy margin as it was logged, NaN while undefined; nil if it was not
}

// Samples are those of one channel: target, command and measured displacement, m,
// and force, N. What the log does not have is nil.
type Samples [roles][]float64

const (
	readSize   = 1 << 19 // what is read at once, bytes
	headSize   = 1 << 17 // what the layout is found from, bytes
	longest    = 1 << 20 // longest line, bytes
	blockSize  = 4096    // samples of a block
	headRows   = 4096    // rows from which the sampling is found
	badMost    = 16      // lines at the end that may be no rows
	fewestRows = 2
)

// Open opens a log and finds out how it is written. Errors begin with the file
// and, where there is one, the line: "log.csv:12: …".
func Open(path string, o Options) (*Reader, error) {
	s, err := openSource(path)
	if err != nil {
		return nil, err
	}
	size := int64(readSize)
	if s.size > 0 && !s.packed {
		size = min(size, s.size+1) // the byte more shows the end
	}
	r := &Reader{path: path, source: s, buf: make([]byte, size)}
	if err := r.open(&o); err != nil {
		s.Close()
		return nil, err
	}
	return r, nil
}

func (r *Reader) open(o *Options) error {
	if o.Rate != 0 && !(o.Rate > 0 && o.Rate <= 1e9) {
		return fmt.Errorf("rate: %g Hz is not between 0 and 1e9 Hz", o.Rate)
	}
	if err := r.fill(); err != nil {
		return err
	}
	if r.end == 0 {
		return fmt.Errorf("%s: is empty", r.path)
	}
	var err error
	head := min(r.end, headSize)
	if r.layout, err = findLayout(r.buf[:head], r.over && head == r.end); err != nil && head < r.end {
		r.layout, err = findLayout(r.buf[:r.end], r.over)
	}
	if err != nil {
		return r.placed(err)
	}
	if r.chosen, err = r.layout.choose(o); err != nil {
		return r.placed(err)
	}
	r.prepare()
	if err := r.findSampling(o); err != nil {
		return err
	}
	rows := r.buf[r.pos:r.end]
	if lines := bytes.Count(rows, []byte{r.layout.end}); lines > 0 && r.source.size > 0 && !r.source.packed {
		r.expected = int64(float64(lines) / float64(len(rows)) * float64(max(r.source.size-int64(r.layout.at), 0)))
	}
	r.sayLayout()
	return nil
}

// placed puts the file in front of an error that begins with its line, or not.
func (r *Reader) placed(err error) error {
	if text := err.Error(); len(text) > 0 && text[0] >= '0' && text[0] <= '9' {
		return fmt.Errorf("%s:%w", r.path, err)
	}
	return fmt.Errorf("%s: %w", r.path, err)
}

func (r *Reader) errorf(line int, format string, args ...any) error {
	return fmt.Errorf("%s:%d: %w", r.path, line, fmt.Errorf(format, args...))
}

// fill reads on until the buffer is full or the text over.
func (r *Reader) fill() error {
	if r.pos > 0 {
		r.end = copy(r.buf, r.buf[r.pos:r.end])
		r.pos = 0
	}
	if r.end == len(r.buf) {
		if len(r.buf) > longest {
			return r.errorf(r.line+1, "a line of more than %d bytes, which is no row of numbers", longest)
		}
		r.buf = append(r.buf, make([]byte, len(r.buf))...)
	}
	for r.end < len(r.buf) && !r.over {
		n, err := r.source.Read(r.buf[r.end:])
		r.end += n
		switch {
		case err == io.EOF:
			r.over = true
		case errors.Is(err, io.ErrUnexpectedEOF):
			r.over = true
			r.notes = append(r.notes, "the compressed file is cut off; it was read up to there")
		case errors.Is(err, gzip.ErrChecksum), errors.Is(err, gzip.ErrHeader):
			return fmt.Errorf("%s: the compressed file is damaged: %w", r.path, err)
		case err != nil:
			return fmt.Errorf("%s: %w", r.path, err)
		}
	}
	return nil
}

// nextLine returns the next line without its end; closed is false for a last one
// that has none. At the end of the text it returns nil.
func (r *Reader) nextLine() (text []byte, closed bool, err error) {
	for {
		if i := bytes.IndexByte(r.buf[r.pos:r.end], r.layout.end); i >= 0 {
			text = r.buf[r.pos : r.pos+i]
			r.pos += i + 1
			r.line++
			return text, true, nil
		}
		if r.over {
			text = r.buf[r.pos:r.end]
			r.pos = r.end
			if len(text) == 0 {
				return nil, false, nil
			}
			r.line++
			return text, false, nil
		}
		if err := r.fill(); err != nil {
			return nil, false, err
		}
	}
}

// Channels returns the channels of the log and what there is of each.
func (r *Reader) Channels() []Channel { return r.chosen.channels }

// Step returns the time between samples, s.
func (r *Reader) Step() float64 { return r.grid.step }

// Start returns the time of the first sample, s, once there has been one.
func (r *Reader) Start() float64 { return r.grid.start }

// HasMargin reports whether the log has the column energy_margin.
func (r *Reader) HasMargin() bool { return r.chosen.margin >= 0 }

// Size returns the bytes of the log where they are known beforehand, else 0.
func (r *Reader) Size() int64 { return r.source.size }

// Expected returns about how many samples there will be, as the first lines and the
// size of the file have it; 0 where they do not.
func (r *Reader) Expected() int64 { return r.expected }

// Offset returns about how many bytes of the file have been read.
func (r *Reader) Offset() int64 { return r.source.read }

// Next reads the next block and reports whether there is one.
func (r *Reader) Next() bool {
	for r.err == nil && !r.ended && r.holes.ready() < blockSize {
		more, err := r.nextRow()
		switch {
		case err != nil:
			r.err = err
		case more:
			r.err = r.place()
		default:
			r.err = r.finish()
		}
	}
	n := min(r.holes.ready(), blockSize)
	if r.err != nil || n == 0 {
		return false
	}
	r.holes.take(n)
	r.show(n)
	return true
}

// show makes the block of what was taken.
func (r *Reader) show(n int) {
	b := &r.block
	b.First, b.N = r.holes.first, n
	if b.Channels == nil {
		b.Channels = make([]Samples, len(r.chosen.channels))
	}
	for i, c := range r.chosen.columns {
		switch {
		case i == r.chosen.margin:
			b.Margin = r.holes.taken[i]
		case c.channel >= 0:
			b.Channels[c.channel][c.role] = r.holes.taken[i]
		}
	}
}

// Block returns what Next read.
func (r *Reader) Block() *Block { return &r.block }

// Err returns the error that ended the reading, nil at the end of the log.
func (r *Reader) Err() error { return r.err }

// Samples returns how many samples there have been.
func (r *Reader) Samples() int64 { return r.holes.first + int64(r.holes.out) }

// Close closes the file.
func (r *Reader) Close() error { return r.source.Close() }

// finish ends the log: everything has been read.
func (r *Reader) finish() error {
	r.ended = true
	if r.grid.rows == 0 && r.grid.skipped > 0 {
		return r.errorf(r.layout.first, "no row has a number in every column that is read (%s)", r.chosen.list())
	}
	if r.grid.rows < fewestRows {
		return r.errorf(r.layout.first, "%d row of numbers; a log has at least %d", r.grid.rows, fewestRows)
	}
	r.holes.close()
	r.sayMended()
	return nil
}

// NaN reports whether a sample is none.
func nan(v float64) bool { return math.IsNaN(v) }
