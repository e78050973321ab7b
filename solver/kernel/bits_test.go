package kernel

import (
	"math"
	"testing"
)

// specials are arguments at the edges of the fast ranges and of the format.
func specials() []float64 {
	base := []float64{0, 1, 0.5, math.Pi, math.Pi / 2, math.Pi / 4, math.E, trigMax, math.Nextafter(trigMax, math.Inf(1)), 0x1p31, 0x1p52, 0x1p53, 1e22, 1e300,
		math.MaxFloat64, minNorm, math.Nextafter(minNorm, 0), math.SmallestNonzeroFloat64, 0x1p-1060, 1e-300, 1e-20, expMax, math.Nextafter(expMax, 800), 709.78, 709.79, 720,
		744, 745.2, 746, 1e4, math.Inf(1), math.NaN(), math.Sqrt2, math.Sqrt2 / 2, 0.70710678118654735, 6381956970095103 * 0x1p797}
	var all []float64
	for _, x := range base {
		all = append(all, x, -x)
	}
	return all
}

// arguments returns n numbers of all magnitudes, the specials first.
func arguments(n int) []float64 {
	s := uint64(7)
	a := specials()
	for len(a) < n {
		switch u := splitMix(&s); len(a) % 4 {
		case 0:
			a = append(a, math.Float64frombits(u)) // any bit pattern
		case 1:
			a = append(a, (float64(u>>11)*0x1p-53-0.5)*20)
		case 2:
			a = append(a, (float64(u>>11)*0x1p-53-0.5)*2e6)
		default:
			a = append(a, Exp((float64(u>>11)*0x1p-53-0.5)*1500)) // math.Exp differs between processors
		}
	}
	return a[:n]
}

// sameBits compares rows; all NaN are equal.
func sameBits(t *testing.T, what string, got, want []float64) {
	t.Helper()
	for i := range want {
		if math.Float64bits(got[i]) != math.Float64bits(want[i]) && !(math.IsNaN(got[i]) && math.IsNaN(want[i])) {
			t.Errorf("%s: point %d: %v (%x), want %v (%x)", what, i, got[i], math.Float64bits(got[i]), want[i], math.Float64bits(want[i]))
			return
		}
	}
}

func TestProgramsGiveTheSameBitsOnEveryPath(t *testing.T) {
	b := NewBuilder("x", "y", "t")
	outs := gallery(b)
	p, err := b.Compile(outs...)
	if err != nil {
		t.Fatal(err)
	}
	const n = 5000
	a := arguments(3 * n)
	in := [][]float64{a[:n], a[n : 2*n], a[2*n:]}
	eval := func(i Implementation) [][]float64 {
		out := make([][]float64, len(outs))
		for k := range out {
			out[k] = make([]float64, n)
		}
		if err := p.Eval(p.NewScratchFor(i), in, out, n); err != nil {
			t.Fatal(err)
		}
		return out
	}
	list := Implementations()
	want := eval(list[len(list)-1])
	for _, i := range list[:len(list)-1] {
		for k, row := range eval(i) {
			sameBits(t, i.Name()+" output "+string(rune('0'+k/10))+string(rune('0'+k%10)), row, want[k])
		}
	}
}

func TestKernelsGiveTheSameBitsOnEveryPath(t *testing.T) {
	const n = 1 << 14
	a := arguments(n)
	c := append(arguments(n)[n/2:], a[:n/2]...)
	type call struct {
		name string
		run  func(v *vectorOps, d, e []float64)
	}
	trig := func(bad uint64, d []float64, f func(float64) float64) {
		if bad != 0 {
			redo(d, a, 1.25, f)
		}
	}
	calls := []call{
		{"lin", func(v *vectorOps, d, e []float64) { v.lin(d, a, 3, -0.7) }},
		{"axpy", func(v *vectorOps, d, e []float64) { v.axpy(d, a, c, -1.1) }},
		{"mul", func(v *vectorOps, d, e []float64) { v.mul(d, a, c, 0.3) }},
		{"fma", func(v *vectorOps, d, e []float64) { v.fma(d, a, c, a, 0.3) }},
		{"fmak", func(v *vectorOps, d, e []float64) { v.fmak(d, a, c, 0.3, 2) }},
		{"div", func(v *vectorOps, d, e []float64) { v.div(d, a, c, 0.3) }},
		{"rcp", func(v *vectorOps, d, e []float64) { v.rcp(d, a, 0.3) }},
		{"sqrt", func(v *vectorOps, d, e []float64) { v.sqrt(d, a) }},
		{"abs", func(v *vectorOps, d, e []float64) { v.abs(d, a) }},
		{"floor", func(v *vectorOps, d, e []float64) { v.floor(d, a) }},
		{"min", func(v *vectorOps, d, e []float64) { v.min(d, a, c) }},
		{"max", func(v *vectorOps, d, e []float64) { v.max(d, a, c) }},
		{"sin", func(v *vectorOps, d, e []float64) { trig(v.sin(d, a, 1.25), d, Sin) }},
		{"cos", func(v *vectorOps, d, e []float64) { trig(v.cos(d, a, 1.25), d, Cos) }},
		{"exp", func(v *vectorOps, d, e []float64) { trig(v.exp(d, a, 1.25), d, Exp) }},
		{"log", func(v *vectorOps, d, e []float64) {
			if v.log(d, a) != 0 {
				redo(d, a, 1, Log)
			}
		}},
		{"sincos", func(v *vectorOps, d, e []float64) {
			if v.sincos(d, e, a, 1.25) != 0 {
				portableSinCos(d, e, a, 1.25)
			}
		}},
		{"normals", func(v *vectorOps, d, e []float64) {
			s := NewStream(3, 4)
			Random{v}.Normals(&s, d)
			Random{v}.Uniforms(&s, e)
		}},
		{"outside", func(v *vectorOps, d, e []float64) { d[0] = float64(v.outside(a, -1, 2)) }},
	}
	for _, k := range calls {
		want, want2 := make([]float64, n), make([]float64, n)
		k.run(portable(), want, want2)
		for _, v := range accelerated() {
			got, got2 := make([]float64, n), make([]float64, n)
			k.run(v, got, got2)
			sameBits(t, v.name+" "+k.name, got, want)
			sameBits(t, v.name+" "+k.name+" (second row)", got2, want2)
		}
	}
}

// The fast range must be noticed to end exactly where the reference leaves it.
func TestGuardsNoticeEveryArgumentOutsideTheFastRange(t *testing.T) {
	for _, v := range accelerated() {
		for _, x := range specials() {
			row := make([]float64, 32)
			for i := range row {
				row[i] = 1
			}
			row[13] = x
			d, e := make([]float64, 32), make([]float64, 32)
			for _, c := range []struct {
				name string
				got  uint64
				out  bool
			}{
				{"sin", v.sin(d, row, 1), !(math.Abs(x) <= trigMax)},
				{"cos", v.cos(d, row, 1), !(math.Abs(x) <= trigMax)},
				{"sincos", v.sincos(d, e, row, 1), !(math.Abs(x) <= trigMax)},
				{"exp", v.exp(d, row, 1), !(math.Abs(x) <= expMax)},
				{"log", v.log(d, row), !(x >= minNorm && x <= math.MaxFloat64)},
			} {
				if (c.got != 0) != c.out {
					t.Errorf("%s %s(%v): guard %d, outside %v", v.name, c.name, x, c.got, c.out)
				}
			}
		}
	}
}
