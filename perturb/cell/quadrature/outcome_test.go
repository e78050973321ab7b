package quadrature_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
)

func TestRefusals(t *testing.T) {
	lin := func(k float64) func(float64) float64 { return func(y float64) float64 { return -k * y } }
	for _, c := range []struct {
		name    string
		problem *fast.Problem
		says    string
	}{
		{"free Brownian motion", one(line, constant(0), constant(2)), "infinite"},
		{"constant drift on the line", one(line, constant(0.3), constant(1)), "attracting"},
		{"weak confinement", one(line, func(y float64) float64 { return -0.4 * y / (1 + y*y) }, constant(2)), "|y|^-0.4"},
		{"two half-lines", one(line, func(y float64) float64 { return y - y*y*y }, func(y float64) float64 { return 0.5 * y * y }), "more than one"},
		{"drawn to zero", one(line, func(y float64) float64 { return y - y*y*y }, func(y float64) float64 { return 4 * y * y }), "point mass at y = 0"},
		{"wall off centre", one(line, func(y float64) float64 { return -(y - 0.3) * (y - 2) * (y + 2) }, func(y float64) float64 { return 0.3 * (y - 0.3) * (y - 0.3) }), "y = 0.3"},
		{"geometric Brownian motion on the half-line", one(half, func(y float64) float64 { return y - y*y }, func(y float64) float64 { return 3 * y * y }), "not integrable at 0"},
		{"circle without noise, locked", one(circle, func(y float64) float64 { return 0.5 + math.Sin(y) }, constant(0)), "stops there"},
		{"circle without anything", one(circle, constant(0), constant(0)), "neither"},
		{"absorbing corner", one(wall(0, 1), constant(0), func(y float64) float64 { return y * (1 - y) }), "not integrable at 0"},
		{"absorbed at a wall far from zero", one(wall(1000, 1001), constant(-1), func(y float64) float64 { return (y - 1000) * (1001 - y) }), "not integrable at 1000"},
		{"washboard on the line", one(line, func(y float64) float64 { return -math.Sin(y) }, constant(2)), "does not fall off"},
		{"unconfined tail", one(line, lin(-1), constant(2)), "attracting"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := quadrature.New(context.Background(), c.problem, quadrature.Settings{})
			var ne *fast.NotErgodic
			if !errors.As(err, &ne) {
				t.Fatalf("got solver %v, error %v; want not ergodic", s != nil, err)
			}
			if !strings.Contains(err.Error(), c.says) {
				t.Errorf("message %q does not say %q", err, c.says)
			}
		})
	}
}

// Lookalikes of the refusals that have a limit.
func TestNotRefused(t *testing.T) {
	for _, c := range []struct {
		name    string
		problem *fast.Problem
		g       func(float64) float64
		mean    float64
		source  string
	}{
		{"confinement just enough", one(line, func(y float64) float64 { return -1.1 * y / (1 + y*y) }, constant(2)), func(y float64) float64 { return 1 / (1 + y*y) }, 0.1 / 1.1,
			"<1/(1+y^2)> of (1+y^2)^(-nu), nu = c/2: Beta integrals, (2nu-1)/(2nu)"},
		{"noise zero crossed one way", one(line, func(y float64) float64 { return 1 - y }, func(y float64) float64 { return y * y }), func(y float64) float64 { return y }, 1,
			"inverse Gamma law on y > 0 (Wong 1964): stationarity of the mean"},
		{"geometric noise with growth", one(half, func(y float64) float64 { return y - y*y }, func(y float64) float64 { return y * y }), func(y float64) float64 { return y }, 0.5,
			"Gamma law y^(2/s^2-2) exp(-2y/s^2): mean 1 - s^2/2"},
		{"washboard in a bowl", one(line, func(y float64) float64 { return -y + 3*math.Sin(5*y) }, constant(2)), func(y float64) float64 { return y * (y - 3*math.Sin(5*y)) }, 1,
			"<V' y> = T by parts"},
		{"noise that vanishes at a wall", one(wall(0, 1), func(y float64) float64 { return 0.5 - y }, func(y float64) float64 { return y * (1 - y) }), func(y float64) float64 { return y * y }, 1. / 3,
			"f = a'/2 gives the uniform law"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := quadrature.New(context.Background(), c.problem, quadrature.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			m, err := s.Mean(context.Background(), s.Coefficient(fast.Func1("g", c.g)))
			if err != nil {
				t.Fatal(err)
			}
			check(t, c.source, m, c.mean, 1e-12)
		})
	}
}

