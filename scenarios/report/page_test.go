package report

import (
	"math"
	"regexp"
	"strconv"
	"testing"

	"antelag/scenarios/accept"
)

var emptyLane accept.Lane

// shade reads #rrggbb as relative luminance (WCAG 2.2).
func shade(t *testing.T, hex string) float64 {
	t.Helper()
	sum := 0.0
	for i, weight := range []float64{0.2126, 0.7152, 0.0722} {
		n, err := strconv.ParseUint(hex[1+2*i:3+2*i], 16, 8)
		if err != nil {
			t.Fatal(err)
		}
		v := float64(n) / 255
		if v <= 0.04045 {
			v /= 12.92
		} else {
			v = math.Pow((v+0.055)/1.055, 2.4)
		}
		sum += weight * v
	}
	return sum
}

// All words of the page stand out from what they stand on by 4.5 at least
// (WCAG 2.2, 1.4.3), and what shows the focus by 3 (1.4.11).
func TestContrast(t *testing.T) {
	colours := map[string]string{}
	for _, m := range regexp.MustCompile(`--([a-z]+): (#[0-9a-f]{6});`).FindAllStringSubmatch(pageStyle, -1) {
		colours[m[1]] = m[2]
	}
	for _, pair := range [][2]string{{"ink", "paper"}, {"quiet", "paper"}, {"pass", "paper"}, {"fail", "paper"}, {"done", "paper"}, {"link", "paper"}, {"ink", "caution"}, {"ink", "shade"}} {
		a, b := shade(t, colours[pair[0]]), shade(t, colours[pair[1]])
		if ratio := (math.Max(a, b) + 0.05) / (math.Min(a, b) + 0.05); ratio < 4.5 {
			t.Errorf("%s on %s has a contrast of %.2f", pair[0], pair[1], ratio)
		}
	}
	// No other colours are used but one for the foot of a printed page.
	for _, m := range regexp.MustCompile(`[^-a-z]#[0-9a-fA-F]{3,8}`).FindAllString(regexp.MustCompile(`:root \{.*\}`).ReplaceAllString(pageStyle, ""), -1) {
		if m[1:] != "#555555" {
			t.Errorf("a colour %s that is not judged here", m[1:])
		}
	}
}

func TestNamesOfPictures(t *testing.T) {
	picture := Part{Pictures: []Picture{{Name: "damper-tracking"}}}
	p := &Page{Tests: []*Test{
		{Name: "some where/my test.toml", Parts: []Part{picture}}, {Name: "other/my test.toml", Parts: []Part{picture}}, {Name: "../..", Parts: []Part{picture}},
	}}
	var got []string
	for _, f := range p.Files() {
		got = append(got, f.Name)
	}
	want := []string{"my-test-damper-tracking.svg", "my-test-damper-tracking.png", "my-test-2-damper-tracking.svg", "my-test-2-damper-tracking.png", "..-damper-tracking.svg", "..-damper-tracking.png"}
	for i := range want {
		if i >= len(got) || got[i] != want[i] {
			t.Fatalf("%q, want %q", got, want)
		}
	}
}

// Of several tests the page says first how many passed.
func TestSummary(t *testing.T) {
	for _, c := range []struct {
		words       []string
		worst, want string
	}{
		{[]string{"PASS", "PASS"}, "PASS", "Of 2 tests: 2 passed."},
		{[]string{"PASS", "FAIL", "DONE"}, "FAIL", "Of 3 tests: 1 passed, 1 failed and 1 ran without limits to be judged by."},
		{[]string{"PASS", recordWord}, "DONE", "Of 2 tests: 1 passed and 1 of records, which are not judged."},
	} {
		v := view{Page: &Page{}}
		for _, w := range c.words {
			v.Tests = append(v.Tests, &Test{Word: w})
		}
		if v.Worst() != c.worst || v.Summary() != c.want {
			t.Errorf("%s %s", v.Worst(), v.Summary())
		}
	}
}
