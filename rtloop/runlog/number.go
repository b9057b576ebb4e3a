package runlog

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"math/bits"
	"strconv"
	"unsafe"
)

// largest is the largest magnitude that a log may hold, in the file's own
// unit: what is larger is a slip, and its square would overflow sums.
const largest = 1e15

// scan reads the decimal number at the start of b, with a point or the given mark
// for its decimal mark. n is how many bytes it took; 0 if there is no
// number, or one of a form that it leaves to value. What it returns is the
// float64 nearest to the decimal number, exactly as strconv.ParseFloat has it.
func scan(b []byte, mark byte) (v float64, n int) {
	i, negative := 0, false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		i = 1
	}
	var m uint64
	first := i
	for i < len(b) && b[i]-'0' <= 9 {
		m = m*10 + uint64(b[i]-'0')
		i++
	}
	digits, power := i-first, 0
	if i < len(b) && (b[i] == '.' || b[i] == mark) {
		i++
		from := i
		for len(b)-i >= 8 {
			v, ok := eight(b[i:])
			if !ok {
				break
			}
			m = m*1e8 + v
			i += 8
		}
		for i < len(b) && b[i]-'0' <= 9 {
			m = m*10 + uint64(b[i]-'0')
			i++
		}
		power = from - i
		digits -= power
	}
	if digits == 0 || digits > 19 && significant(b[first:i]) > 19 {
		return 0, 0
	}
	if i < len(b) && (b[i]|0x20) == 'e' {
		e, used := exponent(b[i+1:])
		if used == 0 {
			return 0, 0
		}
		power += e
		i += 1 + used
	}
	v, ok := decimal(m, power)
	if !ok {
		return 0, 0
	}
	if negative {
		v = -v
	}
	return v, i
}

// eight reads eight digits at once: pairs of them are added up in bytes, pairs of
// those in two bytes, and so on (Lemire 2018, from memory).
func eight(b []byte) (v uint64, ok bool) {
	v = binary.LittleEndian.Uint64(b)
	if v&0xf0f0f0f0f0f0f0f0|(v+0x0606060606060606)&0xf0f0f0f0f0f0f0f0>>4 != 0x3333333333333333 {
		return 0, false
	}
	v -= 0x3030303030303030
	v = v*10 + v>>8
	return (v&0x000000ff000000ff*0x000f424000000064 + v>>16&0x000000ff000000ff*0x0000271000000001) >> 32, true
}

// significant counts the digits of a number's digits behind its leading zeros.
func significant(digits []byte) int {
	n := 0
	for _, c := range digits {
		if c-'0' <= 9 && (n > 0 || c != '0') {
			n++
		}
	}
	return n
}

// exponent reads a signed whole number of at most four digits.
func exponent(b []byte) (e, n int) {
	sign := 1
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		if b[0] == '-' {
			sign = -1
		}
		n = 1
	}
	from := n
	for n < len(b) && b[n]-'0' <= 9 && n-from < 5 {
		e = 10*e + int(b[n]-'0')
		n++
	}
	if n == from || n-from > 4 {
		return 0, 0
	}
	return sign * e, n
}

// The powers that float64 and uint64 hold exactly.
var (
	tens  [23]float64 // 10⁰ … 10²²
	fives [28]uint64  // 5⁰ … 5²⁷
)

func init() {
	tens[0], fives[0] = 1, 1
	for i := 1; i < len(tens); i++ {
		tens[i] = 10 * tens[i-1]
	}
	for i := 1; i < len(fives); i++ {
		fives[i] = 5 * fives[i-1]
	}
}

// decimal returns m·10^power rounded to nearest, ties to even; ok is false where
// neither of its two ways is exact.
//
// Where m and 10^|power| are both float64, one operation rounds once. Else a
// negative power is a division by 5^k, k = −power, of whole numbers, carried to
// 63 bits or more with its remainder, and then rounded to 53.
func decimal(m uint64, power int) (v float64, ok bool) {
	switch {
	case m == 0:
		return 0, true
	case m < 1<<53 && power <= 0 && power > -len(tens):
		return float64(m) / tens[-power], true
	case m < 1<<53 && power > 0 && power < len(tens):
		return float64(m) * tens[power], true
	case power == 0:
		return float64(m), true
	case power > 0 || power <= -len(fives):
		return 0, false
	}
	k := -power
	up, upBy := bits.LeadingZeros64(m), bits.LeadingZeros64(fives[k])
	m <<= up
	q, rest := bits.Div64(m>>1, m<<63, fives[k]<<upBy) // m/5^k = q·2^(upBy−up−63)
	drop := 11 - bits.LeadingZeros64(q)
	whole, low, half := q>>drop, q&(1<<drop-1), uint64(1)<<(drop-1)
	if low > half || low == half && (rest != 0 || whole&1 != 0) {
		whole++
	}
	return float64(whole) * math.Float64frombits(uint64(1023+upBy-up-63-k+drop)<<52), true
}

// missing are the texts, in lower case, that programs write for a value that
// there is not.
var missing = map[string]bool{
	"": true, "nan": true, "-nan": true, "+nan": true, "na": true, "n/a": true, "-": true, "--": true, "null": true, "none": true, "#n/a": true, "#nv": true,
	"inf": true, "+inf": true, "-inf": true, "infinity": true, "-infinity": true, "#num!": true, "#value!": true, "#div/0!": true,
	"1.#qnan": true, "-1.#ind": true, "1.#ind": true, "1.#inf": true, "-1.#inf": true, "nan(ind)": true, "-nan(ind)": true,
}

// value reads what stands in one cell: a number, or NaN where there is none.
func value(cell []byte, mark byte) (float64, error) {
	cell = bytes.TrimSpace(cell)
	if len(cell) == 0 {
		return math.NaN(), nil
	}
	if n := len(cell); n >= 2 && cell[0] == '"' && cell[n-1] == '"' {
		cell = bytes.TrimSpace(cell[1 : n-1])
		mark = ',' // quotes keep it apart from a separator
	}
	if v, n := scan(cell, mark); n > 0 && n == len(cell) {
		return v, tooLarge(v, cell)
	}
	var buf [64]byte
	if len(cell) > len(buf) {
		return 0, fmt.Errorf("%.20q… is not a number", cell)
	}
	text := buf[:copy(buf[:], cell)]
	plain := true // of digits, marks, signs and exponents alone
	for i, c := range text {
		switch {
		case c-'0' <= 9 || c == '.' || c == '+' || c == '-' || c == 'e' || c == 'E':
		case c == mark:
			text[i] = '.'
		case c == 'd' || c == 'D':
			text[i] = 'e' // Fortran
		default:
			plain = false
		}
	}
	if plain {
		v, err := strconv.ParseFloat(unsafe.String(unsafe.SliceData(text), len(text)), 64)
		if err == nil || errors.Is(err, strconv.ErrRange) {
			return v, tooLarge(v, cell)
		}
	}
	if missing[string(bytes.ToLower(cell))] {
		return math.NaN(), nil
	}
	return 0, fmt.Errorf("%q is not a number", cell)
}

func tooLarge(v float64, cell []byte) error {
	if math.Abs(v) > largest {
		return fmt.Errorf("%s is too large; a log holds values up to %g", cell, largest)
	}
	return nil
}
