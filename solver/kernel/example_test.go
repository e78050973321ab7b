package kernel_test

import (
	"fmt"
	"math"

	"epslim/solver/kernel"
)

// The speed of a gel crawler and its slope along x, evaluated together: sine and
// cosine of both arguments are computed once.
func Example() {
	b := kernel.NewBuilder("x", "y")
	sx, cx := b.SinCos(b.Scale(2*math.Pi, b.Input("x")))
	cy := b.Cos(b.Scale(2*math.Pi, b.Input("y")))
	speed := b.Add(b.Const(1), b.Scale(0.5, b.Mul(sx, cy)))
	slope := b.Scale(math.Pi, b.Mul(cx, cy))
	p, err := b.Compile(speed, slope)
	if err != nil {
		fmt.Println(err)
		return
	}
	out := [][]float64{make([]float64, 3), make([]float64, 3)}
	if err := p.Eval(p.NewScratch(), [][]float64{{0, 0.25, 0.5}, {0}}, out, 3); err != nil {
		fmt.Println(err)
		return
	}
	fmt.Print(p)
	fmt.Printf("%.4f\n", out)
	// Output:
	// t0, t1 = sincos x c=6.283185307179586
	// t2 = cos y c=6.283185307179586
	// out0 = fmak t0 t2 c=0.5 k=1
	// out1 = mul t1 t2 c=3.141592653589793
	// [[1.0000 1.5000 1.0000] [3.1416 0.0000 -3.1416]]
}
