//go:build !race

#include "textflag.h"

// func fluxAVX2(y, x *float64, links *linkRow, count, n int)
// y[i] = sum over links of (out x - back xu) - (outd xd - backd x), for n a
// multiple of 8. A linkRow holds the six pointers out, back, xu, outd, backd, xd.
TEXT ·fluxAVX2(SB), NOSPLIT, $0-40
	MOVQ y+0(FP), DI
	MOVQ x+8(FP), SI
	MOVQ links+16(FP), R8
	MOVQ count+24(FP), R10
	MOVQ n+32(FP), R11
	XORQ AX, AX

loop:
	VXORPD  Y0, Y0, Y0
	VXORPD  Y1, Y1, Y1
	VMOVUPD (SI)(AX*8), Y14
	VMOVUPD 32(SI)(AX*8), Y15
	MOVQ    R8, BX
	MOVQ    R10, DX

link:
	MOVQ    (BX), R12
	VMULPD  (R12)(AX*8), Y14, Y2
	VMULPD  32(R12)(AX*8), Y15, Y3
	MOVQ    8(BX), R12
	MOVQ    16(BX), R13
	VMOVUPD (R12)(AX*8), Y4
	VMOVUPD 32(R12)(AX*8), Y5
	VMULPD  (R13)(AX*8), Y4, Y4
	VMULPD  32(R13)(AX*8), Y5, Y5
	VSUBPD  Y4, Y2, Y2
	VSUBPD  Y5, Y3, Y3
	MOVQ    24(BX), R12
	MOVQ    40(BX), R13
	VMOVUPD (R12)(AX*8), Y4
	VMOVUPD 32(R12)(AX*8), Y5
	VMULPD  (R13)(AX*8), Y4, Y4
	VMULPD  32(R13)(AX*8), Y5, Y5
	MOVQ    32(BX), R12
	VMULPD  (R12)(AX*8), Y14, Y6
	VMULPD  32(R12)(AX*8), Y15, Y7
	VSUBPD  Y6, Y4, Y4
	VSUBPD  Y7, Y5, Y5
	VSUBPD  Y4, Y2, Y2
	VSUBPD  Y5, Y3, Y3
	VADDPD  Y2, Y0, Y0
	VADDPD  Y3, Y1, Y1
	ADDQ    $48, BX
	DECQ    DX
	JNZ     link
	VMOVUPD Y0, (DI)(AX*8)
	VMOVUPD Y1, 32(DI)(AX*8)
	ADDQ    $8, AX
	CMPQ    AX, R11
	JLT     loop
	VZEROUPPER
	RET
