package main

import (
	"os"
	"time"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
	"golang.org/x/term"
)

// patience is how long a run may take before it shows its progress.
const patience = 500 * time.Millisecond

// progress returns what a run is to call with its progress: a bar on stderr
// where that is a terminal, after a while; nil elsewhere.
func progress(name string) func(done, of int64) {
	if !term.IsTerminal(int(os.Stderr.Fd())) {
		return nil
	}
	began := time.Now()
	var bar *mpb.Bar
	var screen *mpb.Progress
	return func(done, of int64) {
		if bar == nil {
			if time.Since(began) < patience {
				return
			}
			screen = mpb.New(mpb.WithOutput(os.Stderr), mpb.WithWidth(40))
			bar = screen.AddBar(of, mpb.BarRemoveOnComplete(),
				mpb.PrependDecorators(decor.Name(name+" ")),
				mpb.AppendDecorators(decor.Percentage(), decor.Name(", left "), decor.AverageETA(decor.ET_STYLE_GO)))
		}
		bar.SetCurrent(done)
		if done >= of {
			screen.Wait()
		}
	}
}