func TestDivergence(t *testing.T) {
	ctx := context.Background()
	// Student law with tail |y|^(-2-k/D): the second moment exists for k > D.
	student := one(line, func(y float64) float64 { return -0.7 * y }, func(y float64) float64 { return 2 * (1 + y*y) })
	s, err := quadrature.New(ctx, student, quadrature.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	y := fast.Func1("y", func(y float64) float64 { return y })
	phi, mean, err := s.Solve(ctx, s.Coefficient(y))
	if err != nil || math.Abs(mean.Value) > 1e-12 {
		t.Fatalf("mean %v, error %v", mean, err)
	}
	_, err = s.Mean(ctx, s.Apply(fast.Multiply(y), phi))
	var d *fast.Divergent
	if !errors.As(err, &d) {
		t.Fatalf("got %v, want a divergence", err)
	}
	if math.Abs(d.Exponent-(-0.7)) > 1e-6 || !strings.Contains(d.Quantity, "Phi") {
		t.Errorf("%+v", d)
	}
	// The inverse of a square-root process whose zero is reached: <1/y> infinite.
	cir := one(half, func(y float64) float64 { return 0.1 - y }, func(y float64) float64 { return y })
	if s, err = quadrature.New(ctx, cir, quadrature.Settings{}); err != nil {
		t.Fatal(err)
	}
	_, err = s.Mean(ctx, s.Coefficient(fast.Func1("1/y", func(y float64) float64 { return 1 / y })))
	if !errors.As(err, &d) || math.Abs(d.Exponent-(-1.8)) > 1e-6 || d.Where != "0" {
		t.Errorf("got %v", err)
	}
}

func TestUndefined(t *testing.T) {
	ctx := context.Background()
	for name, p := range map[string]*fast.Problem{
		"logarithm of a negative number": one(line, func(y float64) float64 { return -y + math.Log(y) }, constant(1)),
		"pole inside":                    one(line, func(y float64) float64 { return -y + 1/(y-0.3) }, constant(1)),
		"negative diffusion":             one(line, func(y float64) float64 { return -y }, func(y float64) float64 { return 1 - y*y }),
	} {
		s, err := quadrature.New(ctx, p, quadrature.Settings{})
		if err == nil {
			_, err = s.Mean(ctx, s.Coefficient(fast.Constant(1)))
		}
		var u *fast.Undefined
		if !errors.As(err, &u) {
			t.Errorf("%s: %v", name, err)
		} else {
			t.Logf("%s: %v", name, err)
		}
	}
	s, err := quadrature.New(ctx, one(line, func(y float64) float64 { return -y }, constant(2)), quadrature.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	_, err = s.Mean(ctx, s.Coefficient(fast.Func1("log(y)", math.Log)))
	var u *fast.Undefined
	if !errors.As(err, &u) || u.Coefficient != "log(y)" {
		t.Error(err)
	}
}

// A singularity inside the domain that no average survives, and some that do.
func TestInteriorSingularities(t *testing.T) {
	ctx := context.Background()
	gauss := one(line, func(y float64) float64 { return -y }, constant(2))
	for _, c := range []struct {
		name string
		g    func(float64) float64
		want float64 // +Inf: divergent
	}{
		{"1/y", func(y float64) float64 { return 1 / y }, math.Inf(1)},
		{"1/y^2", func(y float64) float64 { return 1 / (y * y) }, math.Inf(1)},
		{"exp(y^2/2)", func(y float64) float64 { return math.Exp(y * y / 2) }, math.Inf(1)},
		{"exp(y^2)", func(y float64) float64 { return math.Exp(y * y) }, math.Inf(1)},
		{"log|y|", func(y float64) float64 { return math.Log(math.Abs(y)) }, -(0.57721566490153286061 + math.Ln2) / 2},
		{"|y|^(-1/2)", func(y float64) float64 { return 1 / math.Sqrt(math.Abs(y)) }, math.Pow(2, -0.25) * math.Gamma(0.25) / math.Sqrt(math.Pi)},
		{"|y-0.3|", func(y float64) float64 { return math.Abs(y - 0.3) }, 0.3*math.Erf(0.3/math.Sqrt2) + 2*math.Exp(-0.045)/math.Sqrt(2*math.Pi)},
		{"step at 0.3", func(y float64) float64 { return math.Max(0, math.Copysign(1, y-0.3)) }, 0.5 * math.Erfc(0.3/math.Sqrt2)},
	} {
		s, err := quadrature.New(ctx, gauss, quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		m, err := s.Mean(ctx, s.Coefficient(fast.Func1(c.name, c.g)))
		if math.IsInf(c.want, 1) {
			var d *fast.Divergent
			if !errors.As(err, &d) || d.Quantity != c.name {
				t.Errorf("%s: %v, %v", c.name, m, err)
			}
			continue
		}
		if err != nil {
			t.Error(err)
			continue
		}
		check(t, c.name+" under the normal law", m, c.want, 1e-14)
	}
}

// The values at distance d from an end, given exactly, against the expansion
// found at the end: Beta law with exponents 0.02 on [3, 5].
func TestEndValues(t *testing.T) {
	ctx := context.Background()
	f := func(y float64) float64 { return 0.02 * (4 - y) }
	a := func(y float64) float64 { return (y - 3) * (5 - y) }
	noise := fast.Func1("a", a)
	noise.Lower = func(dst, d []float64) {
		for k, x := range d {
			dst[k] = x * (2 - x)
		}
	}
	noise.Upper = noise.Lower
	for name, c := range map[string]fast.Coefficient{"expansion": fast.Func1("a", a), "exact": noise} {
		p := &fast.Problem{Domains: []fast.Domain{wall(3, 5)}, Drift: []fast.Coefficient{fast.Func1("f", f)}, Diffusion: [][]fast.Coefficient{{c}}}
		s, err := quadrature.New(ctx, p, quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		y := fast.Func1("y", func(y float64) float64 { return y })
		phi, mean, err := s.Solve(ctx, s.Coefficient(y))
		if err != nil {
			t.Fatal(err)
		}
		v, err := s.Mean(ctx, s.Apply(fast.Multiply(y), phi))
		if err != nil {
			t.Fatal(err)
		}
		check(t, name+": mean", mean, 4, 1e-13)
		// Phi = (y-4)/k and the variance of the Beta law on an interval of
		// length 2 is 1/(1+2k/g^2) with k = 0.02, g = 1 (Forman, Sorensen 2008).
		check(t, name+": <y Phi>", v, 1/(1+0.04)/0.02, 1e-11)
	}
}
