package kernel

import "math"

// vectorOps is one implementation of the vector kernels. All rows of a call
// have one length, a multiple of unit, and the result overlaps no operand. The
// functions that return a number report by a value other than zero that some
// argument is outside the fast range; the caller then redoes those points.
type vectorOps struct {
	name   string
	lin    func(d, a []float64, c, k float64)
	axpy   func(d, a, b []float64, c float64)
	mul    func(d, a, b []float64, c float64)
	fma    func(d, a, b, e []float64, c float64)
	fmak   func(d, a, b []float64, c, k float64)
	div    func(d, a, b []float64, c float64)
	rcp    func(d, a []float64, c float64)
	sqrt   func(d, a []float64)
	abs    func(d, a []float64)
	floor  func(d, a []float64)
	min    func(d, a, b []float64)
	max    func(d, a, b []float64)
	sin    func(d, a []float64, c float64) uint64
	cos    func(d, a []float64, c float64) uint64
	sincos func(d, d2, a []float64, c float64) uint64
	exp    func(d, a []float64, c float64) uint64
	log    func(d, a []float64) uint64

	uniforms func(state *[4][Lanes]uint64, u, v []float64)
	boxer    func(u, v []float64)
	outside  func(a []float64, lo, hi float64) int
}

// run performs the operations on the rows.
func run(t *vectorOps, ops []op, rows [][]float64) {
	for i := range ops {
		o := &ops[i]
		d := rows[o.d]
		switch o.code {
		case opLin:
			t.lin(d, rows[o.a], o.c, o.k)
		case opAxpy:
			t.axpy(d, rows[o.a], rows[o.b], o.c)
		case opMul:
			t.mul(d, rows[o.a], rows[o.b], o.c)
		case opFma:
			t.fma(d, rows[o.a], rows[o.b], rows[o.e], o.c)
		case opFmaK:
			t.fmak(d, rows[o.a], rows[o.b], o.c, o.k)
		case opSin:
			if t.sin(d, rows[o.a], o.c) != 0 {
				redo(d, rows[o.a], o.c, Sin)
			}
		case opCos:
			if t.cos(d, rows[o.a], o.c) != 0 {
				redo(d, rows[o.a], o.c, Cos)
			}
		case opSinCos:
			d2, a := rows[o.d2], rows[o.a]
			if t.sincos(d, d2, a, o.c) != 0 {
				for i, x := range a {
					d[i], d2[i] = SinCos(float64(o.c * x))
				}
			}
		case opExp:
			if t.exp(d, rows[o.a], o.c) != 0 {
				redo(d, rows[o.a], o.c, Exp)
			}
		case opLog:
			if t.log(d, rows[o.a]) != 0 {
				redo(d, rows[o.a], 1, Log)
			}
		default:
			runRare(t, o, d, rows)
		}
	}
}

func runRare(t *vectorOps, o *op, d []float64, rows [][]float64) {
	switch o.code {
	case opFill:
		for i := range d {
			d[i] = o.c
		}
	case opCopy:
		copy(d, rows[o.a])
	case opDiv:
		t.div(d, rows[o.a], rows[o.b], o.c)
	case opRcp:
		t.rcp(d, rows[o.a], o.c)
	case opSqrt:
		t.sqrt(d, rows[o.a])
	case opAbs:
		t.abs(d, rows[o.a])
	case opFloor:
		t.floor(d, rows[o.a])
	case opMin:
		t.min(d, rows[o.a], rows[o.b])
	case opMax:
		t.max(d, rows[o.a], rows[o.b])
	case opCall1:
		for i, x := range rows[o.a] {
			d[i] = o.fn.apply1(x, o.c)
		}
	case opCall2:
		b := rows[o.b]
		for i, x := range rows[o.a] {
			d[i] = o.fn.apply2(x, b[i])
		}
	}
}

// redo evaluates f(c*a) point by point. The reference gives the bits of the
// fast kernel inside the fast range, so every point may be redone.
func redo(d, a []float64, c float64, f func(float64) float64) {
	for i, x := range a {
		d[i] = f(float64(c * x))
	}
}

