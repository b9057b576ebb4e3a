package runlog

import (
	"bytes"
	"math"
	"strconv"
	"strings"
)

func fmtRow(b *bytes.Buffer, separator string, cells ...string) {
	b.WriteString(strings.Join(cells, separator))
	b.WriteByte('\n')
}

// row writes row k of a test at 2048 Hz.
func row(b *bytes.Buffer, separator string, k int) {
	f := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	t := float64(k) / 2048
	fmtRow(b, separator, f(t), f(math.Sin(31*t)), f(0.0123*math.Sin(7*t)), f(0.0124*math.Sin(7*t+0.1)), f(0.0122*math.Sin(7*t-0.01)), f(1e5*math.Cos(7*t)), f(0.97+0.01*math.Sin(t)))
}
