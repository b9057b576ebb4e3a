package handoff

import (
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"testing"
	"time"

	"antelag/compensator"
)

// BenchmarkStep is a step of every kind in Go, ns/op, and beside it that of the C
// that is handed over, at -O2, with its guard: ns in C, in double and in float, ns in
// Go, the fastest lap on either side, and how many times the C's time in double Go
// takes, ×C. Both go through the first
// 1024 steps of the vectors again and again. Where there is no C compiler, only Go
// is measured.
func BenchmarkStep(b *testing.B) {
	compiler := ""
	for _, name := range []string{"cc", "gcc", "clang"} {
		if path, err := exec.LookPath(name); err == nil {
			compiler = path
			break
		}
	}
	for _, v := range variants()[:len(compensator.Kinds.Entries)] {
		b.Run(v.kind, func(b *testing.B) {
			files, _ := written(b, of(b, v, 2048, usual))
			ns := benchmarkGo(b, v, read(b, files["vectors.csv"]))
			if compiler == "" {
				b.Log("no C line: neither cc, gcc nor clang is on the PATH")
				return
			}
			double, float := timeC(b, compiler, files)
			b.ReportMetric(double, "ns-C")
			b.ReportMetric(float, "ns-C-float")
			if ns > 0 {
				b.ReportMetric(ns, "ns-Go")
				b.ReportMetric(ns/double, "×C")
			}
		})
	}
}

// benchmarkGo returns the time of a step in the fastest lap, ns; 0 if there was
// none.
func benchmarkGo(b *testing.B, v variant, rows []row) float64 {
	e, err := compensator.Kinds.Find(v.kind)
	if err != nil {
		b.Fatal(err)
	}
	comp, err := e.New(1.0/2048, v.values(b))
	if err != nil {
		b.Fatal(err)
	}
	rows = rows[1:1025]
	b.ReportAllocs()
	b.ResetTimer()
	const lap = 1 << 17
	var fastest, began time.Duration
	for i := range b.N {
		if i&1023 == 0 {
			comp.Start(0, 0)
			if i&(lap-1) == 0 {
				if took := b.Elapsed() - began; i > 0 && (fastest == 0 || took < fastest) {
					fastest = took
				}
				began = b.Elapsed()
			}
		}
		sink = comp.Command(rows[i&1023].in)
	}
	b.StopTimer()
	return float64(fastest.Nanoseconds()) / lap
}

var sink float64

// timeC compiles a handoff and returns what its self-test says that a step takes,
// ns, in double and in float: the best of three.
func timeC(b *testing.B, compiler string, files map[string]string) (double, float float64) {
	dir := b.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			b.Fatal(err)
		}
	}
	times := [2]float64{}
	for i, args := range [][]string{nil, {"-DANTELAG_FLOAT"}} {
		args = append(args, "-std=c99", "-O2", "-ffp-contract=off", "-o", "program", "selftest.c", "antelag_damper.c", "-lm")
		cmd := exec.Command(compiler, args...)
		cmd.Dir = dir
		if out, err := cmd.CombinedOutput(); err != nil {
			b.Fatalf("%v\n%s", err, out)
		}
		for range 3 {
			cmd = exec.Command(filepath.Join(dir, "program"), "vectors.csv", "1000000")
			cmd.Dir = dir
			out, err := cmd.CombinedOutput()
			m := regexp.MustCompile(`: ([0-9.]+) ns a step`).FindSubmatch(out)
			if err != nil || m == nil {
				b.Fatalf("%v\n%s", err, out)
			}
			ns, err := strconv.ParseFloat(string(m[1]), 64)
			if err != nil {
				b.Fatal(err)
			}
			if times[i] == 0 || ns < times[i] {
				times[i] = ns
			}
		}
	}
	return times[0], times[1]
}
