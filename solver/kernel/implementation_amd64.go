package kernel

import "golang.org/x/sys/cpu"

// accelerated returns the assembly kernels this processor can run.
func accelerated() []*vectorOps {
	var list []*vectorOps
	x := cpu.X86
	if x.HasAVX512F && x.HasAVX512DQ && x.HasAVX512VL && x.HasPOPCNT {
		list = append(list, &vectorOps{
			name: "avx512",
			lin:  linAVX512, axpy: axpyAVX512, mul: mulAVX512, fma: fmaAVX512, fmak: fmakAVX512,
			div: divAVX512, rcp: rcpAVX512, sqrt: sqrtAVX512, abs: absAVX512, floor: floorAVX512,
			min: minAVX512, max: maxAVX512,
			sin: sinAVX512, cos: cosAVX512, sincos: sincosAVX512, exp: expAVX512, log: logAVX512,
			uniforms: uniformsAVX512, boxer: boxerAVX512, outside: outsideAVX512,
		})
	}
	if x.HasAVX2 && x.HasFMA && x.HasPOPCNT {
		list = append(list, &vectorOps{
			name: "avx2",
			lin:  linAVX2, axpy: axpyAVX2, mul: mulAVX2, fma: fmaAVX2, fmak: fmakAVX2,
			div: divAVX2, rcp: rcpAVX2, sqrt: sqrtAVX2, abs: absAVX2, floor: floorAVX2,
			min: minAVX2, max: maxAVX2,
			sin: sinAVX2, cos: cosAVX2, sincos: sincosAVX2, exp: expAVX2, log: logAVX2,
			uniforms: uniformsAVX2, boxer: boxerAVX2, outside: outsideAVX2,
		})
	}
	return list
}
