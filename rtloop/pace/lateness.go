package pace

import (
	"math/bits"
	"sync"
	"sync/atomic"
	"time"

	"github.com/HdrHistogram/hdrhistogram-go"
)

// The histogram reaches from 1 ns to 10 s with three digits; what is longer
// counts as 10 s.
const (
	longest = int64(10 * time.Second)
	digits  = 3
)

// lateness is a histogram into which one goroutine records while others read.
// The recording side holds nothing but a count for each bucket of the HDR
// histogram, written atomically; a reader brings its own histogram up to date
// with what the counts have grown by since it last looked.
//
// Buckets are those of an HDR histogram: values below 2048 have one each;
// above, every doubling of the value is cut into 1024, so that a bucket is
// never wider than a thousandth of its value.
type lateness struct {
	counts []atomic.Int64

	reading sync.Mutex // among readers
	seen    []int64    // the counts that are in all
	all     *hdrhistogram.Histogram
}

const halfBits = 10 // 1<<halfBits ≥ 10^digits

func (l *lateness) init() {
	l.all = hdrhistogram.New(1, longest, digits)
	n := bucket(longest) + 1
	l.counts = make([]atomic.Int64, n)
	l.seen = make([]int64, n)
}

// bucket returns the bucket of a value, ns, which is not negative.
func bucket(v int64) int {
	double := bits.Len64(uint64(v)|(2<<halfBits-1)) - (halfBits + 1)
	return double<<halfBits + int(v>>double)
}

// lowest returns the lowest value of a bucket.
func lowest(bucket int) int64 {
	double := max(0, bucket>>halfBits-1)
	return int64(bucket-double<<halfBits) << double
}

func (l *lateness) record(late time.Duration) {
	c := &l.counts[bucket(max(0, min(int64(late), longest)))]
	c.Store(c.Load() + 1)
}

// percentiles returns the values below which the given percentages lie.
func (l *lateness) percentiles(of ...float64) []time.Duration {
	l.reading.Lock()
	defer l.reading.Unlock()
	for i := range l.counts {
		if n := l.counts[i].Load(); n != l.seen[i] {
			// It cannot fail: the buckets end where the histogram does.
			_ = l.all.RecordValues(lowest(i), n-l.seen[i])
			l.seen[i] = n
		}
	}
	values := make([]time.Duration, len(of))
	for i, percent := range of {
		values[i] = time.Duration(l.all.ValueAtPercentile(percent))
	}
	return values
}
