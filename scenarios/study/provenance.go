package study

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"strings"

	"github.com/pelletier/go-toml/v2"

	"antelag/scenarios"
)

// Provenance writes what a table comes from: the whole resolved scenario, which
// reads as a scenario again, with the version of the program and the request. The
// same request writes the same text.
func (st *Study) Provenance(version string, shard Shard) (string, error) {
	over := make([]string, len(st.Grid))
	for i := range st.Grid {
		over[i] = st.Grid[i].String()
	}
	pairs := []Pair{{"set", append([]string{}, st.Sets...)}, {"over", over}, {"draws", st.Draws}}
	if st.Draws > 0 {
		pairs = append(pairs, Pair{"law", string(st.Law)}, Pair{"sampling", string(st.Sampling)}, Pair{"seed", st.Seed})
	}
	pairs = append(pairs, Pair{"runs", st.Runs()})
	if !shard.Whole() {
		pairs = append(pairs, Pair{"shard", shard.String()})
	}
	return Provenance(st.Scenario, st.Lane, version, "study", pairs)
}

// Pair is one thing that a provenance says of a request.
type Pair struct {
	Key   string
	Value any // a text, a number, or a list of texts
}

// Provenance writes the whole resolved scenario with the version of the program,
// and what was asked for in a section of that name.
func Provenance(s *scenarios.Scenario, lane, version, section string, pairs []Pair) (string, error) {
	var b strings.Builder
	b.WriteString(s.Resolved())
	line := func(key string, value any) { fmt.Fprintf(&b, "%s = %s\n", key, tomlText(value)) }
	b.WriteString("\n[provenance]\n")
	line("version", version)
	line("scenario", s.Name)
	line("lane", lane)
	sum, err := motion(s)
	if err != nil {
		return "", err
	}
	if sum != "" {
		line("motion_sha256", sum)
	}
	fmt.Fprintf(&b, "\n[provenance.%s]\n", section)
	for _, p := range pairs {
		line(p.Key, p.Value)
	}
	return b.String(), nil
}

// tomlText writes a value as TOML.
func tomlText(v any) string {
	text, err := toml.Marshal(map[string]any{"v": v})
	if err != nil {
		panic(err) // texts and whole numbers always can be
	}
	return strings.TrimSpace(strings.TrimPrefix(string(text), "v = "))
}

// motion is the fingerprint of the file that the excitation is read from, "" if
// it is not read from one: the same scenario with another record in the file is
// another study.
func motion(s *scenarios.Scenario) (string, error) {
	f, err := s.OpenMotion()
	if f == nil || err != nil {
		return "", err
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return "", err
	}
	return fmt.Sprintf("%x", h.Sum(nil)), nil
}

// difference says in what two provenances differ, by the first line that does.
func difference(found, wanted string) error {
	a, b := strings.Split(found, "\n"), strings.Split(wanted, "\n")
	section := ""
	for i := range max(len(a), len(b)) {
		x, y := lineOf(a, i), lineOf(b, i)
		if x != y {
			return fmt.Errorf("is of another study: there %s, here %s", inSection(section, x), inSection(section, y))
		}
		if strings.HasPrefix(x, "[") {
			section = strings.Trim(x, "[]")
		}
	}
	return errors.New("is of another study")
}

func lineOf(lines []string, i int) string {
	if i < len(lines) {
		return lines[i]
	}
	return ""
}

func inSection(section, line string) string {
	switch {
	case line == "":
		return "nothing more of " + section
	case section == "" || strings.HasPrefix(section, "provenance"):
		return line
	}
	return line + " in [" + section + "]"
}

// recorded is what a provenance says of the request.
type recorded struct {
	Provenance struct {
		Version, Lane string
		Scenario      string
		Study         *struct {
			Set, Over     []string
			Draws         int64
			Law, Sampling string
			Seed          int64
			Shard         string
		}
	}
}

// Recorded reads a provenance back: the study, its shard, and the version of the
// program. name is its file; motions are looked for in dir.
func Recorded(name string, text []byte, dir string) (st *Study, shard Shard, version string, err error) {
	var r recorded
	if err := toml.Unmarshal(text, &r); err != nil {
		return nil, shard, "", fmt.Errorf("%s: %w", name, err)
	}
	if r.Provenance.Study == nil {
		return nil, shard, "", fmt.Errorf("%s: is not of a study", name)
	}
	s, err := scenarios.Parse(name, text, dir)
	if err != nil {
		return nil, shard, "", err
	}
	s.Name = r.Provenance.Scenario
	asked := r.Provenance.Study
	req := Request{Lane: r.Provenance.Lane, Sets: asked.Set, Over: asked.Over, Draws: asked.Draws, Seed: asked.Seed}
	if req.Law, err = ParseLaw(asked.Law); err == nil {
		req.Sampling, err = ParseSampling(asked.Sampling)
	}
	if err == nil {
		shard, err = ParseShard(asked.Shard, func(string) (string, bool) { return "", false })
	}
	if err == nil {
		st, err = New(s, req)
	}
	if err != nil {
		return nil, shard, "", fmt.Errorf("%s: %w", name, err)
	}
	return st, shard, r.Provenance.Version, nil
}
