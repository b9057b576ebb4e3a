package handoff

import (
	"slices"
	"strings"
	"testing"
	"unicode/utf8"
)

func TestIdentifiers(t *testing.T) {
	for _, c := range []struct {
		name  string
		names []string
		want  []string
	}{
		{"plain", []string{"damper"}, []string{"antelag_damper"}},
		{"hyphen and space", []string{"brace-low", "the other"}, []string{"antelag_brace_low", "antelag_the_other"}},
		{"keywords and names of files", []string{"int", "math", "con", "float"}, []string{"antelag_int", "antelag_math", "antelag_con", "antelag_float"}},
		{"digits first", []string{"1st", "2"}, []string{"antelag_1st", "antelag_2"}},
		{"underscores", []string{"_a", "__x__"}, []string{"antelag__a", "antelag___x__"}},
		{"other letters", []string{"dämpfer", "阻尼器"}, []string{"antelag_d_mpfer", "antelag____"}},
		{"those that come to the same", []string{"a-b", "a_b", "A.B", "a_b_2"}, []string{"antelag_a_b", "antelag_a_b_2", "antelag_a_b_3", "antelag_a_b_2_2"}},
		{"nothing", []string{"", ""}, []string{"antelag_channel", "antelag_channel_2"}},
		{"what would be code", []string{"*/ system(\"x\"); /*", "a\nb", "../up"}, []string{"antelag____system__x______", "antelag_a_b", "antelag____up"}},
		{"long", []string{strings.Repeat("x", 100)}, []string{"antelag_" + strings.Repeat("x", 40)}},
	} {
		var channels []Channel
		for _, n := range c.names {
			channels = append(channels, Channel{Name: n})
		}
		got := identifiers(channels)
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
}

// Whatever people write as title or name, the C is the same but for its comments,
// and these end where they should.
func FuzzComment(f *testing.F) {
	for _, s := range []string{
		"plain", "*/ int evil; /*", "**//", "/*/", "??/", "???/\n/", "a\\", "\\\n", "<script>alert(1)</script>", "@ $ %INPUT% %s",
		"\u202e right to left", "\x00\xff", strings.Repeat("long ", 100), strings.Repeat("x", 300), "*\\", "* /", "/ *", "",
	} {
		f.Add(s)
	}
	want, _ := written(f, of(f, variant{"taylor", nil}, 1000, usual))
	f.Fuzz(func(t *testing.T, s string) {
		test := of(t, variant{"taylor", nil}, 1000, usual)
		test.Title, test.Scenario, test.Lane, test.Version = s, s, s, s
		u := &unit{Channel: test.Channels[0], test: test, ident: "antelag_damper", tick: 1e-3}
		u.Name = s
		comp, err := u.build()
		if err != nil {
			t.Fatal(err)
		}
		u.code = taylorMethod.write(tuned{u.tick, u.Values, comp})
		for name, text := range map[string]string{"antelag_damper.h": string(u.header()), "antelag_damper.c": string(u.source())} {
			// A compiler splices lines that end in a backslash first, and
			// takes trigraphs for what they stand for before that.
			if strings.Contains(text, "??") {
				t.Fatalf("a trigraph:\n%s", text)
			}
			spliced := strings.ReplaceAll(text, "\\\n", "")
			if stripped(spliced) != stripped(want[name]) {
				t.Fatalf("%q changes %s:\n%s", s, name, text)
			}
			for _, c := range bare.FindAllString(spliced, -1) {
				if strings.Contains(c[2:], "/*") {
					t.Fatalf("a comment in a comment:\n%s", c)
				}
			}
			if i := strings.IndexFunc(text, func(r rune) bool { return r >= utf8.RuneSelf || r == utf8.RuneError || r < ' ' && r != '\n' }); i >= 0 {
				t.Fatalf("no ASCII at %d:\n%s", i, text)
			}
		}
		if text := string(makefile(test, "x", []*unit{u})); strings.Index(text, "\n") != strings.Index(text, "digest of the scenario x")+len("digest of the scenario x") {
			t.Fatalf("the Makefile begins\n%.200s", text)
		}
	})
}

// stripped is a C text without its comments, found as a compiler finds them.
func stripped(text string) string {
	var b strings.Builder
	for {
		before, rest, ok := strings.Cut(text, "/*")
		b.WriteString(before)
		if !ok {
			return b.String()
		}
		_, text, _ = strings.Cut(rest, "*/")
	}
}
