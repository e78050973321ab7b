package algebra

import "testing"

// TestPotential checks closed-form potentials by differentiating them back
// (inside Potential) and the printed density exp(u).
func TestPotential(t *testing.T) {
	for _, c := range []struct {
		hx, hy string
		want   string
	}{
		{"-diff(v,x)/v", "-diff(v,y)/v", "1/v"},
		{"(c-1)*diff(v,x)/v", "(c-1)*diff(v,y)/v", "v^(c - 1)"},
		{"-diff(U,x)/k + diff(v,x)/v", "-diff(U,y)/k + diff(v,y)/v", "v*exp(-U/k)"},
		{"-2*x - y", "-x", "exp(-x*(x + y))"},
		{"-x/(1+x^2) - 2*k*D*x/(1+x^2)", "0", "(x^2 + 1)^(-(D*k + 1/2))"},
		{"diff(log(1+1/2*sin(2*pi*x)*cos(2*pi*y)),x)", "diff(log(1+1/2*sin(2*pi*x)*cos(2*pi*y)),y)", "2*sin(2*pi*x)*cos(2*pi*y) + 4"},
		{"y*exp(x*y)", "x*exp(x*y)", "exp(exp(x*y))"},
	} {
		r := testRing(t)
		u, err := r.Potential([]Expr{mustRead(t, r, c.hx), mustRead(t, r, c.hy)}, []string{"x", "y"})
		if err != nil {
			t.Errorf("%s, %s: %v", c.hx, c.hy, err)
			continue
		}
		p, err := r.Call("exp", u)
		if err != nil {
			t.Fatal(err)
		}
		if p.String() != c.want {
			t.Errorf("%s, %s: density %s, want %s", c.hx, c.hy, p, c.want)
		}
	}
	r := testRing(t)
	if u, err := r.Potential([]Expr{mustRead(t, r, "y"), mustRead(t, r, "-x")}, []string{"x", "y"}); err == nil {
		t.Errorf("a rotation has the potential %s", u)
	}
}
