package ensemble

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

func wild(r *rand.Rand) float64 {
	for {
		x := math.Float64frombits(r.Uint64())
		if !math.IsNaN(x) && !math.IsInf(x, 0) {
			return x
		}
	}
}

func TestSumIsExact(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for trial := range 200 {
		var s Sum
		want := new(big.Rat)
		for range 1 + trial {
			x, y := wild(r), wild(r)
			if trial%2 == 0 {
				x, y = r.NormFloat64(), math.Exp(20*r.NormFloat64())
			}
			s.Add(x)
			want.Add(want, new(big.Rat).SetFloat64(x))
			if trial%2 == 0 {
				s.AddProduct(x, y)
				want.Add(want, new(big.Rat).Mul(new(big.Rat).SetFloat64(x), new(big.Rat).SetFloat64(y)))
			}
		}
		got, ok := s.Rat()
		if !ok || got.Cmp(want) != 0 {
			t.Fatalf("trial %d: sum is not exact", trial)
		}
		if f, _ := want.Float64(); s.Value() != f {
			t.Fatalf("trial %d: value %v, want %v", trial, s.Value(), f)
		}
		text, _ := s.MarshalText()
		var back Sum
		if err := back.UnmarshalText(text); err != nil {
			t.Fatal(err)
		}
		if again, _ := back.MarshalText(); string(again) != string(text) || back.Value() != s.Value() {
			t.Fatalf("trial %d: text %s read back as %s", trial, text, again)
		}
	}
}

func TestSumDoesNotDependOnOrderOrGrouping(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	xs := make([]float64, 3000)
	for i := range xs {
		xs[i] = r.NormFloat64() * math.Exp(30*r.NormFloat64())
	}
	var whole Sum
	for _, x := range xs {
		whole.Add(x)
	}
	want, _ := whole.MarshalText()
	for range 10 {
		r.Shuffle(len(xs), func(i, j int) { xs[i], xs[j] = xs[j], xs[i] })
		parts := make([]Sum, 7)
		for i, x := range xs {
			parts[i%7].Add(x)
		}
		var s Sum
		for i := range parts {
			s.Merge(&parts[i])
		}
		if got, _ := s.MarshalText(); string(got) != string(want) {
			t.Fatal("the sum depends on the order of the addends")
		}
	}
}

func TestSumKeepsNonFiniteAddends(t *testing.T) {
	var s Sum
	s.Add(1)
	s.Add(math.Inf(1))
	if !math.IsInf(s.Value(), 1) {
		t.Errorf("value %v, want +Inf", s.Value())
	}
	s.Add(math.Inf(-1))
	if !math.IsNaN(s.Value()) {
		t.Errorf("value %v, want NaN", s.Value())
	}
}

func BenchmarkSum(b *testing.B) {
	var s Sum
	x := 0.1
	for b.Loop() {
		s.Add(x)
		x += 0.01
	}
}
