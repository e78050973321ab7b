//go:build !race

#include "textflag.h"

// func scaleDotsAVX2(y, inv, a, b *float64, n int, sums *[12]float64)
// y *= inv; lane sums of y*a, y*b, y*y for n a multiple of 4.
TEXT ·scaleDotsAVX2(SB), NOSPLIT, $0-48
	MOVQ   y+0(FP), DI
	MOVQ   inv+8(FP), SI
	MOVQ   a+16(FP), R8
	MOVQ   b+24(FP), R9
	MOVQ   n+32(FP), R11
	MOVQ   sums+40(FP), R12
	VXORPD Y0, Y0, Y0
	VXORPD Y1, Y1, Y1
	VXORPD Y2, Y2, Y2
	XORQ   AX, AX

scaleloop:
	VMOVUPD (DI)(AX*8), Y3
	VMULPD  (SI)(AX*8), Y3, Y3
	VMOVUPD Y3, (DI)(AX*8)
	VMULPD  (R8)(AX*8), Y3, Y4
	VMULPD  (R9)(AX*8), Y3, Y5
	VMULPD  Y3, Y3, Y6
	VADDPD  Y4, Y0, Y0
	VADDPD  Y5, Y1, Y1
	VADDPD  Y6, Y2, Y2
	ADDQ    $4, AX
	CMPQ    AX, R11
	JLT     scaleloop
	VMOVUPD Y0, (R12)
	VMOVUPD Y1, 32(R12)
	VMOVUPD Y2, 64(R12)
	VZEROUPPER
	RET

// func subtractAVX2(r, v, h *float64, alpha float64, n int, sums *[8]float64)
// r -= alpha*v; lane sums of r*r and r*h for n a multiple of 4.
TEXT ·subtractAVX2(SB), NOSPLIT, $0-48
	MOVQ         r+0(FP), DI
	MOVQ         v+8(FP), SI
	MOVQ         h+16(FP), R8
	VBROADCASTSD alpha+24(FP), Y15
	MOVQ         n+32(FP), R11
	MOVQ         sums+40(FP), R12
	VXORPD       Y0, Y0, Y0
	VXORPD       Y1, Y1, Y1
	XORQ         AX, AX

subloop:
	VMULPD  (SI)(AX*8), Y15, Y2
	VMOVUPD (DI)(AX*8), Y3
	VSUBPD  Y2, Y3, Y3
	VMOVUPD Y3, (DI)(AX*8)
	VMULPD  Y3, Y3, Y4
	VMULPD  (R8)(AX*8), Y3, Y5
	VADDPD  Y4, Y0, Y0
	VADDPD  Y5, Y1, Y1
	ADDQ    $4, AX
	CMPQ    AX, R11
	JLT     subloop
	VMOVUPD Y0, (R12)
	VMOVUPD Y1, 32(R12)
	VZEROUPPER
	RET

// func stepAVX2(ptr *[7]*float64, coef *[3]float64, n int, sums *[8]float64)
// ptr: x, a, c, r, t, p, v; coef: alpha, omega, beta.
// x += alpha*a + omega*c; r -= omega*t; p = r + beta*(p - omega*v); lane sums
// of r*r and p*p for n a multiple of 4.
TEXT ·stepAVX2(SB), NOSPLIT, $0-32
	MOVQ         ptr+0(FP), BX
	MOVQ         coef+8(FP), CX
	MOVQ         n+16(FP), R11
	MOVQ         (BX), DI
	MOVQ         8(BX), SI
	MOVQ         16(BX), R8
	MOVQ         24(BX), R9
	MOVQ         32(BX), R10
	MOVQ         40(BX), R12
	MOVQ         48(BX), R13
	VBROADCASTSD (CX), Y13
	VBROADCASTSD 8(CX), Y14
	VBROADCASTSD 16(CX), Y15
	VXORPD       Y0, Y0, Y0
	VXORPD       Y1, Y1, Y1
	XORQ         AX, AX

steploop:
	VMULPD  (SI)(AX*8), Y13, Y2
	VMULPD  (R8)(AX*8), Y14, Y3
	VADDPD  Y3, Y2, Y2
	VADDPD  (DI)(AX*8), Y2, Y2
	VMOVUPD Y2, (DI)(AX*8)
	VMULPD  (R10)(AX*8), Y14, Y4
	VMOVUPD (R9)(AX*8), Y5
	VSUBPD  Y4, Y5, Y5
	VMOVUPD Y5, (R9)(AX*8)
	VMULPD  (R13)(AX*8), Y14, Y6
	VMOVUPD (R12)(AX*8), Y7
	VSUBPD  Y6, Y7, Y7
	VMULPD  Y7, Y15, Y7
	VADDPD  Y7, Y5, Y7
	VMOVUPD Y7, (R12)(AX*8)
	VMULPD  Y5, Y5, Y5
	VADDPD  Y5, Y0, Y0
	VMULPD  Y7, Y7, Y7
	VADDPD  Y7, Y1, Y1
	ADDQ    $4, AX
	CMPQ    AX, R11
	JLT     steploop
	MOVQ    sums+24(FP), R12
	VMOVUPD Y0, (R12)
	VMOVUPD Y1, 32(R12)
	VZEROUPPER
	RET

// func narrowAVX2(dst *float32, src *float64, scale float64, n int)
// dst = float32(src*scale) for n a multiple of 8.
TEXT ·narrowAVX2(SB), NOSPLIT, $0-32
	MOVQ         dst+0(FP), DI
	MOVQ         src+8(FP), SI
	VBROADCASTSD scale+16(FP), Y15
	MOVQ         n+24(FP), R11
	XORQ         AX, AX

narrowloop:
	VMULPD      (SI)(AX*8), Y15, Y0
	VMULPD      32(SI)(AX*8), Y15, Y1
	VCVTPD2PSY  Y0, X0
	VCVTPD2PSY  Y1, X1
	VMOVUPS     X0, (DI)(AX*4)
	VMOVUPS     X1, 16(DI)(AX*4)
	ADDQ        $8, AX
	CMPQ        AX, R11
	JLT         narrowloop
	VZEROUPPER
	RET

// func widenAVX2(dst *float64, src *float32, scale float64, n int)
// dst = float64(src)*scale for n a multiple of 8.
TEXT ·widenAVX2(SB), NOSPLIT, $0-32
	MOVQ         dst+0(FP), DI
	MOVQ         src+8(FP), SI
	VBROADCASTSD scale+16(FP), Y15
	MOVQ         n+24(FP), R11
	XORQ         AX, AX

widenloop:
	VCVTPS2PD (SI)(AX*4), Y0
	VCVTPS2PD 16(SI)(AX*4), Y1
	VMULPD    Y15, Y0, Y0
	VMULPD    Y15, Y1, Y1
	VMOVUPD   Y0, (DI)(AX*8)
	VMOVUPD   Y1, 32(DI)(AX*8)
	ADDQ      $8, AX
	CMPQ      AX, R11
	JLT       widenloop
	VZEROUPPER
	RET
