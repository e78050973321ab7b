package kernel

import (
	"encoding/binary"
	"hash/fnv"
	"math"
	"math/rand/v2"
	"testing"
)

// randomNodes grows a graph of n operations on three inputs that stays within
// moderate values, and returns some of its nodes as outputs.
func randomNodes(r *rand.Rand, b *Builder, n int) []Node {
	pool := []Node{b.Input("x"), b.Input("y"), b.Input("t"), b.Const(0.75), b.Const(-1.5)}
	pick := func() Node { return pool[r.IntN(len(pool))] }
	tame := func(x Node) Node { return b.Sin(x) } // keeps values in [-1, 1]
	for range n {
		var x Node
		switch r.IntN(14) {
		case 0:
			x = b.Add(pick(), pick())
		case 1:
			x = b.Sub(pick(), b.Scale(float64(r.IntN(7)-3)/2, pick()))
		case 2:
			x = b.Mul(tame(pick()), pick())
		case 3:
			x = b.FMA(tame(pick()), tame(pick()), b.Const(float64(r.IntN(5)-2)))
		case 4:
			x = b.Div(tame(pick()), b.Add(b.Const(2), b.Cos(pick())))
		case 5:
			x = b.Sin(b.Scale(r.Float64()*4-2, pick()))
		case 6:
			x = b.Cos(pick())
		case 7:
			x = b.Exp(tame(pick()))
		case 8:
			x = b.Log(b.Add(b.Const(1.5), tame(pick())))
		case 9:
			x = b.Sqrt(b.Add(b.Const(1), tame(pick())))
		case 10:
			x = b.PowInt(tame(pick()), r.IntN(6))
		case 11:
			x = b.Min(pick(), b.Abs(pick()))
		case 12:
			x = b.Max(pick(), pick())
		default:
			x = b.Neg(b.Mul(tame(pick()), b.Neg(tame(pick()))))
		}
		pool = append(pool, x)
	}
	outs := []Node{pool[len(pool)-1]}
	for range 4 {
		outs = append(outs, pick())
	}
	return outs
}

// Random graphs agree with a literal evaluation, up to the amplification of
// rounding, which a perturbation of the inputs measures; and with every
// implementation bit by bit.
func TestRandomPrograms(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 9))
	const n = 96
	for trial := range 150 {
		b := NewBuilder("x", "y", "t")
		outs := randomNodes(r, b, 3+r.IntN(50))
		p, err := b.Compile(outs...)
		if err != nil {
			t.Fatal(err)
		}
		in := [][]float64{make([]float64, n), make([]float64, n), make([]float64, n)}
		for _, row := range in {
			for i := range row {
				row[i] = r.NormFloat64()
			}
		}
		var first [][]float64
		for _, im := range Implementations() {
			out := make([][]float64, len(outs))
			for k := range out {
				out[k] = make([]float64, n)
			}
			if err := p.Eval(p.NewScratchFor(im), in, out, n); err != nil {
				t.Fatal(err)
			}
			if first == nil {
				first = out
			}
			for k := range out {
				sameBits(t, im.Name(), out[k], first[k])
			}
		}
		for i := range n {
			x := []float64{in[0][i], in[1][i], in[2][i]}
			near := []float64{x[0] * (1 + 1e-13), x[1] * (1 + 1e-13), x[2] * (1 - 1e-13)}
			for k, y := range outs {
				want := scalar(b, y, x)
				slack := 1e-12*(1+math.Abs(want)) + 10*math.Abs(scalar(b, y, near)-want)
				if math.Abs(first[k][i]-want) > slack {
					t.Fatalf("trial %d output %d: %v, want %v\n%s", trial, k, first[k][i], want, p)
				}
			}
		}
	}
}

func TestEvalDoesNotAllocate(t *testing.T) {
	b := NewBuilder("x", "y", "t")
	p, err := b.Compile(gallery(b)...)
	if err != nil {
		t.Fatal(err)
	}
	s := p.NewScratch()
	in := [][]float64{make([]float64, 700), make([]float64, 700), {1}}
	out := make([][]float64, p.Outputs())
	for i := range out {
		out[i] = make([]float64, 700)
	}
	if n := testing.AllocsPerRun(5, func() {
		if err := p.Eval(s, in, out, 700); err != nil {
			t.Fatal(err)
		}
	}); n != 0 {
		t.Errorf("%v allocations an evaluation", n)
	}
}

// The bits are a promise across processors and compilers: this hash was computed
// on amd64 with every implementation and on arm64.
func TestGoldenBits(t *testing.T) {
	const want = 0xa66d8658d24154f6
	h := fnv.New64a()
	write := func(row []float64) {
		for _, x := range row {
			u := math.Float64bits(x)
			if math.IsNaN(x) {
				u = math.Float64bits(math.NaN()) // signs and payloads of NaN differ
			}
			_ = binary.Write(h, binary.LittleEndian, u)
		}
	}
	r := rand.New(rand.NewPCG(1, 2))
	for range 20 {
		b := NewBuilder("x", "y", "t")
		outs := randomNodes(r, b, 40)
		p, err := b.Compile(outs...)
		if err != nil {
			t.Fatal(err)
		}
		a := arguments(3000)
		out := make([][]float64, len(outs))
		for k := range out {
			out[k] = make([]float64, 1000)
		}
		if err := p.Eval(p.NewScratch(), [][]float64{a[:1000], a[1000:2000], a[2000:]}, out, 1000); err != nil {
			t.Fatal(err)
		}
		for _, row := range out {
			write(row)
		}
	}
	s, z := NewStream(3, 1), AlignedRow(512)
	NewRandom().Normals(&s, z)
	write(z)
	if got := h.Sum64(); got != want {
		t.Errorf("hash %#x, want %#x", got, uint64(want))
	}
}
