package runlog

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"
)

// written is a table of about so many bytes, with numbers as Writer writes them.
func written(separator string, size int) []byte {
	var b bytes.Buffer
	fmtRow(&b, separator, "time_s", "ground_m_s2", "damper.target_m", "damper.command_m", "damper.measured_m", "damper.force_N", "energy_margin")
	for k := 0; b.Len() < size; k++ {
		row(&b, separator, k)
	}
	return b.Bytes()
}

// BenchmarkRead reads tables of 32 MB, one core.
func BenchmarkRead(b *testing.B) {
	for _, c := range []struct{ name, separator string }{{"comma", ","}, {"semicolon", ";"}, {"blank", " "}} {
		b.Run(c.name, func(b *testing.B) {
			text := written(c.separator, 32e6)
			path := filepath.Join(b.TempDir(), "log.csv")
			if err := os.WriteFile(path, text, 0o644); err != nil {
				b.Fatal(err)
			}
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				r, err := Open(path, Options{})
				if err != nil {
					b.Fatal(err)
				}
				for r.Next() {
				}
				if r.Err() != nil {
					b.Fatal(r.Err())
				}
				r.Close()
			}
		})
	}
}

// BenchmarkNumber reads numbers as logs hold them, here and by strconv.
func BenchmarkNumber(b *testing.B) {
	var texts [][]byte
	size := 0
	for k := range 1024 {
		t := float64(k) / 2048
		for _, v := range []float64{t, 0.0123 * math.Sin(7*t), 1e5 * math.Cos(7*t)} {
			texts = append(texts, strconv.AppendFloat(nil, v, 'g', -1, 64))
			size += len(texts[len(texts)-1])
		}
	}
	b.Run("scan", func(b *testing.B) {
		b.SetBytes(int64(size))
		for b.Loop() {
			for _, text := range texts {
				scan(text, '.')
			}
		}
	})
	b.Run("strconv", func(b *testing.B) {
		b.SetBytes(int64(size))
		for b.Loop() {
			for _, text := range texts {
				strconv.ParseFloat(string(text), 64) //nolint:errcheck // FormatFloat wrote it
			}
		}
	})
}
