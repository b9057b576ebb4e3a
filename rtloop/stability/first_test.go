package stability

import (
	"math"
	"math/cmplx"
	"testing"

	"antelag/scenarios"
)

func TestFirst(t *testing.T) {
	for _, name := range scenarios.Names() {
		s, err := scenarios.Load(name)
		if err != nil {
			t.Fatal(err)
		}
		if s.Substructure == nil {
			continue
		}
		loop, err := s.BuildLoop("configured")
		if err != nil {
			t.Fatal(err)
		}
		l, err := loop.Linear()
		if err != nil {
			t.Log(name, err)
			continue
		}
		sys, err := Linearize(l)
		if err != nil {
			t.Fatal(err)
		}
		sp, err := sys.Spectrum()
		if err != nil {
			t.Fatal(err)
		}
		m, err := NewModel(l)
		if err != nil {
			t.Fatal(err)
		}
		e := newEvaluator(m)
		_ = e
		p, err := m.Poles()
		if err != nil {
			t.Error(name, err)
			continue
		}
		u, err := m.Unstable(1)
		modes := m.Modes(p)
		t.Log(modes[0].Shape, sp.Modes[0].Shape)
		t.Log(name, sys.Size(), sp.Radius, sp.Modes[0].Frequency, sp.Modes[0].Damping, cmplx.Abs(p[0])-sp.Radius, u, err, len(p))
		if math.Abs(cmplx.Abs(p[0])-sp.Radius) > 1e-8 {
			t.Error(name, p, sp.Modes[0])
		}
	}
}

func BenchmarkPoles(b *testing.B) {
	s, _ := scenarios.Load("archive")
	loop, _ := s.BuildLoop("configured")
	l, err := loop.Linear()
	if err != nil {
		b.Fatal(err)
	}
	m, _ := NewModel(l)
	b.Run("poles", func(b *testing.B) {
		for b.Loop() {
			m.Poles()
		}
	})
	b.Run("model", func(b *testing.B) {
		for b.Loop() {
			NewModel(l)
		}
	})
	b.Run("at", func(b *testing.B) {
		e := newEvaluator(m)
		for b.Loop() {
			e.at(cmplx.Rect(1, 0.01))
		}
	})
	b.Run("system", func(b *testing.B) {
		for b.Loop() {
			Linearize(l)
		}
	})
	b.Run("spectrum", func(b *testing.B) {
		y, _ := Linearize(l)
		for b.Loop() {
			y.Spectrum()
		}
	})
}
