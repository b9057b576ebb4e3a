package check

import (
	"context"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"antelag/rtloop/excitation"
	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/accept/baseline"
)

// testdata holds the baselines of the embedded scenarios, recorded there by
//
//	antelag check --record $(antelag scenarios | cut -d' ' -f1)
const recorded = "testdata"

// The embedded scenarios come to the figures that were recorded, on whatever
// machine this runs. One that fails here without a bug was changed, by its own
// text, a default, a model or a gauge: record it anew and say why.
func TestEmbeddedScenariosAreAsRecorded(t *testing.T) {
	t.Parallel()
	for _, r := range Run(context.Background(), embedded(t), Work{}) {
		if r.State != Same {
			t.Errorf("%s: %s, %v", r.Name, r.State, r.Err)
			for _, row := range r.moves() {
				t.Errorf("    %s: was %s, is %s, allowed %s", row.What, row.Was, row.Is, row.Allowed)
			}
		}
	}
}

// embedded are the embedded scenarios with their recorded baselines.
func embedded(t *testing.T) []*Test {
	t.Helper()
	var names []string
	for i, name := range scenarios.Names() {
		if i%every == 0 {
			names = append(names, name)
		}
	}
	found, err := Find(names, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, test := range found.Tests {
		test.Path = recorded + "/" + test.Path
		if test.Baseline, err = baseline.Read(test.Path); err != nil {
			t.Fatal(err)
		}
	}
	return found.Tests
}

// jittered is a motion whose every sample is off by a rounding, up or down.
type jittered struct {
	excitation.Source
	draw *rand.Rand
}

func (j jittered) Fill(dst []float64) {
	j.Source.Fill(dst)
	for i, x := range dst {
		dst[i] = math.Nextafter(x, math.Inf(j.draw.IntN(2)*2-1))
	}
}

// Another machine rounds otherwise. A rounding of every sample of the motion
// has the same effect on a run, and grows in the loop as far as roundings do;
// what it comes to is a tenth of the tolerances or less. The measured figure,
// over 25 seeds, fused multiply-adds and another processor, is a twenty-fifth.
func TestRoundingStaysFarBelowTheTolerances(t *testing.T) {
	t.Parallel()
	for _, test := range embedded(t) {
		t.Run(test.Name, func(t *testing.T) {
			t.Parallel()
			for seed := range rounds() {
				rig, err := test.Scene.Build()
				if err != nil {
					t.Fatal(err)
				}
				rig.Motion = jittered{rig.Motion, rand.New(rand.NewPCG(seed, 1))}
				v, err := accept.RunOn(context.Background(), test.Scene, rig, accept.Options{})
				if err != nil {
					t.Fatal(err)
				}
				c := test.Baseline.Compare(baseline.From(v, ""))
				t.Logf("seed %d: %.2g of a tolerance", seed, c.Widest)
				if !c.Same() || c.Widest > 0.1 {
					t.Errorf("seed %d: %+v", seed, c)
				}
			}
		})
	}
}

// rounds is how many seeds are tried: one, or more where it is asked for.
func rounds() uint64 {
	if os.Getenv("ANTELAG_ROUNDINGS") != "" {
		return 25
	}
	return 1
}
