package grid

import (
	"math"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

// axis is the grid of one coordinate: n cells of equal size in a variable t.
type axis struct {
	n        int
	periodic bool
	step     float64
	y        []float64 // centres
	// dy and ddy are the derivatives of y by t.
	dy, ddy []float64
	lo, hi  float64
	toT     func(y float64) float64 // position in cells, the centre of cell 0 at 0
}

func newAxis(d fast.Domain, w spectral.Window, n int) *axis {
	a := &axis{n: n, periodic: d.IsPeriodic(), y: make([]float64, n), dy: make([]float64, n), ddy: make([]float64, n)}
	if a.periodic {
		a.lo, a.hi = d.Ends()
	} else {
		a.lo, a.hi = w.Lower, w.Upper
	}
	if w.Heavy && d.Kind == fast.Line {
		t0, t1 := math.Asinh((a.lo-w.Centre)/w.Scale), math.Asinh((a.hi-w.Centre)/w.Scale)
		a.step = (t1 - t0) / float64(n)
		for j := range a.y {
			t := t0 + (float64(j)+0.5)*a.step
			a.y[j] = w.Centre + w.Scale*math.Sinh(t)
			a.dy[j], a.ddy[j] = w.Scale*math.Cosh(t), w.Scale*math.Sinh(t)
		}
		a.toT = func(y float64) float64 { return (math.Asinh((y-w.Centre)/w.Scale)-t0)/a.step - 0.5 }
		return a
	}
	a.step = (a.hi - a.lo) / float64(n)
	for j := range a.y {
		a.y[j], a.dy[j] = a.lo+(float64(j)+0.5)*a.step, 1
	}
	a.toT = func(y float64) float64 { return (y-a.lo)/a.step - 0.5 }
	return a
}

// point is a neighbour with a weight.
type point struct {
	j int
	w float64
}

// ghost says how values beyond a wall continue.
type ghost uint8

const (
	mirror      ghost = iota // zero slope at the wall
	extrapolate              // quadratic, for functions without that property
)

// neighbour returns cell j+s (s = -1, 0, 1) in terms of cells of the grid.
func (a *axis) neighbour(j, s int, g ghost) []point {
	k := j + s
	switch {
	case a.periodic:
		return []point{{(k + a.n) % a.n, 1}}
	case k >= 0 && k < a.n:
		return []point{{k, 1}}
	case g == mirror:
		return []point{{j, 1}}
	case k < 0:
		return []point{{0, 3}, {1, -3}, {2, 1}}
	default:
		return []point{{a.n - 1, 3}, {a.n - 2, -3}, {a.n - 3, 1}}
	}
}

// stencil is the derivative of an order up to 2 at cell j.
func (a *axis) stencil(j, order int, g ghost) []point {
	var out []point
	add := func(s int, w float64) {
		for _, p := range a.neighbour(j, s, g) {
			out = append(out, point{p.j, p.w * w})
		}
	}
	h, d := a.step, a.dy[j]
	switch order {
	case 0:
		add(0, 1)
	case 1:
		add(1, 1/(2*h*d))
		add(-1, -1/(2*h*d))
	case 2:
		// d^2/dy^2 = (1/d) d/dt (1/d) d/dt.
		first := -a.ddy[j] / (d * d * d)
		add(1, 1/(h*h*d*d)+first/(2*h))
		add(-1, 1/(h*h*d*d)-first/(2*h))
		add(0, -2/(h*h*d*d))
	}
	return out
}
