package algebra

import (
	"encoding/xml"
	"errors"
	"io"
	"strings"
	"testing"
)

// TestLaTeXAndText fixes what is set for what is typed. Every TeX line
// compiles with amsmath alone.
func TestLaTeXAndText(t *testing.T) {
	for _, c := range []struct{ in, latex, text string }{
		{"v*diff(v,x)/(2*D)", `\frac{v \, \partial_{x} v}{2 D}`, "v·∂ₓv/(2D)"},
		{"v*(D*diff(v,x) - omega_*diff(v,y))/(2*(D^2+omega_^2))",
			`\frac{v \, (D \, \partial_{x} v - \omega \, \partial_{y} v)}{2 (D^{2} + \omega^{2})}`,
			"v·(D·∂ₓv - ω·∂_y v)/(2(D² + ω²))"},
		{"sqrt(2*D)", `\sqrt{2 D}`, "√(2D)"},
		{"exp(-x^2/2)/sqrt(2*pi)", `\frac{\mathrm{e}^{-x^{2}/2}}{\sqrt{2 \pi}}`, "exp(-x²/2)/√(2π)"},
		{"diff(v,x,2)*x+diff(v,x,y)^2", `x \, \partial_{x}^{2} v + (\partial_{x} \partial_{y} v)^{2}`, "x·∂ₓ²v + (∂ₓ∂_y v)²"},
		{"diff(exp(-U/k),x)", `-\frac{\mathrm{e}^{-U/k} \, \partial_{x} U}{k}`, "-exp(-U/k)·∂ₓU/k"},
		{"v(x+1,y)^2", `v(x + 1, y)^{2}`, "v(x + 1, y)²"},
		{"diff(v(x+1,y),x)", `(\partial_{x} v)(x + 1, y)`, "(∂ₓv)(x + 1, y)"},
		{"x*sin(theta)*cos(phi)*y", `x y \sin \theta \cos \phi`, "x·y·sin(θ)·cos(φ)"},
		{"(1+x^2)^(-1/2-k*D)", `(x^{2} + 1)^{-(D k + 1/2)}`, "(x² + 1)^(-(D·k + 1/2))"},
		{"gamma(a+1/2)*besseli(0,a)^2", `I_{0}(a)^{2} \Gamma\left(a + \frac{1}{2}\right)`, "I₀(a)²·Γ(a + 1/2)"},
		{"abs(x)/sign(x)", `\frac{|x|}{\operatorname{sgn}(x)}`, "|x|/sign(x)"},
		{"integral(exp(-s_^2),s_,0,x)*x", `x \int_{0}^{x} \mathrm{e}^{-s^{2}} \,\mathrm{d}s`, "x·∫[0, x] exp(-s²) ds"},
		{"polygamma(0,a)+polygamma(2,a)", `\psi(a) + \psi^{(2)}(a)`, "ψ(a) + ψ^(2)(a)"},
		{"2*3^(1/3)*x", `2 \cdot 3^{1/3} x`, "2·3^(1/3)·x"},
		{"x*(y+z)*(1+y)", `x \, (y + 1) (y + z)`, "x·(y + 1)·(y + z)"},
		{"diff(v,x)^(-2)", `\frac{1}{(\partial_{x} v)^{2}}`, "1/(∂ₓv)²"},
		{"log(x)*y - erf(x/sqrt(2))", `y \log x - \operatorname{erf}\left(\frac{x}{\sqrt{2}}\right)`, "y·log(x) - erf(x/√2)"},
		{"D_r*x1*speed", `D_{r} \, \mathit{speed} \, x_{1}`, "Dᵣ·speed·x₁"},
		{"lambda_max", `\lambda_{\mathrm{max}}`, "λₘₐₓ"},
		{"eps", `\varepsilon`, "ε"},
		{"exp(1)*x", `x \mathrm{e}`, "x·e"},
		{"q^2", `{q^{\ast}}^{2}`, "q²"},
		{"straße*ж", `\mathit{stra\text{ß}e} \, \mathrm{u436}`, "straße·ж"},
	} {
		r := testRing(t)
		for _, n := range strings.Fields("D_r speed lambda_max eps straße ж x1") {
			r.Declare(n, Attr{Parameter: n == "D_r"})
		}
		r.Declare("q", Attr{Latex: `q^{\ast}`})
		f := mustRead(t, r, c.in).Form()
		if got := f.LaTeX(LatexOptions{}); got != c.latex {
			t.Errorf("%s in TeX is\n     %s\nwant %s", c.in, got, c.latex)
		}
		if got := f.Text(); got != c.text {
			t.Errorf("%s as text is\n     %s\nwant %s", c.in, got, c.text)
		}
	}
}

