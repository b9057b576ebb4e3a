package substructure

import (
	"fmt"
	"testing"
)

// equalStoreys is a building of n equal storeys, 60 t and 18 kN/mm, with two
// ratios of Rayleigh damping where there are two modes.
func equalStoreys(tb testing.TB, n int) *Structure {
	tb.Helper()
	storeys := make([]Storey, n)
	for i := range storeys {
		storeys[i] = Storey{Mass: 60e3, Stiffness: 18e6}
	}
	s, err := FromStoreys(storeys, Damping{Ratios: []float64{0.03}}, []Attachment{{From: 0, To: 1, Stiffness: 6e6}})
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

func BenchmarkTick(b *testing.B) {
	for _, name := range Names() {
		for _, n := range []int{1, 4, 20} {
			b.Run(fmt.Sprintf("%s/n=%d", name, n), func(b *testing.B) {
				s := equalStoreys(b, n)
				in, err := New(name, s, 1.0/2048)
				if err != nil {
					b.Fatal(err)
				}
				p := make([]float64, n)
				s.GroundLoad(p, 1)
				b.ReportAllocs()
				for b.Loop() {
					in.Predict()
					in.Correct(p)
				}
			})
		}
	}
}

func BenchmarkEnergies(b *testing.B) {
	for _, n := range []int{1, 4, 20} {
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			s := equalStoreys(b, n)
			in, err := New("CR", s, 1.0/2048)
			if err != nil {
				b.Fatal(err)
			}
			p := make([]float64, n)
			s.GroundLoad(p, 1)
			in.Start(nil, p)
			in.Predict()
			v, a, total := in.V(), in.A(), 0.0
			b.ReportAllocs()
			for b.Loop() {
				total = s.VCV(v) + s.VMV(v) + s.AMA(a) + in.Strain()
			}
			if total < 0 {
				b.Fatal("negative energy")
			}
		})
	}
}

// BenchmarkBuild shows what a sweep or map pays for each structure.
func BenchmarkBuild(b *testing.B) {
	for _, n := range []int{1, 4, 20} {
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			for b.Loop() {
				if _, err := New("CR", equalStoreys(b, n), 1.0/2048); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
