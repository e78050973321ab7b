package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// unrolled runs body on several vectors a turn, 16 doubles together.
func unrolled(body func(i reg.GPVirtual, offset int)) {
	loop("d", 16, func(i reg.GPVirtual) {
		for offset := 0; offset < 16; offset += width {
			body(i, offset)
		}
	})
	done()
}

func arithmetic() {
	linear()
	products()
	quotients()
	simple()
	outside()
}

func linear() {
	function("lin", "func(d, a []float64, c, k float64)")
	d, a, c, k := base("d"), base("a"), broadcast("c"), broadcast("k")
	unrolled(func(i reg.GPVirtual, o int) {
		x := load(at(a, i, o))
		VFMADD213PD(k, c, x)
		VMOVUPD(x, at(d, i, o))
	})

	function("axpy", "func(d, a, b []float64, c float64)")
	d, a, c = base("d"), base("a"), broadcast("c")
	b := base("b")
	unrolled(func(i reg.GPVirtual, o int) {
		x := load(at(a, i, o))
		VFMADD213PD(at(b, i, o), c, x)
		VMOVUPD(x, at(d, i, o))
	})
}

func products() {
	function("mul", "func(d, a, b []float64, c float64)")
	d, a, b, c := base("d"), base("a"), base("b"), broadcast("c")
	unrolled(func(i reg.GPVirtual, o int) {
		x := vector()
		VMULPD(at(a, i, o), c, x)
		VMULPD(at(b, i, o), x, x)
		VMOVUPD(x, at(d, i, o))
	})

	function("fma", "func(d, a, b, e []float64, c float64)")
	d, a, b, c = base("d"), base("a"), base("b"), broadcast("c")
	e := base("e")
	unrolled(func(i reg.GPVirtual, o int) {
		x := vector()
		VMULPD(at(a, i, o), c, x)
		y := load(at(b, i, o))
		VFMADD213PD(at(e, i, o), y, x)
		VMOVUPD(x, at(d, i, o))
	})

	function("fmak", "func(d, a, b []float64, c, k float64)")
	d, a, b, c = base("d"), base("a"), base("b"), broadcast("c")
	k := broadcast("k")
	unrolled(func(i reg.GPVirtual, o int) {
		x := vector()
		VMULPD(at(a, i, o), c, x)
		y := load(at(b, i, o))
		VFMADD213PD(k, y, x)
		VMOVUPD(x, at(d, i, o))
	})
}

func quotients() {
	function("div", "func(d, a, b []float64, c float64)")
	d, a, b, c := base("d"), base("a"), base("b"), broadcast("c")
	unrolled(func(i reg.GPVirtual, o int) {
		x := vector()
		VMULPD(at(a, i, o), c, x)
		VDIVPD(at(b, i, o), x, x)
		VMOVUPD(x, at(d, i, o))
	})

	function("rcp", "func(d, a []float64, c float64)")
	d, a, c = base("d"), base("a"), broadcast("c")
	unrolled(func(i reg.GPVirtual, o int) {
		x := vector()
		VDIVPD(at(a, i, o), c, x)
		VMOVUPD(x, at(d, i, o))
	})
}

func simple() {
	unary := func(name string, apply func(a Op, x V)) {
		function(name, "func(d, a []float64)")
		d, a := base("d"), base("a")
		hold(word(1<<63 - 1))
		unrolled(func(i reg.GPVirtual, o int) {
			x := vector()
			apply(at(a, i, o), x)
			VMOVUPD(x, at(d, i, o))
		})
	}
	unary("sqrt", func(a Op, x V) { VSQRTPD(a, x) })
	unary("floor", func(a Op, x V) {
		if wide() {
			VRNDSCALEPD(Imm(9), a, x)
		} else {
			VROUNDPD(Imm(9), a, x)
		}
	})
	unary("abs", func(a Op, x V) { and(a, inRegister(word(1<<63-1)), x) })

	binary := func(name string, apply func(b Op, a, x V)) {
		function(name, "func(d, a, b []float64)")
		d, a, b := base("d"), base("a"), base("b")
		unrolled(func(i reg.GPVirtual, o int) {
			x := load(at(a, i, o))
			apply(at(b, i, o), x, x)
			VMOVUPD(x, at(d, i, o))
		})
	}
	binary("min", func(b Op, a, x V) { VMINPD(b, a, x) })
	binary("max", func(b Op, a, x V) { VMAXPD(b, a, x) })
}

// Comparisons that are true where the operands are unordered.
const (
	notGreaterEqual = 0x19
	notLessEqual    = 0x16
)

func outside() {
	function("outside", "func(a []float64, lo, hi float64) int")
	a, lo, hi := base("a"), broadcast("lo"), broadcast("hi")
	total := GP64()
	XORQ(total, total)
	loop("a", width, func(i reg.GPVirtual) {
		x := load(at(a, i, 0))
		bits := GP64()
		if wide() {
			low, high := K(), K()
			VCMPPD(Imm(notGreaterEqual), lo, x, low)
			VCMPPD(Imm(notLessEqual), hi, x, high)
			KORB(low, high, high)
			KMOVB(high, bits.As32())
		} else {
			low, high := vector(), vector()
			VCMPPD(Imm(notGreaterEqual), lo, x, low)
			VCMPPD(Imm(notLessEqual), hi, x, high)
			VORPD(low, high, high)
			VMOVMSKPD(high, bits.As32())
		}
		POPCNTQ(bits, bits)
		ADDQ(bits, total)
	})
	Store(total, ReturnIndex(0))
	done()
}
