package rtloop

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// The standard case once more, fused by hand in C (testdata/fused.c): what the
// arithmetic of a tick costs without parts that can be exchanged, and a second
// opinion on what it comes to.

// cCompiler returns a C compiler of this machine, "" where there is none.
func cCompiler() string {
	for _, name := range []string{"cc", "gcc", "clang"} {
		if path, err := exec.LookPath(name); err == nil {
			return path
		}
	}
	return ""
}

const noCompiler = "no C line: neither cc, gcc nor clang is on the PATH"

// buildFused compiles the C at -O2 and returns the program.
func buildFused(tb testing.TB, compiler string) string {
	tb.Helper()
	// A result of go test is kept until a file changes that it saw opened; what
	// the compiler opens it does not see.
	sources, err := filepath.Glob(filepath.Join("testdata", "*.[ch]"))
	if err != nil {
		tb.Fatal(err)
	}
	for _, name := range sources {
		if _, err := os.Stat(name); err != nil {
			tb.Fatal(err)
		}
	}
	program := filepath.Join(tb.TempDir(), "fused")
	out, err := exec.Command(compiler, "-std=c99", "-O2", "-Wall", "-Wextra", "-Wpedantic",
		"-o", program, filepath.Join("testdata", "fused.c"), "-lm").CombinedOutput()
	if err != nil {
		tb.Fatalf("%s: %v\n%s", compiler, err, out)
	}
	return program
}

// runFused runs tests of so many ticks and returns what the C prints: the time
// of a tick in the fastest test, ns_per_tick, and the figures of the last one.
func runFused(tb testing.TB, program string, ticks, repeats int) map[string]float64 {
	tb.Helper()
	out, err := exec.Command(program, strconv.Itoa(ticks), strconv.Itoa(repeats)).Output()
	if err != nil {
		tb.Fatalf("fused C: %v", err)
	}
	figures := map[string]float64{}
	for line := range strings.Lines(string(bytes.TrimSpace(out))) {
		var name string
		var value float64
		if _, err := fmt.Sscan(line, &name, &value); err != nil {
			tb.Fatalf("fused C: %q: %v", line, err)
		}
		figures[name] = value
	}
	return figures
}

func TestFusedC(t *testing.T) {
	compiler := cCompiler()
	if compiler == "" {
		t.Log(noCompiler)
		return
	}
	t.Run("comes to the same", func(t *testing.T) { compareFused(t, buildFused(t, compiler)) })
}

func compareFused(t *testing.T, program string) {
	const ticks = 200_000
	c := runFused(t, program, ticks, 2) // the second test must begin afresh

	l := standardLoop(t, "polynomial", ticks)
	motion := standardMotion()
	l.Start(motion[0])
	var targets, measured float64
	for i := range ticks {
		l.Tick(motion[i&(len(motion)-1)])
		row := l.Row(0)
		targets += row.Target
		measured += row.Measured
	}
	ch := &l.channels[0]
	track, totals, ellipse := ch.tracking, l.energy.Totals(), l.Subspace(0)
	window := math.Round(l.cfg.Window / l.dt)

	// The C does the same operations in the same order, but not to the last
	// bit: a compiler may fuse a product into a sum on one side only, the two
	// mathematical libraries round sines and exponentials differently, and the
	// set-up takes the frequency from a root there and from an eigenvalue here.
	// A tick then differs by some 1e-16 of the peak. Damping forgets that within
	// 1/(ζω·dt) = 7000 ticks, so the states stay within some 1e-12 of their
	// peaks, and so do the sums, which are compensated or no older than two
	// windows. 1e-9 leaves a thousand times that; a sample misplaced or a term
	// left out shows at 1e-7 or above, save what only guards against rounding.
	const tolerance = 1e-9
	length := track.PeakTarget()
	for _, f := range []struct {
		name         string
		value, scale float64
	}{
		{"outcome", float64(l.Outcome()), 1},
		{"window", window, 1},
		{"x", l.Displacements()[0], length},
		{"command", ch.command, length},
		{"measured", ch.measured, length},
		{"velocity", ch.velocity, ch.peakVelocity},
		{"force", ch.force, ch.peakForce},
		{"peak_command", ch.peakCommand, length},
		{"peak_velocity", ch.peakVelocity, ch.peakVelocity},
		{"peak_command_velocity", ch.peakHurry, ch.peakHurry},
		{"peak_force", ch.peakForce, ch.peakForce},
		// Of the kept record: how much there is, and that every sample is there.
		{"record_ticks", ticks, 1},
		{"record_target", targets, ticks * length},
		{"record_measured", measured, ticks * length},
		{"nrmse", track.NRMSE(), track.NRMSE()},
		{"amplitude_ratio", track.AmplitudeRatio(), 1},
		{"indicator", track.Indicator(), track.Indicator()},
		{"peak_error", track.PeakError(), track.PeakError()},
		{"peak_target", track.PeakTarget(), length},
		{"subspace_centre_x", ellipse.CenterX, length},
		{"subspace_centre_y", ellipse.CenterY, length},
		{"subspace_major", ellipse.Major, length},
		// A root of what is left of a difference: 3e-4 of its terms.
		{"subspace_minor", ellipse.Minor, length},
		{"subspace_delay", ellipse.Delay, ellipse.Delay},
		{"margin", l.Margin(), 1},
		{"margin_min", l.energy.MarginMin(), 1},
		{"window_added_damping", l.energy.AddedDamping(), l.energy.AddedDamping()},
		{"injected", totals.Injected, totals.Injected},
		{"damped", totals.Damped, totals.Damped},
		{"specimen", totals.Specimen, totals.Specimen},
		{"dissipated", totals.Dissipated, totals.Dissipated},
		{"input", totals.Input, totals.Input},
		{"kinetic", totals.Kinetic, totals.Input},
		{"strain", totals.Strain, totals.Input},
		{"added_damping", totals.AddedDamping, totals.AddedDamping},
	} {
		got, ok := c[f.name]
		if !ok || !(math.Abs(got-f.value) <= tolerance*math.Abs(f.scale)) {
			t.Errorf("%s: %.17g in C, %.17g here, scale %g", f.name, got, f.value, f.scale)
		}
	}
}
