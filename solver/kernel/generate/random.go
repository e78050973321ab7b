package main

import (
	"math"

	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

func bitsOf(x float64) uint64 { return math.Float64bits(x) }

func rotate(x V, n uint64) {
	if wide() {
		VPROLQ(Imm(n), x, x)
		return
	}
	t := vector()
	VPSLLQ(Imm(n), x, t)
	VPSRLQ(Imm(64-n), x, x)
	VPOR(t, x, x)
}

// next advances the xoshiro256++ state s and returns the output.
func next(s *[4]V) V {
	a, b, c, d := s[0], s[1], s[2], s[3]
	r, t := vector(), vector()
	VPADDQ(d, a, r)
	rotate(r, 23)
	VPADDQ(a, r, r)
	VPSLLQ(Imm(17), b, t)
	if wide() { // the same words with fewer dependent steps
		VPTERNLOGQ(Imm(0x96), c, a, t) // c ^ a ^ t
		xor(b, d, d)
		VPTERNLOGQ(Imm(0x96), a, c, b)
		xor(d, a, a)
		VMOVDQA64(t, c)
	} else {
		xor(a, c, c)
		xor(b, d, d)
		xor(c, b, b)
		xor(d, a, a)
		xor(t, c, c)
	}
	rotate(d, 45)
	return r
}

func random() {
	uniforms()
	boxer()
}

func uniforms() {
	function("uniforms", "func(state *[4][8]uint64, u, v []float64)")
	state := Load(Param("state"), GP64()).(reg.GPVirtual)
	u, v := base("u"), base("v")
	hold(number(1), number(2))
	halves := make([][4]V, 8/width)
	each := func(f func(x V, m Mem)) {
		for h := range halves {
			for w := range 4 {
				f(halves[h][w], Mem{Base: state, Disp: 64*w + 8*width*h})
			}
		}
	}
	for h := range halves {
		for w := range 4 {
			halves[h][w] = vector()
		}
	}
	each(func(x V, m Mem) { VMOVUPD(m, x) })
	loop("u", 8, func(i reg.GPVirtual) {
		for h := range halves {
			x := next(&halves[h])
			VPSRLQ(Imm(12), x, x)
			or(get(number(1)), x, x)
			VSUBPD(x, inRegister(number(2)), x)
			VMOVUPD(x, at(u, i, width*h))
			y := next(&halves[h])
			VPSRLQ(Imm(12), y, y)
			or(get(number(1)), y, y)
			VSUBPD(get(number(1)), y, y)
			VMOVUPD(y, at(v, i, width*h))
		}
	})
	each(func(x V, m Mem) { VMOVUPD(x, m) })
	done()
}

func boxer() {
	function("boxer", "func(u, v []float64)")
	u, v := base("u"), base("v")
	n := pick(1, 2)
	hold(append(numbers(magic, 1, 2, 0.5), word(1), word(sign), word(logBase), word(expBias))...)
	loop("u", n*width, func(i reg.GPVirtual) {
		r := logarithmOf(fetch(places(n, u, i)))
		each(VMULPD, number(-2), r, r)
		each(VSQRTPD, r, r)
		y := fetch(places(n, v, i))
		t, kf := copies(n, y), vectors(n)
		each(VFMADD213PD, get(number(magic)), inRegister(number(4)), t)
		each(VSUBPD, get(number(magic)), t, kf)
		each(VFMADD213PD, y, inRegister(number(-0.25)), kf)
		each(VMULPD, number(tau), kf, kf)
		s, c := quadrant(kf, t)
		each(VMULPD, r, c, c)
		each(VMULPD, r, s, s)
		store(c, places(n, u, i))
		store(s, places(n, v, i))
	})
	done()
}
