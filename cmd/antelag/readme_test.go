package main

import (
	"flag"
	"os"
	"regexp"
	"strings"
	"testing"
)

var wallTime = regexp.MustCompile(`computed in .*`)

var update = flag.Bool("update", false, "write what the README shows anew")

// What the README shows is what the program prints: every "$ antelag …" in it is
// run, and all lines up to the end of its block compared, but for the time that
// the computing took. With -update they are written anew instead.
func TestReadmeShowsRealOutput(t *testing.T) {
	const file = "../../README.md"
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	const prompt, margin = "    $ antelag", "    "
	shown := 0
	var anew []string
	lines := strings.Split(string(text), "\n")
	for i := 0; i < len(lines); i++ {
		anew = append(anew, lines[i])
		rest, ok := strings.CutPrefix(lines[i], prompt)
		if !ok {
			continue
		}
		shown++
		line, want := i+1, []string(nil)
		for i+1 < len(lines) && (lines[i+1] == "" || strings.HasPrefix(lines[i+1], margin)) && !strings.HasPrefix(lines[i+1], prompt) {
			i++
			want = append(want, strings.TrimPrefix(lines[i], margin))
		}
		got := antelag(t, t.TempDir(), words(rest)...)
		out := strings.Split(strings.TrimRight(got.out+got.err, "\n"), "\n")
		for k := range out {
			out[k] = strings.TrimRight(out[k], " ")
			anew = append(anew, strings.TrimRight(margin+out[k], " "))
		}
		anew = append(anew, "")
		shownText := strings.TrimRight(strings.Join(want, "\n"), "\n")
		if a, b := wallTime.ReplaceAllString(strings.Join(out, "\n"), ""), wallTime.ReplaceAllString(shownText, ""); a != b && !*update {
			t.Errorf("README line %d: antelag%s prints\n%s\nthe README shows\n%s", line, rest, a, b)
		}
	}
	if shown < 5 {
		t.Errorf("only %d commands found in the README", shown)
	}
	if *update {
		if err := os.WriteFile(file, []byte(strings.Join(anew, "\n")), 0o666); err != nil {
			t.Fatal(err)
		}
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
