package fokkerplanck_test

import (
	"context"
	"strings"
	"testing"

	"epslim/fokkerplanck"
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// plane is a two-dimensional diffusion in symbols that the cases share.
type plane struct {
	r                *algebra.Ring
	x, y, g, w, D, v algebra.Expr
}

func newPlane(t *testing.T) plane {
	t.Helper()
	r := algebra.NewRing()
	p := plane{r: r}
	p.x = r.Declare("x", algebra.Attr{})
	p.y = r.Declare("y", algebra.Attr{})
	p.g = r.Declare("g", algebra.Attr{Sign: algebra.Positive, Parameter: true})
	p.w = r.Declare("w", algebra.Attr{Parameter: true})
	p.D = r.Declare("D", algebra.Attr{Sign: algebra.Positive, Parameter: true})
	if err := r.DeclareFunction("v", []string{"x", "y"}, algebra.Attr{Sign: algebra.Positive}); err != nil {
		t.Fatal(err)
	}
	v, err := r.Call("v", p.x, p.y)
	if err != nil {
		t.Fatal(err)
	}
	p.v = v
	return p
}

func (p plane) diffusion(kind ito.DomainKind, fx, fy, a algebra.Expr) *fokkerplanck.Diffusion {
	zero := p.r.Int(0)
	d := &fokkerplanck.Diffusion{
		Ring:  p.r,
		Slow:  []fokkerplanck.Variable{{Name: "x", Kind: kind}, {Name: "y", Kind: kind}},
		Drift: []algebra.Expr{fx, fy},
		A:     [][]algebra.Expr{{a, zero}, {zero, a}},
	}
	if kind != ito.Line {
		for i := range d.Slow {
			d.Slow[i].A, d.Slow[i].B = zero, p.r.Int(1)
		}
	}
	return d
}

// TestRotation: the linear drift -g x + w (rotation) with A = 2 D has the
// Gaussian exp(-g (x^2 + y^2)/(2 D)) whatever w, with a current that turns
// (Risken, The Fokker-Planck Equation, section 6.5; from memory).
func TestRotation(t *testing.T) {
	p := newPlane(t)
	fx := p.g.Mul(p.x).Neg().Sub(p.w.Mul(p.y))
	fy := p.g.Mul(p.y).Neg().Add(p.w.Mul(p.x))
	d := p.diffusion(ito.Line, fx, fy, p.D.Mul(p.r.Int(2)))
	s, err := d.Solve(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if s.Reversible != fokkerplanck.No || s.Curl.IsZero() {
		t.Errorf("reversible %v with curl %v", s.Reversible, s.Curl)
	}
	q, err := p.g.Mul(p.x.Mul(p.x).Add(p.y.Mul(p.y))).Div(p.D.Mul(p.r.Int(-2)))
	if err != nil {
		t.Fatal(err)
	}
	want, err := p.r.Call("exp", q)
	if err != nil {
		t.Fatal(err)
	}
	if !s.Density.Valid() || !s.Density.Equal(want) {
		t.Errorf("density %v, want %s", s.Density, want)
	}
	if s.Current[0].IsZero() || !d.Residual(s.Density).IsZero() {
		t.Errorf("current %s with divergence %s", s.Current[0], d.Residual(s.Density))
	}
}

// TestSpeed: the mover with speed v has the density 1/v (M.J. Schnitzer, Phys.
// Rev. E 48 (1993) 2553; from memory), with a current when it turns.
func TestSpeed(t *testing.T) {
	p := newPlane(t)
	half := p.r.Frac(1, 2)
	vx, vy := p.v.Mul(p.v.Diff("x")), p.v.Mul(p.v.Diff("y"))
	for _, c := range []struct {
		name       string
		turn       algebra.Expr
		reversible fokkerplanck.Truth
	}{{"straight", p.r.Int(0), fokkerplanck.Yes}, {"turning", p.w, fokkerplanck.No}} {
		fx := vx.Sub(c.turn.Mul(vy)).Mul(half)
		fy := vy.Add(c.turn.Mul(vx)).Mul(half)
		d := p.diffusion(ito.Periodic, fx, fy, p.v.Mul(p.v))
		s, err := d.Solve(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if s.Reversible != c.reversible || !s.Density.Valid() || s.Density.String() != "1/v" || s.Normal != fokkerplanck.Yes {
			t.Errorf("%s: reversible %v, density %v, normalisable %v", c.name, s.Reversible, s.Density, s.Normal)
		}
	}
}

// TestRing: drift along a ring by a temperature profile (M. Buttiker, Z. Phys.
// B 68 (1987) 161): the potential of h is not single-valued, so the formal
// density is none.
func TestRing(t *testing.T) {
	p := newPlane(t)
	sin := func(k int64, shift algebra.Expr) algebra.Expr {
		s, err := p.r.Call("sin", p.x.Mul(p.r.Pi()).Mul(p.r.Int(k)).Add(shift))
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	temperature := p.r.Int(1).Add(sin(2, p.r.Int(0)).Mul(p.r.Frac(2, 5)))
	force := sin(2, p.r.Int(0))
	d := &fokkerplanck.Diffusion{
		Ring:  p.r,
		Slow:  []fokkerplanck.Variable{{Name: "x", Kind: ito.Periodic, A: p.r.Int(0), B: p.r.Int(1)}},
		Drift: []algebra.Expr{force},
		A:     [][]algebra.Expr{{temperature.Mul(p.r.Int(2))}},
	}
	s, err := d.Solve(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if s.Reversible != fokkerplanck.No || s.Density.Valid() {
		t.Errorf("reversible %v, density %v: %s", s.Reversible, s.Density, s.Why)
	}
}

// TestNoDensity: absorbing sides and densities that change sign are told.
func TestNoDensity(t *testing.T) {
	p := newPlane(t)
	d := p.diffusion(ito.Absorbing, p.r.Int(0), p.r.Int(0), p.r.Int(1))
	s, err := d.Solve(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if s.Density.Valid() || !strings.Contains(s.Why, "absorbing") {
		t.Errorf("density %v: %s", s.Density, s.Why)
	}
	if why := d.Admissible(context.Background(), p.r.Int(1)); why == "" {
		t.Error("a constant passes for a density between absorbing sides")
	}
	d = p.diffusion(ito.Reflecting, p.r.Int(0), p.r.Int(0), p.r.Int(1))
	if why := d.Admissible(context.Background(), p.x.Sub(p.r.Frac(1, 2))); !strings.Contains(why, "changes sign") {
		t.Errorf("x - 1/2 passes for a density: %q", why)
	}
}

// TestNormalisable: (1 + x^2)^(-1/2 - k) has finite mass exactly for k > 0.
func TestNormalisable(t *testing.T) {
	for _, c := range []struct {
		k    int64 // tenths
		want fokkerplanck.Truth
	}{{3, fokkerplanck.Yes}, {0, fokkerplanck.No}, {-2, fokkerplanck.No}} {
		p := newPlane(t)
		a := p.r.Int(1).Add(p.x.Mul(p.x))
		// p'/p = (2 f - A')/A = -(1 + 2 k) x/(1 + x^2) for f = (1/2 - k) x
		d := &fokkerplanck.Diffusion{
			Ring:  p.r,
			Slow:  []fokkerplanck.Variable{{Name: "x", Kind: ito.Line}},
			Drift: []algebra.Expr{p.x.Mul(p.r.Frac(5-c.k, 10))},
			A:     [][]algebra.Expr{{a}},
		}
		s, err := d.Solve(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if s.Normal != c.want {
			t.Errorf("k = %d/10: normalisable %v (%s), density %s", c.k, s.Normal, s.NormalWhy, s.Density)
		}
	}
}