func TestLatexInline(t *testing.T) {
	r := testRing(t)
	f := mustRead(t, r, "v*diff(v,x)/(2*D) - 1/(a+b)").Form()
	if got, want := f.LaTeX(LatexOptions{Inline: true}), `v \, \partial_{x} v/(2 D) - 1/(a + b)`; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}

// TestSummands: the pieces put together are the whole.
func TestSummands(t *testing.T) {
	r := testRing(t)
	for _, in := range []string{"x + y^2 - z/a", "-x - y", "x", "-x", "-(x+1)*y - 2"} {
		f := mustRead(t, r, in).Form()
		parts := f.LatexSummands(LatexOptions{})
		if f.Op != FormNeg && strings.Join(parts, " ") != f.LaTeX(LatexOptions{}) {
			t.Errorf("%s: %q against %s", in, parts, f.LaTeX(LatexOptions{}))
		}
		for i, s := range parts {
			if i > 0 && s[0] != '+' && s[0] != '-' {
				t.Errorf("%s: piece %q has no sign", in, s)
			}
		}
	}
	f := mustRead(t, r, "-x - y").Form()
	if got := strings.Join(f.LatexSummands(LatexOptions{}), "|"); got != "-x|- y" {
		t.Errorf("-x - y is cut as %s", got)
	}
}

func TestTextLines(t *testing.T) {
	r := testRing(t)
	e := mustRead(t, r, "(x + 2*y)*sin(theta) + (x+3*a*b*y+D^2*z)^2*v + x*y*z*a*b*cos(3*theta) - y^3*h + x^5*y^4*z")
	lines := e.Form().TextLines(60)
	if len(lines) < 3 {
		t.Fatalf("not broken: %q", lines)
	}
	for i, l := range lines {
		if i > 0 && !strings.HasPrefix(l, "    + ") && !strings.HasPrefix(l, "    - ") {
			t.Errorf("line %d does not begin with a sign: %q", i, l)
		}
	}
	joined := strings.Join(lines, "")
	if strings.ReplaceAll(joined, " ", "") != strings.ReplaceAll(e.Form().Text(), " ", "") {
		t.Errorf("broken %s\nwhole  %s", joined, e.Form().Text())
	}
}

