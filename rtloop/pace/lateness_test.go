package pace

import (
	"math"
	"math/rand/v2"
	"slices"
	"sync"
	"testing"
	"time"

	"github.com/HdrHistogram/hdrhistogram-go"
)

// values are spread over all decades of the histogram, its edges among them.
func values(n int) []int64 {
	random := rand.New(rand.NewPCG(5, 6))
	v := []int64{0, 1, 2, 1023, 1024, 2047, 2048, 2049, 4095, 4096, 4097, longest - 1, longest}
	for len(v) < n {
		v = append(v, int64(math.Exp(random.Float64()*math.Log(float64(longest)))))
	}
	return v
}

// TestBucketsAreHDR: what is recorded here, bucket by bucket, gives the very
// histogram that the library makes of the same values.
func TestBucketsAreHDR(t *testing.T) {
	var l lateness
	l.init()
	want := hdrhistogram.New(1, longest, digits)
	for _, v := range values(100_000) {
		l.record(time.Duration(v))
		if err := want.RecordValue(v); err != nil {
			t.Fatal(err)
		}
	}
	l.percentiles()
	if !l.all.Equals(want) {
		t.Error("the histograms differ")
	}
	for i := range l.counts {
		if bucket(lowest(i)) != i {
			t.Fatalf("bucket %d begins with %d, which is in bucket %d", i, lowest(i), bucket(lowest(i)))
		}
	}
}

// TestPercentiles against those of the sorted values: the smallest of them
// that so many percent do not exceed. A bucket is a thousandth of its value
// wide, 1/1024.
func TestPercentiles(t *testing.T) {
	p, f := onFake(t, 10)
	v := values(50_000)
	for _, late := range v {
		f.oversleep = func(int) time.Duration { return p.margin.length() + time.Duration(late) }
		p.Wait()
		p.Pause()
	}
	slices.Sort(v)
	r := p.Report()
	for _, c := range []struct {
		percent float64
		got     time.Duration
	}{{50, r.P50}, {90, r.P90}, {99, r.P99}, {99.9, r.P999}} {
		want := v[int(math.Ceil(c.percent/100*float64(len(v))))-1]
		if int64(c.got) < want || float64(c.got) > float64(want)*(1+1.0/1024) {
			t.Errorf("P%g is %d ns, want %d ns", c.percent, c.got, want)
		}
	}
	if r.Max != 10*time.Second {
		t.Errorf("the worst is %v", r.Max)
	}
}

// TestBeyondTheHistogram: what is longer than the histogram counts as its
// longest; the worst is exact.
func TestBeyondTheHistogram(t *testing.T) {
	p, f := onFake(t, 1e-3)
	p.Wait()
	f.work(time.Hour)
	p.Wait()
	r := p.Report()
	if r.Max != time.Hour-ms || r.P50 != 0 || r.P999 < 10*time.Second || r.P999 > 10*time.Second*1025/1024 {
		t.Errorf("%+v", r)
	}
}

// TestReportElsewhere: reports from other goroutines are whole at any time:
// counts only grow, no more ticks are late than there are, percentiles are in
// order; and the last one has everything. Under the race detector it shows
// that nothing is shared unguarded.
func TestReportElsewhere(t *testing.T) {
	p, f := onFake(t, 1e-3)
	f.oversleep = func(n int) time.Duration { return time.Duration(n%1000) * 2 * us } // up to 2 ms
	done := make(chan struct{})
	var readers sync.WaitGroup
	for range 3 {
		readers.Go(func() {
			var last Report
			for over := false; !over; {
				select {
				case <-done:
					over = true
				default:
				}
				r := p.Report()
				if r.Ticks < last.Ticks || r.Late < last.Late || r.Overruns < last.Overruns || r.Max < last.Max ||
					r.Late > r.Ticks || r.Overruns > r.Late ||
					r.P50 > r.P90 || r.P90 > r.P99 || r.P99 > r.P999 || r.P999 > r.Max {
					t.Errorf("%+v after %+v", r, last)
				}
				last = r
			}
		})
	}
	p.LockProgram()
	p.Run(t.Context(), 50_000, func() {})
	p.Unlock()
	close(done)
	readers.Wait()
	r := p.Report()
	p.tally.reading.Lock()
	defer p.tally.reading.Unlock()
	if r.Ticks != 50_000 || p.tally.all.TotalCount() != 50_000 || r.Overruns == 0 || len(r.Granted) == 0 {
		t.Errorf("%+v, %d in the histogram", r, p.tally.all.TotalCount())
	}
}

func BenchmarkReport(b *testing.B) {
	f := &fake{}
	p, err := NewOn(1e-3, f)
	if err != nil {
		b.Fatal(err)
	}
	for _, v := range values(100_000) {
		p.tally.record(time.Duration(v))
	}
	b.ReportAllocs()
	for b.Loop() {
		p.Report()
	}
}
