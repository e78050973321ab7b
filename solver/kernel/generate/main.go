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
	if v, ok := m.(V); ok {
		VMOVAPD(v, r)
	} else {
		VMOVUPD(m, r)
	}
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

func and(a, b Op, d V) {
	if wide() {
		VPANDQ(a, b, d)
	} else {
		VPAND(a, b, d)
	}
}

func or(a, b Op, d V) {
	if wide() {
		VPORQ(a, b, d)
	} else {
		VPOR(a, b, d)
	}
}

func xor(a, b Op, d V) {
	if wide() {
		VPXORQ(a, b, d)
	} else {
		VPXOR(a, b, d)
	}
}

// horner evaluates the polynomial with coefficients c[0], c[1], ... at z.
func horner(z V, c []Mem) V {
	p := constant(c[len(c)-1])
	for i := len(c) - 2; i >= 0; i-- {
		VFMADD213PD(get(c[i]), z, p)
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