// portable returns the kernels in Go. Products are rounded explicitly where the
// compiler might fuse them.
func portable() *vectorOps {
	return &vectorOps{
		name: "portable",
		lin: func(d, a []float64, c, k float64) {
			a = a[:len(d)]
			for i := range d {
				d[i] = math.FMA(c, a[i], k)
			}
		},
		axpy: func(d, a, b []float64, c float64) {
			a, b = a[:len(d)], b[:len(d)]
			for i := range d {
				d[i] = math.FMA(c, a[i], b[i])
			}
		},
		mul: func(d, a, b []float64, c float64) {
			a, b = a[:len(d)], b[:len(d)]
			for i := range d {
				d[i] = float64(c*a[i]) * b[i]
			}
		},
		fma: func(d, a, b, e []float64, c float64) {
			a, b, e = a[:len(d)], b[:len(d)], e[:len(d)]
			for i := range d {
				d[i] = math.FMA(float64(c*a[i]), b[i], e[i])
			}
		},
		fmak: func(d, a, b []float64, c, k float64) {
			a, b = a[:len(d)], b[:len(d)]
			for i := range d {
				d[i] = math.FMA(float64(c*a[i]), b[i], k)
			}
		},
		div: func(d, a, b []float64, c float64) {
			a, b = a[:len(d)], b[:len(d)]
			for i := range d {
				d[i] = float64(c*a[i]) / b[i]
			}
		},
		rcp: func(d, a []float64, c float64) {
			a = a[:len(d)]
			for i := range d {
				d[i] = c / a[i]
			}
		},
		sqrt:   func(d, a []float64) { each(d, a, math.Sqrt) },
		abs:    func(d, a []float64) { each(d, a, math.Abs) },
		floor:  func(d, a []float64) { each(d, a, math.Floor) },
		min:    func(d, a, b []float64) { each2(d, a, b, minimum) },
		max:    func(d, a, b []float64) { each2(d, a, b, maximum) },
		sin:    portableSin,
		cos:    portableCos,
		exp:    func(d, a []float64, c float64) uint64 { redo(d, a, c, Exp); return 0 },
		log:    func(d, a []float64) uint64 { redo(d, a, 1, Log); return 0 },
		sincos: portableSinCos,

		uniforms: portableUniforms,
		boxer:    portableBoxer,
		outside:  portableOutside,
	}
}

func portableSin(d, a []float64, c float64) uint64 {
	a = a[:len(d)]
	for i := range d {
		if x := float64(c * a[i]); math.Abs(x) <= trigMax {
			d[i] = sinFast(x)
		} else {
			d[i] = Sin(x)
		}
	}
	return 0
}

func portableCos(d, a []float64, c float64) uint64 {
	a = a[:len(d)]
	for i := range d {
		if x := float64(c * a[i]); math.Abs(x) <= trigMax {
			d[i] = cosFast(x)
		} else {
			d[i] = Cos(x)
		}
	}
	return 0
}

func portableSinCos(d, d2, a []float64, c float64) uint64 {
	d2, a = d2[:len(d)], a[:len(d)]
	large := false
	for i := range d {
		x := float64(c * a[i])
		large = large || !(math.Abs(x) <= trigMax)
		t := math.FMA(x, invPio2, magic)
		kf := t - magic
		d[i], d2[i] = math.FMA(kf, -pio2C, math.FMA(kf, -pio2B, math.FMA(kf, -pio2A, x))), t
	}
	quadrants(d, d2)
	if large {
		for i := range d {
			d[i], d2[i] = SinCos(float64(c * a[i]))
		}
	}
	return 0
}

func portableOutside(a []float64, lo, hi float64) int {
	n := 0
	for _, x := range a {
		if !(x >= lo && x <= hi) {
			n++
		}
	}
	return n
}

func each(d, a []float64, f func(float64) float64) {
	for i, x := range a {
		d[i] = f(x)
	}
}

func each2(d, a, b []float64, f func(x, y float64) float64) {
	for i, x := range a {
		d[i] = f(x, b[i])
	}
}
