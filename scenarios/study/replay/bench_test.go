package replay

import (
	"context"
	"os"
	"testing"
)

// BenchmarkReplay judges a log of ten minutes at 1000 rows a second, every gauge
// over the whole record and in windows.
func BenchmarkReplay(b *testing.B) {
	path := logged(b, 600, func(float64) (float64, float64) { return 1.01, 0.003 })
	info, err := os.Stat(path)
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(info.Size())
	for b.Loop() {
		if _, err := Of(context.Background(), path, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
