package main

import (
	"os"
	"path/filepath"
	"sync"
	"time"
	"unicode/utf8"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
	"golang.org/x/term"
)

const (
	// patience is how long a run may take before it shows its progress.
	patience = 500 * time.Millisecond

	// Columns: of the bar at most and at least, and of what stands behind it,
	// with room left over: the terminal echoes a Ctrl-C there, and a line that
	// wraps cannot be taken back.
	barMost, barLeast, barTail = 40, 6, 28
)

// progress is a bar on stderr that shows how far a run has got. It comes up
// after a while, and only where stderr is a terminal.
type progress struct {
	name  string
	width int // of the bar, columns
	began time.Time

	lock   sync.Mutex // clear may come from elsewhere than report
	mute   bool
	screen *mpb.Progress
	bar    *mpb.Bar
}

func newProgress(scenario string) *progress {
	p := &progress{name: filepath.Base(scenario) + " ", began: time.Now()}
	columns, _, err := term.GetSize(int(os.Stderr.Fd()))
	if err != nil {
		p.mute = true
		return p
	}
	if p.width = columns - barTail - utf8.RuneCountInString(p.name); p.width < barLeast {
		p.name, p.width = "", columns-barTail
	}
	p.width = min(p.width, barMost)
	p.mute = p.width < barLeast
	return p
}

// report takes the ticks done so far and the ticks of the whole run.
func (p *progress) report(done, of int64) {
	p.lock.Lock()
	defer p.lock.Unlock()
	if p.mute || p.bar == nil && time.Since(p.began) < patience {
		return
	}
	if p.bar == nil {
		p.screen = mpb.New(mpb.WithOutput(os.Stderr), mpb.WithWidth(p.width))
		p.bar = p.screen.AddBar(of, mpb.BarRemoveOnComplete(),
			mpb.PrependDecorators(decor.Name(p.name)),
			mpb.AppendDecorators(decor.Percentage(), decor.Name(", left "), decor.AverageETA(decor.ET_STYLE_GO)))
	}
	p.bar.SetCurrent(done)
}

// clear takes the bar off the terminal for good, however far the run has got,
// so that what is printed next starts on a clean line.
func (p *progress) clear() {
	p.lock.Lock()
	defer p.lock.Unlock()
	p.mute = true
	if p.bar != nil {
		p.bar.Abort(true) // of a bar that is full: nothing
		p.screen.Wait()
		p.bar = nil
	}
}
