package kernel

import (
	"bufio"
	"flag"
	"math"
	"math/big"
	"os"
	"strconv"
	"strings"
	"testing"
)

// precision of the references in this file, in bits; arguments up to 2^1024 are
// reduced by a pi of 1400 bits.
const precision = 160

func bigFloat(x float64) *big.Float { return new(big.Float).SetPrec(precision).SetFloat64(x) }

// bigPi computes pi by Machin's formula, 16 atan(1/5) - 4 atan(1/239).
func bigPi(bits uint) *big.Float {
	atan := func(q int64) *big.Int {
		one := new(big.Int).Lsh(big.NewInt(1), bits+32)
		term := new(big.Int).Quo(one, big.NewInt(q))
		sum := new(big.Int).Set(term)
		for k := int64(3); term.Sign() != 0; k += 2 {
			term.Quo(term, big.NewInt(q*q))
			t := new(big.Int).Quo(term, big.NewInt(k))
			if k%4 == 3 {
				t.Neg(t)
			}
			sum.Add(sum, t)
		}
		return sum
	}
	pi := new(big.Int).Mul(atan(5), big.NewInt(16))
	pi.Sub(pi, new(big.Int).Mul(atan(239), big.NewInt(4)))
	f := new(big.Float).SetPrec(bits).SetInt(pi)
	return f.SetMantExp(f, -int(bits)-32)
}

// reference evaluates functions to about 2^-150 by Taylor series.
type reference struct{ halfPi, ln2 *big.Float }

func newReference() reference {
	r := reference{halfPi: bigPi(1400)}
	r.halfPi.SetMantExp(r.halfPi, -1)
	r.ln2 = r.logNear(bigFloat(2))
	return r
}

// sinCos returns both functions of x.
func (r reference) sinCos(x float64) (sin, cos *big.Float) {
	q := new(big.Float).SetPrec(1400).SetFloat64(x)
	n := new(big.Float).SetPrec(1400).Quo(q, r.halfPi)
	n.Add(n, big.NewFloat(math.Copysign(0.5, x)))
	k, _ := n.Int(nil)
	q.Sub(q, new(big.Float).SetPrec(2800).Mul(new(big.Float).SetInt(k), r.halfPi))
	y := new(big.Float).SetPrec(precision).Set(q)
	series := func(term *big.Float, from int64) *big.Float {
		sum := new(big.Float).SetPrec(precision).Set(term)
		t := new(big.Float).SetPrec(precision).Set(term)
		y2 := new(big.Float).SetPrec(precision).Mul(y, y)
		for i := from; i < 60; i += 2 {
			t.Mul(t, y2)
			t.Quo(t, bigFloat(float64(-i*(i+1))))
			sum.Add(sum, t)
		}
		return sum
	}
	s, c := series(y, 2), series(bigFloat(1), 1)
	switch new(big.Int).And(k, big.NewInt(3)).Int64() { // two's complement: floor modulo
	case 1:
		s, c = c, s.Neg(s)
	case 2:
		s, c = s.Neg(s), c.Neg(c)
	case 3:
		s, c = c.Neg(c), s
	}
	return s, c
}

func (r reference) exp(x float64) *big.Float {
	k := int(math.Round(x / math.Ln2))
	y := new(big.Float).SetPrec(precision).Sub(bigFloat(x), new(big.Float).SetPrec(precision).Mul(bigFloat(float64(k)), r.ln2))
	sum, t := bigFloat(1), bigFloat(1)
	for i := 1; i < 45; i++ {
		t.Mul(t, y)
		t.Quo(t, bigFloat(float64(i)))
		sum.Add(sum, t)
	}
	return sum.SetMantExp(sum, k)
}

// logNear is 2 atanh((x-1)/(x+1)) for x between 1/2 and 2.
func (r reference) logNear(x *big.Float) *big.Float {
	one := bigFloat(1)
	s := new(big.Float).SetPrec(precision).Sub(x, one)
	s.Quo(s, new(big.Float).SetPrec(precision).Add(x, one))
	s2 := new(big.Float).SetPrec(precision).Mul(s, s)
	sum, t := new(big.Float).SetPrec(precision).Set(s), new(big.Float).SetPrec(precision).Set(s)
	for i := 3; i < 110; i += 2 {
		t.Mul(t, s2)
		sum.Add(sum, new(big.Float).SetPrec(precision).Quo(t, bigFloat(float64(i))))
	}
	return sum.Mul(sum, bigFloat(2))
}

func (r reference) log(x float64) *big.Float {
	m, e := math.Frexp(x)
	if m < math.Sqrt2/2 {
		m, e = 2*m, e-1
	}
	l := r.logNear(bigFloat(m))
	return l.Add(l, new(big.Float).SetPrec(precision).Mul(bigFloat(float64(e)), r.ln2))
}

// ulps returns the error of y in units in the last place of the exact value.
func ulps(y float64, exact *big.Float) float64 {
	if exact.Sign() == 0 {
		if y == 0 {
			return 0
		}
		return math.Inf(1)
	}
	e := exact.MantExp(nil) - 53
	d := new(big.Float).SetPrec(precision).Sub(bigFloat(y), exact)
	f, _ := d.SetMantExp(d, -max(e, -1074)).Float64()
	return math.Abs(f)
}

var accuracyPoints = flag.Int("accuracy", 4000, "points of the accuracy test for each function")

