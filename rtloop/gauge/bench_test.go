package gauge

import (
	"math"
	"testing"
)

// signal is one second of a late, slightly weak sine at 2048 Hz, cheap enough
// to index in a benchmark.
func signal() (x, y [2048]float64) {
	for k := range x {
		a := 2 * math.Pi * 3 * float64(k) / 2048
		x[k], y[k] = 0.03*math.Sin(a), 0.029*math.Sin(a-0.1)
	}
	return x, y
}

func BenchmarkTrackingAdd(b *testing.B) {
	x, y := signal()
	t := NewTracking(6826)
	t.Start(x[0], y[0])
	k := 0
	for b.Loop() {
		t.Add(x[k&2047], y[k&2047])
		k++
	}
}

func BenchmarkSubspace(b *testing.B) {
	x, y := signal()
	t := NewTracking(1000)
	t.Start(x[0], y[0])
	for k := range x {
		t.Add(x[k], y[k])
	}
	for b.Loop() {
		_ = t.Subspace()
	}
}

func BenchmarkRecordAdd(b *testing.B) {
	x, y := signal()
	const ticks = 81920
	r := NewRecord(1.0/2048, ticks)
	k := 0
	for b.Loop() {
		if k == ticks {
			r.Start(0, 0)
			k = 0
		}
		r.Add(x[k&2047], y[k&2047])
		k++
	}
}

func BenchmarkRecordFinish(b *testing.B) {
	const ticks = 81920
	x, y := signal()
	r := NewRecord(1.0/2048, ticks)
	r.Start(0, 0)
	for k := range ticks {
		r.Add(x[k&2047], y[k&2047])
	}
	for b.Loop() {
		_ = r.Finish()
	}
}

func BenchmarkEnergyAdd(b *testing.B) {
	x, y := signal()
	var ticks [64]EnergyTick
	for k := range ticks {
		u, v := x[k*32], y[k*32]
		ticks[k] = EnergyTick{Injected: u * v, Specimen: u, Input: v, VCV: u * u, VMV: v * v, AMA: u * u}
	}
	e := NewEnergy(6826, 1.0/2048)
	e.Start(EnergyTick{})
	k := 0
	var sum float64
	for b.Loop() {
		e.Add(&ticks[k&63])
		sum += e.Margin()
		k++
	}
}
