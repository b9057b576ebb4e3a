package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// The command prints the table, draws, and its exit code says whether a
// slowdown passes.
func TestTempo(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", edited(t, `"8 s"`, `"4 s"`))
	o := antelag(t, dir, "tempo", "rig.toml", "--slowdown", "1:6:3", "--png", "t.png").good(t)
	for _, want := range []string{"\nPASS      1 ", "\nPASS   2.45 ", "\nPASS      6 ", "The fastest slowdown that passes is 1.", "response error  ", "slowdown"} {
		if !strings.Contains(o.out, want) {
			t.Errorf("no %q in\n%s", want, o.out)
		}
	}
	if picture := read(t, dir, "t.png"); !strings.HasPrefix(picture, "\x89PNG") {
		t.Error("no picture")
	}
	o = antelag(t, dir, "tempo", "rig.toml", "--slowdown", "1:2:2", "--set", "accept.nrmse=0.0000001", "--json")
	var report struct {
		Points  []struct{ Slowdown, Response_error float64 }
		Fastest *float64 `json:"fastest_slowdown"`
	}
	if err := json.Unmarshal([]byte(o.out), &report); err != nil || o.code != exitFail || o.err != "" || len(report.Points) != 2 || report.Fastest != nil || report.Points[0].Response_error <= 0 {
		t.Errorf("exit %d, %v\n%s%s", o.code, err, o.out, o.err)
	}
	antelag(t, dir, "tempo", "tracking", "--slowdown", "1:2:2", "--set", "loop.duration=5 s", "--lane", "configured")
}

func TestTempoRefuses(t *testing.T) {
	t.Parallel()
	dir := folder(t, "rig.toml", rig, "old.png", "precious")
	before := listing(t, dir)
	for _, c := range []struct {
		args []string
		want string
	}{
		{nil, "tempo takes one SCENARIO"},
		{[]string{"rig.toml", "--slowdown", "1:10"}, "--slowdown: \"1:10\": slowdowns are given as a:b:n"},
		{[]string{"rig.toml", "--slowdown", "0:10:3"}, "--slowdown: loop.slowdown: 0 is below 1"},
		{[]string{"rig.toml", "--lane", "none"}, `unknown lane "none"`},
		{[]string{"rig.toml", "--png", "old.png"}, "--png: old.png: file already exists; --force overwrites it"},
		{[]string{"rig.toml", "--png", "x.pdf"}, "a picture ends in .png or .svg"},
		{[]string{"rig.toml", "--workers", "-1"}, "--workers -1"},
		{[]string{"nowhere.toml"}, "nowhere.toml: there is no such file"},
	} {
		antelag(t, dir, append([]string{"tempo"}, c.args...)...).refused(t, c.want)
	}
	unchanged(t, dir, before)

	if err := os.Symlink("/dev/full", filepath.Join(dir, "full.svg")); err != nil {
		t.Fatal(err)
	}
	o := antelag(t, dir, "tempo", "rig.toml", "--slowdown", "1:1:1", "--png", "full.svg", "--force")
	if o.code != exitFail || !strings.Contains(o.err, "no space left on device") || !strings.Contains(o.out, "The fastest") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
}
