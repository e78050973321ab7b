package kernel

import (
	"flag"
	"math"
	"sort"
	"testing"
)

// The first outputs of xoshiro256++ from the state 1, 2, 3, 4, by the reference C
// code of D. Blackman and S. Vigna (prng.di.unimi.it; from memory).
func TestStreamIsXoshiro(t *testing.T) {
	want := []uint64{41943041, 58720359, 3588806011781223, 3591011842654386, 9228616714210784205, 9973669472204895162}
	var s Stream
	for lane := range Lanes {
		for i := range s.state {
			s.state[i][lane] = uint64(i + 1)
		}
	}
	u := make([]float64, 48)
	portableUniforms(&s.state, u[:24], u[24:])
	for i := range 3 {
		a, b := want[2*i], want[2*i+1]
		if x := 1 - float64(a>>12)*0x1p-52; u[8*i] != x {
			t.Errorf("output %d: %v, want %v", 2*i, u[8*i], x)
		}
		if x := float64(b>>12) * 0x1p-52; u[24+8*i] != x {
			t.Errorf("output %d: %v, want %v", 2*i+1, u[24+8*i], x)
		}
	}
}

var batteryRows = flag.Int("battery", 1<<11, "rows of 512 variates for the battery of statistical tests")

// battery collects z-scores, standard normal under the null hypothesis.
type battery struct {
	t     *testing.T
	names []string
	z     []float64
}

func (b *battery) note(name string, z float64) {
	b.names, b.z = append(b.names, name), append(b.z, z)
}

// chi2 compares counts with equal expectations; the score is that of E. Wilson
// and M. Hilferty, Proc. Natl. Acad. Sci. 17 (1931) 684-688.
func (b *battery) chi2(name string, counts []int) {
	n := 0
	for _, c := range counts {
		n += c
	}
	e := float64(n) / float64(len(counts))
	sum := 0.0
	for _, c := range counts {
		sum += (float64(c) - e) * (float64(c) - e) / e
	}
	k := float64(len(counts) - 1)
	b.note(name, (math.Cbrt(sum/k)-1+2/(9*k))/math.Sqrt(2/(9*k)))
}

// correlation notes sqrt(n) times the correlation of rows with unit variance.
func (b *battery) correlation(name string, x, y []float64) {
	sum := 0.0
	for i := range x {
		sum += x[i] * y[i]
	}
	b.note(name, sum/math.Sqrt(float64(len(x))))
}

// judge fails on scores that a battery of this size does not show by chance, and
// on scores that are as a whole not standard normal (Anderson-Darling; critical
// value of M. A. Stephens, J. Amer. Statist. Assoc. 69 (1974) 730-737 for a known
// law, 0.1 %: 6.0).
func (b *battery) judge() {
	b.t.Helper()
	limit := math.Sqrt2 * math.Erfcinv(1e-4/float64(len(b.z)))
	for i, z := range b.z {
		if math.Abs(z) > limit {
			b.t.Errorf("%s: score %.2f beyond %.2f", b.names[i], z, limit)
		}
	}
	z := append([]float64(nil), b.z...)
	sort.Float64s(z)
	n := len(z)
	sum := 0.0
	for i := range z {
		p, q := math.Erfc(-z[i]/math.Sqrt2)/2, math.Erfc(z[n-1-i]/math.Sqrt2)/2
		sum += float64(2*i+1) * (math.Log(p) + math.Log(q))
	}
	a2 := -float64(n) - sum/float64(n)
	b.t.Logf("%d scores, largest limit %.2f, Anderson-Darling %.2f", n, limit, a2)
	if a2 > 6 {
		b.t.Errorf("the scores are not standard normal: Anderson-Darling %.2f", a2)
	}
}

func cell(z float64, n int) int {
	return min(int(math.Erfc(-z/math.Sqrt2)/2*float64(n)), n-1)
}

// Normal variates: marginal law by chi-square and Kolmogorov-Smirnov, moments,
// tails; independence of the two variates of a pair, of neighbours, of lanes and
// of successive rows. A longer campaign: go test -run Normals -battery 200000
func TestNormalsBattery(t *testing.T) {
	b := &battery{t: t}
	for seed := range uint64(4) {
		normalsBattery(b, seed, *batteryRows)
	}
	b.judge()
}

