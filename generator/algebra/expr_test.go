package algebra

import "testing"

// TestPrinted fixes what is printed for what is typed.
func TestPrinted(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"x + x", "2*x"},
		{"0.1 + 0.2", "3/10"},
		{"x^2 - y^2", "x^2 - y^2"},
		{"(x^2 - y^2)/(x - y)", "x + y"},
		{"(x^3 - y^3)/(x - y)", "x^2 + x*y + y^2"},
		{"1/(x+1) + 1/(x-1)", "2*x/(x^2 - 1)"},
		{"sqrt(x^2)", "abs(x)"},
		{"sqrt(a^2)", "a"},
		{"sqrt(m^2)", "-m"},
		{"sqrt(2*D)", "sqrt(2*D)"},
		{"sqrt(2*D)^2", "2*D"},
		{"sqrt(2*D)/D", "sqrt(2/D)"},
		{"1/sqrt(2)", "1/sqrt(2)"},
		{"sqrt(8)", "2*sqrt(2)"},
		{"exp(x)*exp(y)", "exp(x + y)"},
		{"exp(x)^2*exp(-2*x)", "1"},
		{"exp(2*log(a))", "a^2"},
		{"log(a*D)", "log(D) + log(a)"},
		{"log(x*y)", "log(x*y)"},
		{"sin(x)^2 + cos(x)^2", "1"},
		{"cos(theta)^2 - sin(theta)^2", "cos(2*theta)"},
		{"sin(theta)*cos(theta)", "sin(2*theta)/2"},
		{"sin(2*pi*x)*cos(2*pi*y)", "sin(2*pi*x)*cos(2*pi*y)"},
		{"sin(pi/3)", "sqrt(3)/2"},
		{"cos(pi/4)", "1/sqrt(2)"},
		{"cos(pi)", "-1"},
		{"tan(theta)*cos(theta)", "sin(theta)"},
		{"1/(2 + cos(theta))", "1/(cos(theta) + 2)"},
		{"v*diff(v, x)/(2*D)", "v*diff(v, x)/(2*D)"},
		{"diff(v^2, x)", "2*v*diff(v, x)"},
		{"v*(D*diff(v,x) - omega_*diff(v,y))/(2*(D^2+omega_^2))", "v*(D*diff(v, x) - omega_*diff(v, y))/(2*(D^2 + omega_^2))"},
		{"v^(1+c*D)*v^(-1)", "v^(D*c)"},
		{"(1+x^2)^(-1/2-k*D)", "(x^2 + 1)^(-(D*k + 1/2))"},
		{"(sqrt(2)*v + b*sqrt(D))/(2*v^2-b^2*D)", "1/(v*sqrt(2) - b*sqrt(D))"},
		{"(v/sqrt(D)-b/sqrt(2))^2", "(v*sqrt(2) - b*sqrt(D))^2/(2*D)"},
		{"1 - x^2", "1 - x^2"},
		{"-x - y", "-(x + y)"},
		{"x^(-2) + 1/x", "1/x + 1/x^2"},
		{"besseli(2, a)", "besseli(0, a) - 2*besseli(1, a)/a"},
		{"gamma(5)", "24"},
		{"sqrt(1 - cos(x)^2)", "abs(sin(x))"},
		{"log(2 + sin(x))", "log(sin(x) + 2)"},
		{"sign(sin(x)) - sign(y - x) - sign(x - y)", "sign(sin(x))"},
		{"abs(sin(x)*cos(y))", "abs(sin(x))*abs(cos(y))"},
		{"sqrt(1 - cos(x))", "abs(sin(x/2))*sqrt(2)"},
		{"gamma(a + 1/2)*gamma(c)", "gamma(a + 1/2)*gamma(c)"},
		{"gamma(a + 2)/gamma(a)", "a^2 + a"},
		{"exp(sin(x) + cos(x))*exp(-cos(x))", "exp(sin(x))"},
		{"exp(a*cos(theta)/k)", "exp(a*cos(theta)/k)"},
		{"exp(1/(2 + cos(theta)))^2", "exp(2/(cos(theta) + 2))"},
		{"exp(cos(theta)*log(a))", "a^cos(theta)"},
		{"diff(exp(sin(x)), x)", "cos(x)*exp(sin(x))"},
		{"2^cos(x)*2^(-cos(x))", "1"},
		{"gamma(1/2)", "sqrt(pi)"},
		{"diff(v(x+1, y), x)", "at(diff(v, x), x, x + 1, y, y)"},
		{"diff(exp(-U/k), x)", "-diff(U, x)*exp(-U/k)/k"},
		{"sinh(x)^2 - cosh(x)^2", "-1"},
		{"abs(x)^2", "x^2"},
		{"x/abs(x)*abs(x)", "x"},
		{"sqrt(1+x^2)*sqrt(1+x^2)", "x^2 + 1"},
		{"1/(1+sqrt(1+x^2))", "(sqrt(x^2 + 1) - 1)/x^2"},
		{"diff(sqrt(1+x^2), x)", "x/sqrt(x^2 + 1)"},
		{"sinh(x)", "sinh(x)"},
		{"x*cosh(2*x)/3 + 1", "x*cosh(2*x)/3 + 1"},
		{"sin(sin(x))", "sin(sin(x))"},
		{"exp(a*cos(theta))*exp(-a*cos(theta)+sin(theta))", "exp(sin(theta))"},
		{"diff(exp(a*cos(theta)), theta)", "-a*sin(theta)*exp(a*cos(theta))"},
		{"tan(tan(x))", "sin(sin(x)/cos(x))/cos(sin(x)/cos(x))"},
		{"abs(x)/x + abs(x+y)/(x+y)", "((x + y)*abs(x) + x*abs(x + y))/(x*(x + y))"},
		{"gamma((x+y)/(x-y))", "gamma((x + y)/(x - y))"},
		{"gamma(x+2)", "x*(x + 1)*gamma(x)"},
	} {
		r := testRing(t)
		e, err := readExpr(r, c.in)
		if err != nil {
			t.Errorf("%s: %v", c.in, err)
			continue
		}
		if got := e.String(); got != c.want {
			t.Errorf("%s\n  prints %s\n  want   %s", c.in, got, c.want)
		}
		again, err := readExpr(r, e.String())
		if err != nil || !again.Equal(e) {
			t.Errorf("%s: prints %s, which reads back as %v (%v)", c.in, e, again, err)
		}
	}
}