// TestMathML: well-formed, and the parts that browsers are particular about.
func TestMathML(t *testing.T) {
	for _, c := range []struct {
		in   string
		want []string
	}{
		{"-x - y", []string{`<mo form="prefix">&#x2212;</mo>`}},
		{"x - y", []string{"<mi>x</mi><mo>&#x2212;</mo><mi>y</mi>"}},
		{"diff(v, x)", []string{"<msub><mi>&#x2202;</mi><mi>x</mi></msub><mi>v</mi>"}},
		{"diff(v, x, 2)", []string{"<msubsup><mi>&#x2202;</mi><mi>x</mi><mn>2</mn></msubsup>"}},
		{"x*y", []string{"<mi>x</mi><mo>&#x2062;</mo><mi>y</mi>"}},
		{"sin(theta)", []string{"<mi>sin</mi><mo>&#x2061;</mo>", "<mi>θ</mi>"}},
		{"x/(2*D)", []string{"<mfrac><mrow><mi>x</mi></mrow><mrow><mn>2</mn>"}},
		{"sqrt(2*D)", []string{"<msqrt>"}},
		{"exp(-x)", []string{`<msup><mi mathvariant="normal">e</mi>`}},
		{"besseli(0, a)", []string{"<msub><mi>I</mi><mrow><mn>0</mn></mrow></msub>"}},
		{"abs(x)*gamma(a)*polygamma(3, a)*erf(y)*sign(z)*v(x+1,y)*2^(1/3)*3", nil},
		{"integral(h(s_)*exp(s_*x), s_, 0, x)*2", nil},
		{"q + w", []string{"<msub><mi>ρ</mi><mi>s</mi></msub>", "<mi>w</mi>"}},
	} {
		r := testRing(t)
		r.Declare("q", Attr{Latex: `\rho_{s}`})
		r.Declare("w", Attr{Latex: `\hat{w}`})
		f := mustRead(t, r, c.in).Form()
		got := f.MathML()
		for _, w := range c.want {
			if !strings.Contains(got, w) {
				t.Errorf("%s: %s lacks %s", c.in, got, w)
			}
		}
		d := xml.NewDecoder(strings.NewReader(got))
		for {
			if _, err := d.Token(); errors.Is(err, io.EOF) {
				break
			} else if err != nil {
				t.Errorf("%s: %s: %v", c.in, got, err)
				break
			}
		}
		if n := len(f.MathMLSummands()); n != len(f.summands()) {
			t.Errorf("%s has %d pieces", c.in, n)
		}
	}
}

func TestCode(t *testing.T) {
	for _, c := range []struct{ in, gotext, c, python, julia string }{
		{"x^2/(2*D) - 3", "x*x/(2.0*D) - 3.0", "x*x/(2.0*D) - 3.0", "x**2/(2.0*D) - 3.0", "x^2/(2.0*D) - 3.0"},
		{"-x^2", "-x*x", "-x*x", "-x**2", "-x^2"},
		{"(x+y)^2*abs(z)", "math.Pow(x + y, 2.0)*math.Abs(z)", "pow(x + y, 2.0)*fabs(z)", "(x + y)**2*np.abs(z)", "(x + y)^2*abs(z)"},
		{"1/(x^2*y)", "1.0/(x*x*y)", "1.0/(x*x*y)", "1.0/(x**2*y)", "1.0/(x^2*y)"},
		{"sign(x)*exp(-y/3)", "float64(cmp.Compare(x, 0))*math.Exp(-y/3.0)", "(double)((x > 0) - (x < 0))*exp(-y/3.0)", "np.sign(x)*np.exp(-y/3.0)", "sign(x)*exp(-y/3.0)"},
		{"y^(2/3)*z", "math.Pow(math.Abs(y), 2.0/3.0)*z", "", "np.abs(y)**(2.0/3.0)*z", ""},
		{"besseli(1, a)*lambda", "", "", "lambda_*special.iv(1, a)", "lambda*besseli(1, a)"},
		{"2*pi*x", "2.0*math.Pi*x", "2.0*3.14159265358979323846*x", "2.0*np.pi*x", "2.0*pi*x"},
	} {
		r := testRing(t)
		r.Declare("lambda", Attr{})
		f := mustRead(t, r, c.in).Form()
		for l, want := range map[Language]string{Go: c.gotext, C: c.c, Python: c.python, Julia: c.julia} {
			got, err := f.Code(l)
			if want == "" {
				continue
			}
			if err != nil || got != want {
				t.Errorf("%s in %s is\n     %s (%v)\nwant %s", c.in, l, got, err, want)
			}
		}
	}
	r := testRing(t)
	for _, in := range []string{"diff(v, x)", "integral(exp(s_^2), s_, 0, x)", "besseli(0, a)"} {
		if _, err := mustRead(t, r, in).Form().Code(Go); !errors.Is(err, ErrNotLowered) {
			t.Errorf("%s in Go: %v", in, err)
		}
	}
}
