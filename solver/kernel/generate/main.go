// Command generate writes the AVX2 and AVX-512 kernels of package kernel:
//
//	go run . -out ../vector_amd64.s -stubs ../vector_amd64.go -pkg kernel
//
// It is a module of its own, so that building epslim needs neither it nor the
// assembler library it uses. Each kernel is written once, with the vector width
// as a parameter, and performs the operations of the reference functions in
// elementary.go and portable.go in the same order.
package main

import (
	"math"

	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// V is a vector register.
type V = reg.VecVirtual

// width is the number of doubles in a vector: 4 for AVX2, 8 for AVX-512.
var width int

func wide() bool { return width == 8 }

func suffix() string {
	if wide() {
		return "AVX512"
	}
	return "AVX2"
}

func vector() V {
	if wide() {
		return ZMM()
	}
	return YMM()
}

// table remembers the constants already emitted, each filling a wide vector.
var table = map[uint64]Mem{}

func word(bits uint64) Mem {
	if m, ok := table[bits]; ok {
		return m
	}
	m := GLOBL("constant"+hex(bits), 8|16) // read-only, no pointers
	for i := range 8 {
		DATA(8*i, U64(bits))
	}
	table[bits] = m
	return m
}

func hex(x uint64) string {
	const digits = "0123456789abcdef"
	s := make([]byte, 16)
	for i := range s {
		s[i] = digits[x>>(60-4*i)&15]
	}
	return string(s)
}

func number(x float64) Mem { return word(math.Float64bits(x)) }

// held are the constants kept in registers during a loop; with 32 registers the
// wide kernels hold them all.
var held map[string]V

func hold(constants ...Mem) {
	held = map[string]V{}
	if !wide() {
		return
	}
	for _, m := range constants {
		if _, ok := held[m.Symbol.Name]; ok {
			continue
		}
		r := vector()
		VMOVUPD(m, r)
		held[m.Symbol.Name] = r
	}
}

// get returns the constant as an operand.
func get(m Mem) Op {
	if r, ok := held[m.Symbol.Name]; ok {
		return r
	}
	return m
}

func load(m Op) V {
	r := vector()
	move(m, r)
	return r
}

// constant returns a fresh register with the constant, free to be overwritten.
func constant(m Mem) V { return load(get(m)) }

// inRegister returns the constant in a register that must not be overwritten.
func inRegister(m Mem) V {
	if r, ok := held[m.Symbol.Name]; ok {
		return r
	}
	return load(m)
}

func and(o ...Op) {
	if wide() {
		VPANDQ(o...)
	} else {
		VPAND(o[0], o[1], o[2])
	}
}

func or(o ...Op) {
	if wide() {
		VPORQ(o...)
	} else {
		VPOR(o[0], o[1], o[2])
	}
}

func xor(o ...Op) {
	if wide() {
		VPXORQ(o...)
	} else {
		VPXOR(o[0], o[1], o[2])
	}
}

// group is several vectors that go through a computation side by side, so that
// the processor always finds independent operations close together.
type group []V

// vectors returns a group of n fresh registers.
func vectors(n int) group {
	g := make(group, n)
	for i := range g {
		g[i] = vector()
	}
	return g
}

// each emits the instruction for every member of the groups among the operands;
// other operands are the same for all members.
func each(instruction func(...Op), operands ...any) {
	n := 1
	for _, o := range operands {
		if g, ok := o.(group); ok {
			n = len(g)
		}
	}
	for i := range n {
		ops := make([]Op, len(operands))
		for j, o := range operands {
			if g, ok := o.(group); ok {
				ops[j] = g[i]
			} else {
				ops[j] = o.(Op)
			}
		}
		instruction(ops...)
	}
}

// copies returns n fresh registers with the value of x, a group or an operand.
func copies(n int, x any) group {
	g := vectors(n)
	each(func(o ...Op) { move(o[0], o[1].(V)) }, x, g)
	return g
}

func move(from Op, to V) {
	if v, ok := from.(V); ok {
		VMOVAPD(v, to)
	} else {
		VMOVUPD(from, to)
	}
}

// horner evaluates the polynomial with coefficients c[0], c[1], ... at z.
func horner(z group, c []Mem) group {
	p := copies(len(z), get(c[len(c)-1]))
	for i := len(c) - 2; i >= 0; i-- {
		each(VFMADD213PD, get(c[i]), z, p)
	}
	return p
}

func base(name string) reg.GPVirtual { return Load(Param(name).Base(), GP64()).(reg.GPVirtual) }

func broadcast(name string) V {
	r := vector()
	m, err := Param(name).Resolve()
	if err != nil {
		panic(err)
	}
	VBROADCASTSD(m.Addr, r)
	return r
}

// places returns the n successive vectors of a row from index i on.
func places(n int, p, i reg.GPVirtual) []Mem {
	m := make([]Mem, n)
	for k := range m {
		m[k] = at(p, i, k*width)
	}
	return m
}

// fetch loads the vectors at the places.
func fetch(m []Mem) group {
	g := vectors(len(m))
	for i := range m {
		VMOVUPD(m[i], g[i])
	}
	return g
}

func store(g group, m []Mem) {
	for i := range m {
		VMOVUPD(g[i], m[i])
	}
}

// scaled loads the vectors at the places multiplied by c.
func scaled(c V, m []Mem) group {
	g := vectors(len(m))
	for i := range m {
		VMULPD(m[i], c, g[i])
	}
	return g
}

func at(p, i reg.GPVirtual, offset int) Mem {
	return Mem{Base: p, Index: i, Scale: 8, Disp: offset * 8}
}

// loop runs body for i = 0, step, 2*step, ... below the length of the row.
func loop(row string, step int, body func(i reg.GPVirtual)) {
	n := Load(Param(row).Len(), GP64()).(reg.GPVirtual)
	i := GP64().(reg.GPVirtual)
	XORQ(i, i)
	Label("loop")
	body(i)
	ADDQ(Imm(uint64(step)), i)
	CMPQ(i, n)
	JL(LabelRef("loop"))
}

func function(name, signature string) {
	held = nil
	TEXT(name+suffix(), 4, signature) // NOSPLIT
	Pragma("noescape")
}

func done() {
	VZEROUPPER()
	RET()
}

func main() {
	ConstraintExpr("amd64")
	for _, w := range []int{4, 8} {
		width = w
		arithmetic()
		elementary()
		random()
	}
	Generate()
}
