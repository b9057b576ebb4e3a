package plant

import (
	"fmt"
	"math"
	"testing"
)

var fineStep=true
func TestBoucWenAgainstAnODESolver(t *testing.T) {
	var vectors struct {
		Made  string
		Cases []struct {
			Name    string
			N, Beta float64
			Y, Z    []float64
		}
	}
	load(t, "testdata/boucwen.json", &vectors)
	for _, c := range vectors.Cases {
		b := NewBoucWen(1, 1, 0, c.N, c.Beta)
		if fineStep { b.step/=16 }
		b.Start(0)
		worst := 0.0
		for k, y := range c.Y {
			worst = max(worst, math.Abs(b.Advance(y, 0, 0)-c.Z[k]))
		}
		fmt.Printf("%s n=%v beta=%v: %.2g\n", c.Name, c.N, c.Beta, worst)
	}
}