// Sine, cosine, exp and log stay within 2 units in the last place over the whole
// range: arguments of all magnitudes, beside the multiples of pi/2, subnormal ones
// and subnormal results. A longer campaign: go test -run Accuracy -accuracy 1000000
func TestAccuracy(t *testing.T) {
	ref := newReference()
	var sinSingle, cosSingle, sinBoth, cosBoth, expErr, logErr float64
	worst := func(w *float64, x, y float64, exact *big.Float) {
		if u := ulps(y, exact); u > *w {
			*w = u
		}
	}
	s := uint64(*accuracyPoints)
	uniform := func() float64 { return float64(splitMix(&s)>>11) * 0x1p-53 }
	trigArgument := func(i int) float64 {
		switch i % 6 {
		case 0:
			return (uniform() - 0.5) * 20
		case 1:
			return (uniform() - 0.5) * 2e5
		case 2:
			return (uniform() - 0.5) * 2 * trigMax
		case 3: // beside a multiple of pi/2
			return math.Nextafter(math.Round(uniform()*1e9*uniform())*(math.Pi/2), float64(i%2)*1e300)
		case 4: // near odd multiples of pi/2 in units of pi, where halfturn is widest
			return (math.Round(uniform()*1000) + 0.5 + (uniform()-0.5)*0.1) * math.Pi
		}
		return math.Ldexp(uniform()+0.5, int(splitMix(&s)%2098)-1074)
	}
	for i := range *accuracyPoints {
		x := trigArgument(i)
		es, ec := ref.sinCos(x)
		worst(&sinSingle, x, Sin(x), es)
		worst(&cosSingle, x, Cos(x), ec)
		a, b := SinCos(x)
		worst(&sinBoth, x, a, es)
		worst(&cosBoth, x, b, ec)
		x = (uniform() - 0.5) * []float64{2, 100, 1400, 1490}[i%4]
		if x > -745 && x < 709.7 {
			worst(&expErr, x, Exp(x), ref.exp(x))
		}
		x = []float64{0.5 + uniform(), 1 + (uniform()-0.5)/1000, math.Ldexp(uniform()+0.5, int(splitMix(&s)%2097)-1074)}[i%3]
		worst(&logErr, x, Log(x), ref.log(x))
	}
	t.Logf("largest errors in units in the last place: sin %.2f cos %.2f, together %.2f %.2f, exp %.2f, log %.2f", sinSingle, cosSingle, sinBoth, cosBoth, expErr, logErr)
	for _, w := range []float64{sinSingle, cosSingle, sinBoth, cosBoth, expErr, logErr} {
		if !(w < 2) {
			t.Errorf("largest error %v units in the last place", w)
		}
	}
}

// testdata/elementary.txt was written by testdata/elementary.py with mpmath at
// 400 digits: function, argument and value as hexadecimal floats, among them the
// double closest to a multiple of pi/2 (J.-M. Muller, Elementary Functions, 2nd
// ed. (2006), section 9.3.2).
func TestAgainstMpmath(t *testing.T) {
	f, err := os.Open("testdata/elementary.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	functions := map[string]func(float64) float64{
		"sin": Sin, "cos": Cos, "exp": Exp, "log": Log,
		"sin2": func(x float64) float64 { s, _ := SinCos(x); return s },
		"cos2": func(x float64) float64 { _, c := SinCos(x); return c },
		"I0":   func(x float64) float64 { return BesselI(0, x) },
		"I1":   func(x float64) float64 { return BesselI(1, x) },
		"I5":   func(x float64) float64 { return BesselI(5, x) },
	}
	lines := bufio.NewScanner(f)
	n := 0
	for lines.Scan() {
		w := strings.Fields(lines.Text())
		if len(w) != 3 {
			continue
		}
		x, err1 := strconv.ParseFloat(w[1], 64)
		y, err2 := strconv.ParseFloat(w[2], 64)
		if err1 != nil || err2 != nil {
			t.Fatalf("line %q", lines.Text())
		}
		allowed := 2.0
		if w[0][0] == 'I' {
			allowed = 40 // a sum of many terms, not one of the vector kernels
		}
		names := []string{w[0]}
		if w[0] == "sin" || w[0] == "cos" {
			names = append(names, w[0]+"2")
		}
		for _, name := range names {
			got := functions[name](x)
			if u := ulps(got, bigFloat(y)); !(u <= allowed+0.5) {
				t.Errorf("%s(%v) = %v, want %v: %v units in the last place", name, x, got, y, u)
			}
		}
		n++
	}
	if n < 150 {
		t.Errorf("only %d values", n)
	}
}

func TestSpecialArguments(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"sin inf", Sin(inf), nan}, {"cos -inf", Cos(-inf), nan}, {"sin nan", Sin(nan), nan},
		{"sin 0", Sin(0), 0}, {"cos 0", Cos(0), 1}, {"sin tiny", Sin(5e-324), 5e-324}, {"cos tiny", Cos(5e-324), 1},
		{"exp inf", Exp(inf), inf}, {"exp -inf", Exp(-inf), 0}, {"exp nan", Exp(nan), nan}, {"exp 0", Exp(0), 1},
		{"exp 710", Exp(710), inf}, {"exp -746", Exp(-746), 0}, {"exp -745", Exp(-745), 5e-324},
		{"log 0", Log(0), -inf}, {"log -1", Log(-1), nan}, {"log inf", Log(inf), inf}, {"log nan", Log(nan), nan},
		{"log 1", Log(1), 0}, {"log -inf", Log(-inf), nan},
	} {
		if c.got != c.want && !(math.IsNaN(c.got) && math.IsNaN(c.want)) {
			t.Errorf("%s = %v, want %v", c.name, c.got, c.want)
		}
	}
}
