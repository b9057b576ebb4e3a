package main

import (
	"context"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"antelag/scenarios/study/identified"
)

// identify finds in a log the actuator that run had, prints it as JSON and writes
// a block that another run takes.
func TestIdentifyGivesTheActuatorBack(t *testing.T) {
	dir := folder(t)
	antelag(t, dir, "run", "tracking", "--set", "loop.rate=512 Hz", "--log", "x.csv")
	got := decoded(t, antelag(t, dir, "identify", "x.csv", "--json", "--write", "block.toml", "--png", "x.svg").good(t).out)
	for key, want := range map[string]float64{"gain": 1, "delay_s": 7e-3, "lag_s": 5e-3, "total_delay_s": 12e-3} {
		if v, ok := got[key].(float64); !ok || math.Abs(v-want) > 0.01*want {
			t.Errorf("%s is %v, want %v", key, got[key], want)
		}
		if s, ok := got["sigma"].(map[string]any)[key].(float64); !ok || !(s > 0) {
			t.Errorf("sigma of %s is %v", key, s)
		}
	}
	block, err := os.ReadFile(filepath.Join(dir, "block.toml"))
	if err != nil {
		t.Fatal(err)
	}
	// Pasted behind a channel that has none.
	test := strings.Replace(rig, "[channel.actuator]", "[channel.was]", 1)
	before, rest, ok := strings.Cut(test, "[channel.was]")
	next := strings.Index(rest, "\n[")
	if !ok || next < 0 {
		t.Fatalf("the rig has changed its form:\n%s", rig)
	}
	if err := os.WriteFile(filepath.Join(dir, "pasted.toml"), []byte(before+string(block)+rest[next:]), 0o644); err != nil {
		t.Fatal(err)
	}
	if o := antelag(t, dir, "run", "pasted.toml"); o.code == exitUsage {
		t.Errorf("the block is not taken: %s\n%s", o.err, block)
	}
	if svg, err := os.ReadFile(filepath.Join(dir, "x.svg")); err != nil || !strings.Contains(string(svg), "<svg") {
		t.Errorf("the picture: %v", err)
	}

	text := antelag(t, dir, "identify", "x.csv").good(t).out
	for _, want := range []string{"The actuator answers 11.9", "[channel.actuator]\nkind = \"lag-delay\"", "coherence at least"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is missing in\n%s", want, text)
		}
	}
}

func TestIdentifyRefuses(t *testing.T) {
	dir := folder(t, "there.toml", "kept", "t.csv", "time,command [mm],measured [mm]\n0,1,1\n1,2,2\n2,3,3\n",
		"two.csv", "time,a.command_m,a.measured_m,b.command_m,b.measured_m\n0,1,1,1,1\n1,2,2,2,2\n2,3,3,3,3\n")
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{}, "identify takes one LOG"},
		{[]string{"a.csv", "b.csv"}, "identify takes one LOG"},
		{[]string{"none.csv"}, "none.csv: no such file"},
		{[]string{"t.csv"}, "t.csv: 3 samples; a fit takes at least 64"},
		{[]string{"two.csv"}, "two.csv: has the channels a, b; say which with --channel"},
		{[]string{"t.csv", "--write", "there.toml"}, "--write: there.toml: file already exists; --force overwrites it"},
		{[]string{"t.csv", "--png", "x.gif"}, "--png: x.gif: a picture ends in .png or .svg"},
		{[]string{"t.csv", "--hold", "jump"}, "--hold jump: allowed are ramp and step"},
		{[]string{"t.csv", "--slowdown", "0"}, "--slowdown 0: it must be above zero"},
		{[]string{"t.csv", "--write", "t.csv", "--force"}, "--write: t.csv belongs to the log itself"},
		{[]string{"t.csv", "--rate", "2 mm"}, "--rate: "},
	} {
		antelag(t, dir, append([]string{"identify"}, c.args...)...).refused(t, c.want)
	}
	if kept, err := os.ReadFile(filepath.Join(dir, "there.toml")); err != nil || string(kept) != "kept" {
		t.Errorf("there.toml: %q, %v", kept, err)
	}
}

// What cannot be written is said: before the log is read where there is no place
// for it, and after the figures where there is no room.
func TestIdentifyCannotWrite(t *testing.T) {
	dir := folder(t)
	antelag(t, dir, "run", "tracking", "--set", "loop.rate=256 Hz", "--log", "x.csv")
	antelag(t, dir, "identify", "x.csv", "--write", "no/where.toml").complained(t, exitFail, "--write: no/where.toml: there is no directory no")
	if err := os.Symlink("/dev/full", filepath.Join(dir, "full.toml")); err != nil {
		t.Fatal(err)
	}
	o := antelag(t, dir, "identify", "x.csv", "--write", "full.toml", "--force")
	if o.code != exitFail || !strings.Contains(o.err, "--write: ") || !strings.Contains(o.out, "The actuator answers") {
		t.Errorf("exit %d, %q", o.code, o.err)
	}
}

// Ctrl-C ends it in one line.
func TestIdentifyInterrupted(t *testing.T) {
	dir := folder(t)
	// A log that never ends: rows come until the command is interrupted.
	fifo := filepath.Join(dir, "endless.csv")
	if err := exec.Command("mkfifo", fifo).Run(); err != nil {
		t.Fatal(err)
	}
	ctx, interrupt := context.WithCancel(context.Background())
	defer interrupt()
	cmd := exec.CommandContext(ctx, binary, "identify", "endless.csv")
	cmd.Dir = dir
	cmd.Cancel = func() error { return cmd.Process.Signal(os.Interrupt) }
	go func() {
		f, err := os.OpenFile(fifo, os.O_WRONLY, 0)
		if err != nil {
			return
		}
		defer f.Close()
		fmt.Fprintln(f, "time,command [mm],measured [mm]")
		for k := 0; ; k++ {
			if _, err := fmt.Fprintf(f, "%g,%d,%d\n", float64(k)/1000, k%7, k%5); err != nil {
				return
			}
			if k == 20000 {
				interrupt()
			}
		}
	}()
	o := finish(t, cmd)
	o.complained(t, exitFail, "interrupted before there was a fit; nothing was written")
}

func TestPlotOfAResponse(t *testing.T) {
	c := &identified.Curves{Hz: []float64{1, 2, 3}, Gain: []float64{1, 0.99, 0.97}, FitGain: []float64{1, 0.99, 0.98},
		Delay: []float64{12, 11.9, 11.7}, FitDelay: []float64{12, 11.9, 11.8}}
	for _, width := range []int{20, 80, 100} {
		picture := plotResponse(c, width)
		if width > 40 && !strings.Contains(picture, "ms late") || strings.Count(picture, "\n") != 21 {
			t.Errorf("%d columns:\n%s", width, picture)
		}
	}
	plotResponse(&identified.Curves{Hz: []float64{1}, Gain: []float64{1}, FitGain: []float64{1}, Delay: []float64{1}, FitDelay: []float64{1}}, 1)
}
