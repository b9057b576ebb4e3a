package main

import (
	"os"
	"regexp"
	"strings"
	"testing"
)

var wallTime = regexp.MustCompile(`computed in .*`)

// What the README shows is what the program prints: every "$ antelag …" in it is
// run, and all lines up to the end of its block compared, but for the time that
// the computing took.
func TestReadmeShowsRealOutput(t *testing.T) {
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	const prompt, margin = "    $ antelag", "    "
	shown := 0
	lines := strings.Split(string(text), "\n")
	for i, line := range lines {
		rest, ok := strings.CutPrefix(line, prompt)
		if !ok {
			continue
		}
		shown++
		var want []string
		for _, l := range lines[i+1:] {
			if l != "" && !strings.HasPrefix(l, margin) {
				break
			}
			want = append(want, strings.TrimPrefix(l, margin))
		}
		got := antelag(t, t.TempDir(), words(rest)...)
		out := strings.Split(strings.TrimRight(got.out+got.err, "\n"), "\n")
		for k := range out {
			out[k] = strings.TrimRight(out[k], " ")
		}
		shownText := strings.TrimRight(strings.Join(want, "\n"), "\n")
		if a, b := wallTime.ReplaceAllString(strings.Join(out, "\n"), ""), wallTime.ReplaceAllString(shownText, ""); a != b {
			t.Errorf("README line %d: antelag%s prints\n%s\nthe README shows\n%s", i+1, rest, a, b)
		}
	}
	if shown < 5 {
		t.Errorf("only %d commands found in the README", shown)
	}
}

// words splits what follows the program's name as a shell would, with single
// quotes.
func words(s string) []string {
	var out []string
	for i, part := range strings.Split(s, "'") {
		if i%2 == 1 {
			out = append(out, part)
			continue
		}
		out = append(out, strings.Fields(part)...)
	}
	return out
}