func normalsBattery(b *battery, seed uint64, rows int) {
	const n = 512
	s, r := NewStream(seed, 0), NewRandom()
	marginal, pairs, next := make([]int, 1024), make([]int, 32*32), make([]int, 32*32)
	var m1, m2, m3, m4 float64
	tails := [4]int{}
	z, last := AlignedRow(n), AlignedRow(n)
	lag := map[string]float64{}
	for row := range rows {
		copy(last, z)
		r.Normals(&s, z)
		for i, x := range z {
			marginal[cell(x, 1024)]++
			m1, m2, m3, m4 = m1+x, m2+x*x, m3+x*x*x, m4+x*x*x*x
			for k := range tails {
				if math.Abs(x) > float64(k)+1.5 {
					tails[k]++
				}
			}
			if i < n/2 {
				pairs[cell(x, 32)*32+cell(z[i+n/2], 32)]++
				lag["pair squares"] += (x*x - 1) * (z[i+n/2]*z[i+n/2] - 1) / 2
			}
			if i%2 == 0 {
				next[cell(x, 32)*32+cell(z[i+1], 32)]++
			}
			if i+8 < n {
				lag["8 apart"] += x * z[i+8]
			}
			if row > 0 {
				lag["next row"] += x * last[i]
				lag["squares of the next row"] += (x*x - 1) * (last[i]*last[i] - 1) / 2
			}
		}
	}
	total := float64(n * rows)
	b.chi2("marginal", marginal)
	b.chi2("pairs", pairs)
	b.chi2("neighbours", next)
	b.note("mean", m1/math.Sqrt(total))
	b.note("variance", (m2-total)/math.Sqrt(2*total))
	b.note("third moment", m3/math.Sqrt(15*total))
	b.note("fourth moment", (m4-3*total)/math.Sqrt(96*total))
	for k, c := range tails {
		p := math.Erfc((float64(k) + 1.5) / math.Sqrt2)
		if p*total > 50 {
			b.note("tail", (float64(c)-p*total)/math.Sqrt(p*(1-p)*total))
		}
	}
	b.note("pair squares", lag["pair squares"]/math.Sqrt(total/2))
	b.note("8 apart", lag["8 apart"]/math.Sqrt(float64((n-8)*rows)))
	b.note("next row", lag["next row"]/math.Sqrt(float64(n*(rows-1))))
	b.note("squares of the next row", lag["squares of the next row"]/math.Sqrt(float64(n*(rows-1))))
}

// Kolmogorov-Smirnov on many short samples: the scaled distances must follow the
// Kolmogorov law, here in four equally probable classes (quartiles 0.6764, 0.8276,
// 1.0192 of the limiting law, with Stephens' correction for the sample size).
func TestNormalsKolmogorovSmirnov(t *testing.T) {
	s, r := NewStream(5, 5), NewRandom()
	z := AlignedRow(512)
	counts := make([]int, 4)
	for range 4000 {
		r.Normals(&s, z)
		x := append([]float64(nil), z...)
		sort.Float64s(x)
		d := 0.0
		for i := range x {
			f := math.Erfc(-x[i]/math.Sqrt2) / 2
			d = max(d, f-float64(i)/512, float64(i+1)/512-f)
		}
		d *= math.Sqrt(512) + 0.12 + 0.11/math.Sqrt(512)
		k := 0
		for _, q := range []float64{0.6764, 0.8276, 1.0192} {
			if d > q {
				k++
			}
		}
		counts[k]++
	}
	b := &battery{t: t}
	b.chi2("quartiles of the distance", counts)
	if z := b.z[0]; z > 4 {
		t.Errorf("quartile counts %v, score %v", counts, z)
	}
}

// Streams with neighbouring seeds or numbers, and lanes of one stream, are
// uncorrelated in values, in squares and across a shift.
func TestStreamsAreIndependent(t *testing.T) {
	r := NewRandom()
	const n = 1 << 16
	draw := func(seed, number uint64) []float64 {
		s := NewStream(seed, number)
		z := make([]float64, n)
		for i := 0; i < n; i += 512 {
			r.Normals(&s, z[i:i+512])
		}
		return z
	}
	square := func(x []float64) []float64 {
		y := make([]float64, len(x))
		for i := range x {
			y[i] = (x[i]*x[i] - 1) / math.Sqrt2
		}
		return y
	}
	b := &battery{t: t}
	for k := range uint64(40) {
		x := draw(k, 0)
		for name, y := range map[string][]float64{
			"next seed": draw(k+1, 0), "next number": draw(k, 1), "exchanged": draw(k+1, k), "distant bit": draw(k^1<<63, 0), "number's bit": draw(k, 1<<63),
		} {
			b.correlation(name, x, y)
			b.correlation(name+", squares", square(x), square(y))
			b.correlation(name+", shifted", x[8:], y[:n-8])
		}
	}
	// Sums over streams: block B of a run must not feel block B+1.
	counts := make([]int, 256)
	sum := make([]float64, 1<<14)
	for i := range sum {
		s := NewStream(1, uint64(i))
		z := make([]float64, 32)
		r.Normals(&s, z)
		for _, x := range z {
			sum[i] += x / math.Sqrt(32)
		}
		counts[cell(sum[i], 256)]++
	}
	b.chi2("sums of short streams", counts)
	b.correlation("successive short streams", sum[1:], sum[:len(sum)-1])
	b.judge()
}
