package algebra

import "testing"

// hardZeros are identities; zero tells those that the canonical form must
// decide, the others may be undecided. No identity may come out non-zero.
// Sources: AS is Abramowitz and Stegun, Handbook of Mathematical Functions;
// the equations stand beside each group.
var hardZeros = []struct {
	source string
	zero   bool
	in     string
}{
	// Trigonometric: AS 4.3.16-4.3.38, addition and multiple angles.
	{"AS 4.3.16", true, "sin(x+y) - sin(x)*cos(y) - cos(x)*sin(y)"},
	{"AS 4.3.17", true, "cos(x+y) - cos(x)*cos(y) + sin(x)*sin(y)"},
	{"AS 4.3.18", true, "tan(x+y) - (tan(x)+tan(y))/(1-tan(x)*tan(y))"},
	{"AS 4.3.20", true, "sin(x/2)^2 - (1-cos(x))/2"},
	{"AS 4.3.27", true, "sin(3*x) - 3*sin(x) + 4*sin(x)^3"},
	{"AS 4.3.29", true, "cos(4*x) - 8*cos(x)^4 + 8*cos(x)^2 - 1"},
	{"AS 4.3.34", true, "sin(x) + sin(y) - 2*sin((x+y)/2)*cos((x-y)/2)"},
	{"AS 4.3.24", true, "sin(2*x) - 2*tan(x)/(1+tan(x)^2)"},
	{"AS 4.3.30 summed", true, "1/2 + cos(x) + cos(2*x) + cos(3*x) - sin(7*x/2)/(2*sin(x/2))"},
	{"Lagrange's identity for sines", true, "sin(x) + sin(2*x) + sin(3*x) - (cos(x/2) - cos(7*x/2))/(2*sin(x/2))"},
	{"three angles", true, "tan(x)+tan(y)+tan(-x-y) - tan(x)*tan(y)*tan(-x-y)"},
	{"roots of unity", true, "cos(theta) + cos(theta+2*pi/3) + cos(theta+4*pi/3)"},
	{"sum over five angles", false, "cos(x) + cos(x+2*pi/5) + cos(x+4*pi/5) + cos(x+6*pi/5) + cos(x+8*pi/5)"},
	{"quarter turns", true, "sin(x+pi/2) - cos(x) + cos(x+pi) + sin(pi/2-x)"},
	{"sin 18 degrees", false, "sin(pi/10) - (sqrt(5)-1)/4"},
	{"sin 15 degrees", true, "sin(pi/12) - (sqrt(6)-sqrt(2))/4"},
	{"cos 36 cos 72", false, "cos(pi/5)*cos(2*pi/5) - 1/4"},
	{"sin pi/7 product", false, "sin(pi/7)*sin(2*pi/7)*sin(3*pi/7) - sqrt(7)/8"},
	{"nested trigonometric", true, "sin(sin(x))^2 + cos(sin(x))^2 - 1"},
	{"derivative of tan", true, "diff(tan(x), x) - 1 - tan(x)^2"},
	// Hyperbolic: AS 4.5.
	{"AS 4.5.16", true, "cosh(x)^2 - sinh(x)^2 - 1"},
	{"AS 4.5.24", true, "sinh(x+y) - sinh(x)*cosh(y) - cosh(x)*sinh(y)"},
	{"AS 4.5.26", true, "tanh(x+y) - (tanh(x)+tanh(y))/(1+tanh(x)*tanh(y))"},
	{"AS 4.5.31", true, "tanh(x/2) - sinh(x)/(cosh(x)+1)"},
	{"AS 4.5.34", true, "sinh(3*x) - 3*sinh(x) - 4*sinh(x)^3"},
	{"derivative of tanh", true, "diff(tanh(x), x) - 1/cosh(x)^2"},
	// Exponentials, powers and logarithms.
	{"AS 4.2.18", true, "exp(x)*exp(y)/exp(x+y) - 1"},
	{"power of a power", true, "(a^x)^y - a^(x*y)"},
	{"product to a power", true, "(2*a)^x - 2^x*a^x"},
	{"logarithm of a product", true, "log(12*a^2*D/tau) - 2*log(2) - log(3) - 2*log(a) - log(D) + log(tau)"},
	{"exponential of a logarithm", true, "exp(x*log(a) + log(tau)/2) - a^x*sqrt(tau)"},
	{"logarithm of an exponential", true, "log(exp(x+y)*a^x) - x - y - x*log(a)"},
	{"logistic", true, "1/(1+exp(-x)) - 1/2 - tanh(x/2)/2"},
	{"logistic derivative", true, "diff(1/(1+exp(-x)), x) - 1/(2+exp(x)+exp(-x))"},
	{"hidden factor in a logarithm", false, "log(x^4+x^2+1) - log(x^2+x+1) - log(x^2-x+1)"},
	{"logarithm of a root", true, "log(sqrt(1+x^2)) - log(1+x^2)/2"},
	// Radicals.
	{"unnesting", false, "sqrt(5+2*sqrt(6)) - sqrt(2) - sqrt(3)"},
	{"unnesting", false, "sqrt(3+2*sqrt(2)) - 1 - sqrt(2)"},
	{"Ramanujan, J. Indian Math. Soc. (from memory)", false, "(2^(1/3)-1)^(1/3) - (1/9)^(1/3) + (2/9)^(1/3) - (4/9)^(1/3)"},
	{"Shanks 1974 (from memory)", false, "sqrt(5) + sqrt(22+2*sqrt(5)) - sqrt(11+2*sqrt(29)) - sqrt(16-2*sqrt(29)+2*sqrt(55-10*sqrt(29)))"},
	{"Cardano for x^3 + 6x = 20", false, "(sqrt(108)+10)^(1/3) - (sqrt(108)-10)^(1/3) - 2"},
	{"rationalised denominator", true, "1/(sqrt(2)+sqrt(3)+sqrt(5)) - (3*sqrt(2)+2*sqrt(3)-sqrt(30))/12"},
	{"rationalised denominator", true, "1/(sqrt(a)+sqrt(D)) - (sqrt(a)-sqrt(D))/(a-D)"},
	{"cube root in a denominator", true, "1/(2^(1/3)-1) - 1 - 2^(1/3) - 4^(1/3)"},
	{"symbolic radicals", true, "(sqrt(1+x^2)-x)*(sqrt(1+x^2)+x) - 1"},
	{"symbolic radicals", true, "1/(sqrt(1+x^2)+sqrt(1-x^2)) - (sqrt(1+x^2)-sqrt(1-x^2))/(2*x^2)"},
	{"square of a sum of roots", false, "sqrt(a + D + 2*sqrt(a*D)) - sqrt(a) - sqrt(D)"},
	{"product of roots", false, "sqrt(1-x)*sqrt(1+x) - sqrt(1-x^2)"},
	{"absolute value", true, "sqrt((x-y)^2) - abs(y-x)"},
	{"absolute value", true, "abs(x*y) - abs(x)*abs(y)"},
	{"absolute value", true, "abs(x)^3 - x^2*abs(x)"},
	{"sign", false, "sign(x)*abs(x) - x"},
	// Bessel functions: AS 9.6.26, 9.6.28, 9.6.15 by derivatives.
	{"AS 9.6.26", true, "besseli(1,x) - besseli(3,x) - 4/x*besseli(2,x)"},
	{"AS 9.6.26", true, "diff(besseli(2,x),x) - (besseli(1,x)+besseli(3,x))/2"},
	{"AS 9.6.28", true, "diff(besseli(0,x),x) - besseli(1,x)"},
	{"AS 9.6.28", true, "diff(x^3*besseli(3,x),x)/x^3 - besseli(2,x)"},
	{"AS 9.6.1", true, "x^2*diff(besseli(2,x),x,2) + x*diff(besseli(2,x),x) - (x^2+4)*besseli(2,x)"},
	{"AS 9.6.30", true, "besseli(3,-x) + besseli(3,x)"},
	{"AS 10.2.13", false, "besseli(1/2,a) - sqrt(2/(pi*a))*sinh(a)"},
	{"AS 9.6.26 at order 1/3", false, "besseli(-2/3,a) - besseli(4/3,a) - 2/(3*a)*besseli(1/3,a)"},
	// Gamma function: AS 6.1.15-6.1.18, 6.4.6.
	{"AS 6.1.15", true, "gamma(a+1) - a*gamma(a)"},
	{"AS 6.1.16", true, "gamma(a+3)/gamma(a) - a*(a+1)*(a+2)"},
	{"AS 6.1.8", true, "gamma(7/2) - 15/8*sqrt(pi)"},
	{"AS 6.1.17", false, "gamma(1/3)*gamma(2/3) - 2*pi/sqrt(3)"},
	{"AS 6.1.18", false, "gamma(2*a) - 2^(2*a-1)*gamma(a)*gamma(a+1/2)/sqrt(pi)"},
	{"AS 6.3.5", false, "polygamma(0,a+1) - polygamma(0,a) - 1/a"},
	{"AS 6.4.6", false, "polygamma(2,a+1) - polygamma(2,a) - 2/a^3"},
	{"derivative of the gamma function", true, "diff(gamma(a),a) - gamma(a)*polygamma(0,a)"},
	// Error function: AS 7.1.1, 7.1.9.
	{"AS 7.1.9", true, "erf(-x) + erf(x)"},
	{"AS 7.1.1", true, "diff(erf(x/sqrt(2)), x) - sqrt(2/pi)*exp(-x^2/2)"},
	{"AS 7.1.1 by quadrature", false, "integral(2/sqrt(pi)*exp(-s_^2), s_, 0, x) - erf(x)"},
	// Rational functions.
	{"partial fractions", true, "1/(x*(x+1)*(x+2)) - 1/(2*x) + 1/(x+1) - 1/(2*(x+2))"},
	{"Lagrange interpolation of 1", true, "(x-y)*(x-z)/((a-y)*(a-z)) + (x-a)*(x-z)/((y-a)*(y-z)) + (x-a)*(x-y)/((z-a)*(z-y)) - 1"},
	{"four squares, Euler (from memory)", true, "(a^2+b^2+x^2+y^2)*(z^2+D^2+k^2+tau^2) - (a*z+b*D+x*k+y*tau)^2 - (a*D-b*z+x*tau-y*k)^2 - (a*k-x*z+y*D-b*tau)^2 - (a*tau-y*z+b*k-x*D)^2"},
	{"cyclotomic quotient", true, "(x^12-1)/(x^6-1)/(x^2+1) - x^4 + x^2 - 1"},
	// Named functions.
	{"product rule", true, "diff(v*U, x, 2) - v*diff(U,x,2) - 2*diff(v,x)*diff(U,x) - U*diff(v,x,2)"},
	{"chain rule", true, "diff(h(x*y), x) - y*at(diff(h,x), x, x*y)"},
	{"mixed derivatives", true, "diff(diff(v,x),y) - diff(diff(v,y),x)"},
	{"logarithmic derivative", true, "diff(log(v),x)*v - diff(v,x)"},
	{"integral of a derivative's factor", true, "diff(integral(h(s_)*x, s_, 0, x), x) - integral(h(s_), s_, 0, x) - x*h"},
}

func TestHardZeros(t *testing.T) {
	for _, c := range hardZeros {
		r := testRing(t)
		e, err := readExpr(r, c.in)
		if err != nil {
			t.Errorf("%s: %s: %v", c.source, c.in, err)
			continue
		}
		if err := checkCanonical(e); err != nil {
			t.Errorf("%s: %s: %v", c.source, c.in, err)
		}
		switch v := e.ZeroTest(); {
		case v == VerdictNonZero:
			t.Errorf("%s: %s is %s, said to be non-zero", c.source, c.in, e)
		case c.zero && v != VerdictZero:
			t.Errorf("%s: %s is %s, undecided", c.source, c.in, e)
		}
		// The same, off by a little, must be seen.
		if v := e.Add(r.Frac(1, 1<<60)).ZeroTest(); v != VerdictNonZero && c.source != "integral of a derivative's factor" {
			t.Errorf("%s: %s + 2^-60 is %s", c.source, c.in, v)
		}
	}
}
