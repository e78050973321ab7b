//go:build unix

package kernel

import (
	"math"
	"syscall"
	"testing"
)

// cpuNanoseconds is the processor time of this process, which a busy machine
// stretches less than the time on the wall.
func cpuNanoseconds(b *testing.B) float64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		b.Fatal(err)
	}
	return 1e9*float64(u.Utime.Sec+u.Stime.Sec) + 1e3*float64(u.Utime.Usec+u.Stime.Usec)
}

// BenchmarkKernel measures each vector kernel on one block.
func BenchmarkKernel(b *testing.B) {
	a, c := AlignedRow(BlockSize), AlignedRow(BlockSize)
	d, e := AlignedRow(BlockSize), AlignedRow(BlockSize)
	for i := range a {
		a[i], c[i] = 0.01+float64(i)/100, 1.5+float64(i%7)
	}
	for _, im := range Implementations() {
		v := im.ops
		s := NewStream(1, 2)
		for _, k := range []struct {
			name string
			run  func()
		}{
			{"lin", func() { v.lin(d, a, 3, 1) }},
			{"fma", func() { v.fma(d, a, c, c, 2) }},
			{"div", func() { v.div(d, a, c, 1) }},
			{"sqrt", func() { v.sqrt(d, a) }},
			{"sin", func() { v.sin(d, a, 1.5) }},
			{"cos", func() { v.cos(d, a, 1.5) }},
			{"sincos", func() { v.sincos(d, e, a, 1.5) }},
			{"exp", func() { v.exp(d, a, 1.5) }},
			{"log", func() { v.log(d, a) }},
			{"normals", func() { Random{v}.Normals(&s, d) }},
			{"uniforms", func() { Random{v}.Uniforms(&s, d) }},
		} {
			b.Run(k.name+"/"+im.Name(), func(b *testing.B) {
				start := cpuNanoseconds(b)
				for b.Loop() {
					k.run()
				}
				b.ReportMetric((cpuNanoseconds(b)-start)/float64(b.N)/BlockSize, "cpu-ns/point")
			})
		}
	}
}

// steps are the Euler-Maruyama steps of the two models of docs/performance-mc.md.
func steps() map[string]func(b *Builder) []Node {
	const h, eps = 1e-4, 0.1
	speed := func(b *Builder) (sx, cx, sy, cy, v Node) {
		sx, cx = b.SinCos(b.Scale(2*math.Pi, b.Input("x")))
		sy, cy = b.SinCos(b.Scale(2*math.Pi, b.Input("y")))
		return sx, cx, sy, cy, b.Add(b.Const(1), b.Scale(0.5, b.Mul(sx, cy)))
	}
	return map[string]func(b *Builder) []Node{
		"M1": func(b *Builder) []Node {
			x, y, t, z := b.Input("x"), b.Input("y"), b.Input("theta"), b.Input("z")
			_, _, _, _, v := speed(b)
			s, c := b.SinCos(t)
			return []Node{b.Add(x, b.Scale(h/eps, b.Mul(v, c))), b.Add(y, b.Scale(h/eps, b.Mul(v, s))), b.Add(t, b.Scale(math.Sqrt(2*h)/eps, z))}
		},
		"M2": func(b *Builder) []Node {
			x, y, z, w := b.Input("x"), b.Input("y"), b.Input("z"), b.Input("w")
			sx, cx, sy, cy, v := speed(b)
			vx, vy := b.Scale(math.Pi, b.Mul(cx, cy)), b.Scale(-math.Pi, b.Mul(sx, sy))
			move := func(x, dv, z Node) Node {
				return b.Sum(x, b.Scale(h/2, b.Mul(v, dv)), b.Scale(math.Sqrt(h), b.Mul(v, z)))
			}
			return []Node{move(x, vx, z), move(y, vy, w)}
		},
	}
}

// BenchmarkStep measures steps of the two models, normal variates included.
func BenchmarkStep(b *testing.B) {
	for _, model := range []string{"M1", "M2"} {
		builder := NewBuilder()
		p, err := builder.Compile(steps()[model](builder)...)
		if err != nil {
			b.Fatal(err)
		}
		for _, im := range Implementations() {
			b.Run(model+"/"+im.Name(), func(b *testing.B) {
				s, r, stream := p.NewScratchFor(im), NewRandomFor(im), NewStream(1, 2)
				buf := AlignedRow(8 * rowStride)
				row := func(i int) []float64 { return buf[i*rowStride : i*rowStride+BlockSize] }
				in, out := [][]float64{}, [][]float64{}
				for i := range p.Inputs() {
					in = append(in, row(i))
				}
				for i := range p.Outputs() {
					out = append(out, row(len(in)+i))
				}
				k := p.Outputs()
				start := cpuNanoseconds(b)
				for b.Loop() {
					for _, z := range in[k:] {
						r.Normals(&stream, z)
					}
					if err := p.Eval(s, in, out, BlockSize); err != nil {
						b.Fatal(err)
					}
					for i := range out {
						in[i], out[i] = out[i], in[i]
					}
				}
				b.ReportMetric((cpuNanoseconds(b)-start)/float64(b.N)/BlockSize, "cpu-ns/path-step")
			})
		}
	}
}
