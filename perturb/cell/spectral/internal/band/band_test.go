package band

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
)

func apply(a Matrix, x []float64, transposed bool) []float64 {
	out := make([]float64, len(x))
	for i, row := range a {
		for _, e := range row {
			if transposed {
				out[e.Col] += e.V * x[i]
			} else {
				out[i] += e.V * x[e.Col]
			}
		}
	}
	return out
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if math.Abs(got-want) > tol*math.Max(1, math.Abs(want)) {
		t.Errorf("%s: %.12g, want %.12g", what, got, want)
	}
}

// Both factorizations on random sparse matrices, also those that need
// interchanges.
func TestFactorizations(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for _, n := range []int{1, 2, 7, 40, 90} {
		a := make(Matrix, n)
		for i := range a {
			seen := map[int]bool{}
			for k := 0; k < 4; k++ {
				if j := rng.IntN(n); !seen[j] {
					seen[j] = true
					a[i] = append(a[i], Entry{Col: j, V: rng.NormFloat64()})
				}
			}
			if !seen[i] {
				a[i] = append(a[i], Entry{Col: i, V: 1e-3})
			}
		}
		b, err := Banded(context.Background(), a, nil)
		if err != nil {
			t.Fatal(err)
		}
		d, err := newDense(a)
		if err != nil {
			t.Fatal(err)
		}
		x := make([]float64, n)
		for i := range x {
			x[i] = rng.NormFloat64()
		}
		for name, f := range map[string]Factors{"banded": b, "dense": d} {
			for i, v := range f.Solve(apply(a, x, false)) {
				near(t, name, v, x[i], 1e-7)
			}
			for i, v := range f.SolveTransposed(apply(a, x, true)) {
				near(t, name+", transposed", v, x[i], 1e-7)
			}
		}
	}
}

func TestSingular(t *testing.T) {
	a := Matrix{{{Col: 0, V: 1}, {Col: 1, V: 2}}, {{Col: 0, V: 2}, {Col: 1, V: 4}}}
	if _, err := Banded(context.Background(), a, nil); err == nil {
		t.Error("a singular matrix was factorized")
	}
	if _, err := newDense(a); err == nil {
		t.Error("a singular matrix was factorized (dense)")
	}
}

func BenchmarkBanded(b *testing.B) {
	const n, w = 4000, 60
	a := make(Matrix, n)
	for i := range a {
		for _, d := range []int{-w, -1, 0, 1, w} {
			if j := i + d; j >= 0 && j < n {
				v := 1.0
				if d == 0 {
					v = -5
				}
				a[i] = append(a[i], Entry{Col: j, V: v})
			}
		}
	}
	for b.Loop() {
		if _, err := Banded(context.Background(), a, nil); err != nil {
			b.Fatal(err)
		}
	}
}
