// Package decimal reads decimal numbers from the bytes of text formats without
// allocating.
package decimal

import (
	"bytes"
	"math"
	"strconv"
)

// Exact limits of the fast path (Clinger, "How to read floating point numbers
// accurately", PLDI 1990): integers up to 2^53 and powers of ten up to 10^22
// are exact doubles, so one multiplication or division of two such numbers is
// correctly rounded.
const (
	maxExactInteger = 1 << 53
	maxExactPower   = 22
)

// Parse returns the double nearest to the number that b spells: digits with an
// optional sign, decimal point and exponent, or nan, inf or infinity in any
// case. Numbers too large are infinite. It reports false, and no number, for
// anything else, blanks around the number included.
func Parse(b []byte) (float64, bool) {
	i, negative := 0, false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		i = 1
	}
	var mantissa uint64
	digits, fraction, point := 0, 0, false
	for ; i < len(b); i++ {
		if c := b[i] - '0'; c <= 9 {
			if digits == 19 { // more would overflow the mantissa
				return parseSlow(b)
			}
			mantissa = mantissa*10 + uint64(c)
			digits++
			if point {
				fraction++
			}
			continue
		}
		if b[i] != '.' || point {
			return parseSlow(b)
		}
		point = true
	}
	if digits == 0 || mantissa > maxExactInteger || fraction > maxExactPower {
		return parseSlow(b)
	}
	v := float64(mantissa)
	if fraction > 0 {
		v /= power(fraction)
	}
	if negative {
		v = -v
	}
	return v, true
}

// power returns 10^n, exact for n from 0 to 22.
func power(n int) float64 {
	powers := [...]float64{1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
		1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}
	return powers[n]
}

// parseSlow covers what is rare in surveys: exponents, very many digits, and
// the spellings of no number. ParseFloat also knows hexadecimal numbers and
// underscores, which text formats do not have.
func parseSlow(b []byte) (float64, bool) {
	digits := false
	for _, c := range b {
		switch {
		case c >= '0' && c <= '9':
			digits = true
		case c == '.' || c == '+' || c == '-' || c == 'e' || c == 'E':
		default:
			return parseWord(b)
		}
	}
	if !digits {
		return 0, false
	}
	v, err := strconv.ParseFloat(string(b), 64)
	if err != nil && !math.IsInf(v, 0) {
		return 0, false
	}
	return v, true
}

func parseWord(b []byte) (float64, bool) {
	sign := 1
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		if b[0] == '-' {
			sign = -1
		}
		b = b[1:]
	}
	switch {
	case bytes.EqualFold(b, []byte("nan")):
		return math.NaN(), true
	case bytes.EqualFold(b, []byte("inf")), bytes.EqualFold(b, []byte("infinity")):
		return math.Inf(sign), true
	}
	return 0, false
}
