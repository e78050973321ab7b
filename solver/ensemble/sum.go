package ensemble

import (
	"encoding/hex"
	"errors"
	"math"
	"math/big"
	"strings"
)

// Sum adds floating-point numbers without rounding: the value is kept as an
// integer multiple of 2^-1074, in digits of 32 bits (R. M. Neal, Fast exact
// summation using small and large superaccumulators, arXiv:1505.05571, 2015). It
// does not depend on the order of the addends. The zero value is an empty sum.
type Sum struct {
	digit   [sumDigits]int64
	pending int32 // additions since the last carry
	special uint8 // non-finite addends seen: 1 NaN, 2 +Inf, 4 -Inf
}

// sumDigits covers the exponents of float64 (2046/32 + 3 digits) and 2^64 addends.
const sumDigits = 70

// maxPending keeps the digits below 2^63.
const maxPending = 1 << 30

// Add adds x.
func (s *Sum) Add(x float64) {
	b := math.Float64bits(x)
	e := b >> 52 & 0x7ff
	m := b & (1<<52 - 1)
	switch e {
	case 0x7ff:
		s.addSpecial(x)
		return
	case 0:
		e = 1
	default:
		m |= 1 << 52
	}
	i, shift := e>>5, e&31
	lo := m << shift
	hi := m >> (63 - shift) >> 1 // the bits shifted out of lo
	d := s.digit[i : i+3 : i+3]
	if int64(b) >= 0 {
		d[0] += int64(lo & 0xffffffff)
		d[1] += int64(lo >> 32)
		d[2] += int64(hi)
	} else {
		d[0] -= int64(lo & 0xffffffff)
		d[1] -= int64(lo >> 32)
		d[2] -= int64(hi)
	}
	if s.pending++; s.pending >= maxPending {
		s.carry()
	}
}

func (s *Sum) addSpecial(x float64) {
	switch {
	case math.IsNaN(x):
		s.special |= 1
	case x > 0:
		s.special |= 2
	default:
		s.special |= 4
	}
}

// AddProduct adds x*y without rounding the product.
func (s *Sum) AddProduct(x, y float64) {
	p := x * y
	s.Add(p)
	if e := math.FMA(x, y, -p); e != 0 && !math.IsNaN(e) && !math.IsInf(e, 0) {
		s.Add(e)
	}
}

// Merge adds the sum o.
func (s *Sum) Merge(o *Sum) {
	s.carry()
	t := *o
	t.carry()
	for i := range s.digit {
		s.digit[i] += t.digit[i]
	}
	s.special |= o.special
	s.carry()
}

// carry brings all digits but the highest into [0, 2^32): the form is unique.
func (s *Sum) carry() {
	s.pending = 0
	for i := range sumDigits - 1 {
		c := s.digit[i] >> 32
		s.digit[i] -= c << 32
		s.digit[i+1] += c
	}
}

// exact returns the value as an integer multiple of 2^-1075.
func (s *Sum) exact() *big.Int {
	t := *s
	t.carry()
	v := new(big.Int)
	for i := sumDigits - 1; i >= 0; i-- {
		v.Lsh(v, 32)
		v.Add(v, big.NewInt(t.digit[i]))
	}
	return v
}

// sumScale is the binary exponent of the unit of exact: a number with exponent
// field 1 and significand m is m * 2^(1-1075) and enters shifted by one bit.
const sumScale = -1075

// Rat returns the exact value; ok is false when an addend was not finite.
func (s *Sum) Rat() (r *big.Rat, ok bool) {
	if s.special != 0 {
		return nil, false
	}
	return new(big.Rat).SetFrac(s.exact(), new(big.Int).Lsh(big.NewInt(1), -sumScale)), true
}

// Value returns the sum rounded once to the nearest float64.
func (s *Sum) Value() float64 {
	switch s.special {
	case 0:
		r, _ := s.Rat()
		f, _ := r.Float64()
		return f
	case 2:
		return math.Inf(1)
	case 4:
		return math.Inf(-1)
	}
	return math.NaN()
}

// MarshalText writes the exact value in hexadecimal; equal sums give equal text.
func (s *Sum) MarshalText() ([]byte, error) {
	text := s.exact().Text(16)
	if s.special != 0 {
		text += "!" + hex.EncodeToString([]byte{s.special})
	}
	return []byte(text), nil
}

// UnmarshalText reads what MarshalText wrote.
func (s *Sum) UnmarshalText(text []byte) error {
	*s = Sum{}
	number, special, found := strings.Cut(string(text), "!")
	if found {
		b, err := hex.DecodeString(special)
		if err != nil || len(b) != 1 {
			return errors.New("ensemble: malformed sum")
		}
		s.special = b[0]
	}
	v, ok := new(big.Int).SetString(number, 16)
	if !ok || v.BitLen() > 32*sumDigits {
		return errors.New("ensemble: malformed sum")
	}
	mask := big.NewInt(0xffffffff)
	for i := range sumDigits - 1 {
		s.digit[i] = new(big.Int).And(v, mask).Int64() // two's complement for negative v
		v.Rsh(v, 32)
	}
	s.digit[sumDigits-1] = v.Int64()
	return nil
}
