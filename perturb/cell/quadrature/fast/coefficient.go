package fast

import (
	"math"
	"strconv"
	"strings"
)

// FactorKind says what function of one coordinate a [Factor] is.
type FactorKind uint8

const (
	// Power is y^P; P is an integer on lines, spheres and wherever y changes
	// sign.
	Power FactorKind = iota
	// Cos is cos(P*y).
	Cos
	// Sin is sin(P*y).
	Sin
	// Other is an arbitrary smooth function of one coordinate, Func.
	Other
)

// Factor is a function of one coordinate.
type Factor struct {
	Coordinate int
	Kind       FactorKind
	P          float64
	Func       func(y float64) float64
}

// Value evaluates the factor.
func (f Factor) Value(y float64) float64 {
	switch f.Kind {
	case Power:
		return powInt(y, f.P)
	case Cos:
		return math.Cos(f.P * y)
	case Sin:
		return math.Sin(f.P * y)
	default:
		return f.Func(y)
	}
}

func powInt(y, p float64) float64 {
	switch p {
	case 0:
		return 1
	case 1:
		return y
	case 2:
		return y * y
	case 3:
		return y * y * y
	case 4:
		return (y * y) * (y * y)
	case -1:
		return 1 / y
	}
	return math.Pow(y, p)
}

// Term is a constant times a product of functions of one coordinate each.
type Term struct {
	Constant float64
	Factors  []Factor
}

// Coefficient is a function of the fast variables. At least one of Eval and
// Terms is needed; the zero value is the function 0. A coefficient is
// immutable and its functions must be safe for concurrent use.
type Coefficient struct {
	// Name is how messages call it.
	Name string
	// Eval writes the values at a block of points: y[i][k] is coordinate i of
	// point k, dst[k] the value there. Nil when Terms is given.
	Eval func(dst []float64, y [][]float64)
	// Terms, when not nil, is the function as a sum of products. The spectral
	// route assembles sparse matrices from it; without it the coefficient is
	// treated as dense.
	Terms []Term
	// Lower and Upper are optional and concern one variable with a finite end:
	// they write the values at distance d[k] from the lower or the upper end.
	// They matter where the coefficient vanishes or blows up at an end other
	// than 0, as 1-y does at 1: evaluated from y it has no digits left close
	// to the end. Without them the solver looks for an expansion at the end.
	Lower, Upper func(dst, d []float64)
	// Breaks are places inside the domain of one variable where the function
	// or a derivative jumps. Optional; found by bisection when not given.
	Breaks []float64
}

// Constant is the constant function c.
func Constant(c float64) Coefficient {
	return Coefficient{Name: strconv.FormatFloat(c, 'g', 6, 64), Terms: []Term{{Constant: c}}}
}

// SumOf is the sum of terms.
func SumOf(name string, terms ...Term) Coefficient {
	if terms == nil {
		terms = []Term{}
	}
	return Coefficient{Name: name, Terms: terms}
}

// Monomial is c times the product of y_i^p_i.
func Monomial(c float64, powers ...int) Term {
	t := Term{Constant: c}
	for i, p := range powers {
		if p != 0 {
			t.Factors = append(t.Factors, Factor{Coordinate: i, Kind: Power, P: float64(p)})
		}
	}
	return t
}

// Func1 is a coefficient of one variable from a scalar function.
func Func1(name string, f func(y float64) float64) Coefficient {
	return Coefficient{Name: name, Eval: func(dst []float64, y [][]float64) {
		for k, v := range y[0] {
			dst[k] = f(v)
		}
	}}
}

// FuncN is a coefficient from a scalar function of all coordinates.
func FuncN(name string, f func(y []float64) float64) Coefficient {
	return Coefficient{Name: name, Eval: func(dst []float64, y [][]float64) {
		p := make([]float64, len(y))
		for k := range dst {
			for i := range y {
				p[i] = y[i][k]
			}
			dst[k] = f(p)
		}
	}}
}

// IsZero reports whether c is known to be the function 0.
func (c Coefficient) IsZero() bool {
	if c.Terms == nil {
		return c.Eval == nil && c.Lower == nil && c.Upper == nil
	}
	for _, t := range c.Terms {
		if t.Constant != 0 {
			return false
		}
	}
	return true
}

// Times returns s*c.
func (c Coefficient) Times(s float64) Coefficient {
	if s == 1 {
		return c
	}
	out := Coefficient{Name: c.Name, Breaks: c.Breaks}
	if s != 1 && c.Name != "" {
		out.Name = strconv.FormatFloat(s, 'g', 6, 64) + "*(" + c.Name + ")"
	}
	if c.Terms != nil {
		out.Terms = make([]Term, len(c.Terms))
		for i, t := range c.Terms {
			out.Terms[i] = Term{Constant: s * t.Constant, Factors: t.Factors}
		}
	}
	if c.Eval != nil {
		eval := c.Eval
		out.Eval = func(dst []float64, y [][]float64) {
			eval(dst, y)
			for k := range dst {
				dst[k] *= s
			}
		}
	}
	out.Lower, out.Upper = scaledEnd(c.Lower, s), scaledEnd(c.Upper, s)
	return out
}

func scaledEnd(f func(dst, d []float64), s float64) func(dst, d []float64) {
	if f == nil {
		return nil
	}
	return func(dst, d []float64) {
		f(dst, d)
		for k := range dst {
			dst[k] *= s
		}
	}
}

// Values evaluates c at a block of points, y[i][k] being coordinate i of point
// k.
func (c Coefficient) Values(dst []float64, y [][]float64) {
	if c.Eval != nil {
		c.Eval(dst, y)
		return
	}
	for k := range dst {
		dst[k] = 0
	}
	for _, t := range c.Terms {
		for k := range dst {
			v := t.Constant
			for _, f := range t.Factors {
				v *= f.Value(y[f.Coordinate][k])
			}
			dst[k] += v
		}
	}
}

// At evaluates c at one point.
func (c Coefficient) At(y ...float64) float64 {
	block := make([][]float64, len(y))
	for i, v := range y {
		block[i] = []float64{v}
	}
	var out [1]float64
	c.Values(out[:], block)
	return out[0]
}

// Label returns the name, or a placeholder.
func (c Coefficient) Label() string {
	if c.Name != "" {
		return c.Name
	}
	if c.Terms != nil {
		parts := make([]string, 0, len(c.Terms))
		for _, t := range c.Terms {
			parts = append(parts, strconv.FormatFloat(t.Constant, 'g', 6, 64))
		}
		return "sum[" + strings.Join(parts, ",") + "]"
	}
	return "g"
}
