package check

import (
	"bytes"
	"encoding/xml"
	"errors"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"
)

// The shape that build servers have agreed on for these files (common
// practice; there is no standard): which elements may stand in which, and the
// attributes that each must and may have.
var shape = map[string]struct{ in, must, may []string }{
	"testsuites": {[]string{""}, nil, []string{"name", "tests", "failures", "errors", "time", "disabled"}},
	"testsuite":  {[]string{"testsuites"}, []string{"name", "tests"}, []string{"failures", "errors", "skipped", "time", "timestamp", "hostname", "id", "package"}},
	"properties": {[]string{"testsuite"}, nil, nil},
	"property":   {[]string{"properties"}, []string{"name", "value"}, nil},
	"testcase":   {[]string{"testsuite"}, []string{"name", "classname"}, []string{"time", "status", "assertions"}},
	"failure":    {[]string{"testcase"}, nil, []string{"message", "type"}},
	"error":      {[]string{"testcase"}, nil, []string{"message", "type"}},
	"skipped":    {[]string{"testcase"}, nil, []string{"message", "type"}},
}

var (
	counts = regexp.MustCompile(`^\d+$`)
	times  = regexp.MustCompile(`^\d+(\.\d+)?$`)
	stamps = regexp.MustCompile(`^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d$`)
)

// validate reads the text as XML and holds it to the shape and to its own
// sums. It returns the names of the cases that failed.
func validate(t *testing.T, text []byte) (failed []string) {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(text))
	path, name := []string{""}, ""
	count := map[string]int{}
	claimed := map[string]int{}
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatalf("not well-formed: %v\n%s", err, text)
		}
		switch e := token.(type) {
		case xml.StartElement:
			rule, ok := shape[e.Name.Local]
			if !ok || !slices.Contains(rule.in, path[len(path)-1]) {
				t.Fatalf("<%s> in <%s>", e.Name.Local, path[len(path)-1])
			}
			path = append(path, e.Name.Local)
			count[e.Name.Local]++
			given := map[string]string{}
			for _, a := range e.Attr {
				given[a.Name.Local] = a.Value
				if !slices.Contains(rule.must, a.Name.Local) && !slices.Contains(rule.may, a.Name.Local) {
					t.Errorf("<%s> has %s", e.Name.Local, a.Name.Local)
				}
			}
			for _, must := range rule.must {
				if given[must] == "" && must != "value" {
					t.Errorf("<%s> has no %s", e.Name.Local, must)
				}
			}
			for attr, form := range map[string]*regexp.Regexp{"tests": counts, "failures": counts, "errors": counts, "skipped": counts, "time": times, "timestamp": stamps} {
				if v, ok := given[attr]; ok && !form.MatchString(v) {
					t.Errorf("<%s %s=%q>", e.Name.Local, attr, v)
				}
			}
			switch e.Name.Local {
			case "testsuite":
				for _, attr := range []string{"tests", "failures", "errors", "skipped"} {
					n, _ := strconv.Atoi(given[attr])
					claimed[attr] += n
				}
			case "testcase":
				name = given["name"]
			case "failure", "error":
				failed = append(failed, name)
			}
		case xml.EndElement:
			path = path[:len(path)-1]
		}
	}
	if claimed["tests"] != count["testcase"] || claimed["failures"] != count["failure"] || claimed["errors"] != count["error"] || claimed["skipped"] != count["skipped"] {
		t.Errorf("claims %v, has %v", claimed, count)
	}
	return failed
}

// The file is well-formed and of the common shape whatever the titles hold,
// and says the same as the verdict.
func TestJUnit(t *testing.T) {
	t.Parallel()
	hostile := `]]> <!-- </testsuite> & \" ' \u0000 \u0001 \u001b[31m \u007f \u0085 \uFFFE \n <![CDATA[ ü 試 😀`
	dir := folder(t,
		"a & <b>.toml", edited(t, `title = "one storey"`, `title = "`+hostile+`"`),
		"fails.toml", edited(t, "nrmse = 0.05", "nrmse = 0.000001"),
		"moves.toml", short,
		"trips.toml", edited(t, "[[channel.specimen]]", "[channel.limits]\nstroke = \"1 mm\"\n[[channel.specimen]]"),
		"typo.toml", edited(t, "order = 2", "\"or\\u0007<dr\" = 2"),
		"\x01\xff.toml", short,
	)
	moves := filepath.Join(dir, "moves.toml")
	found, err := Find([]string{moves}, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if r := Run(t.Context(), found.Tests, Work{Record: true, Version: hostile}); r[0].State != Recorded {
		t.Fatal(r[0].Err)
	}
	if err := os.WriteFile(moves, []byte(edited(t, "delay = \"8 ms\"\n[accept]", "delay = \"8.05 ms\"\n[accept]")), 0o644); err != nil {
		t.Fatal(err)
	}
	r := checked(t, dir, Options{}, Work{})
	var out bytes.Buffer
	if err := r.WriteJUnit(&out, hostile, time.Now()); err != nil {
		t.Fatal(err)
	}
	failed := validate(t, out.Bytes())
	for _, want := range []string{"run", "limit tracking error, rms", "baseline"} {
		if !slices.Contains(failed, want) {
			t.Errorf("%q did not fail: %v", want, failed)
		}
	}
	for _, want := range []string{"damper.compensator.delay: 8 ms → 8.05 ms", "tracking error, rms: was ", `message="there is no baseline"`, "TRIPPED at "} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("no %q in\n%s", want, out.String())
		}
	}
	if got := states(r); got != "FAIL none, PASS none, FAIL none, FAIL moved, FAIL none, ERROR none" && got != "PASS none, PASS none, FAIL none, FAIL moved, FAIL none, ERROR none" {
		t.Errorf("%s", got)
	}
}
