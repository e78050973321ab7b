//go:build !race

#include "textflag.h"

DATA lanes<>+0(SB)/8, $0x00000000ffffffff
DATA lanes<>+8(SB)/8, $0x00000000ffffffff
DATA lanes<>+16(SB)/8, $0x00000000ffffffff
DATA lanes<>+24(SB)/8, $0x00000000ffffffff
DATA lanes<>+32(SB)/8, $0x00000000ffffffff
GLOBL lanes<>(SB), RODATA|NOPTR, $40

// SUM16 leaves b + sum of coef*nb for 16 cells in Y0, Y1.
// DI x, SI b, R8 coef headers, R9 nb headers, R10 pairs, AX index.
#define SUM16(label) \
	VMOVUPS (SI)(AX*4), Y0    \
	VMOVUPS 32(SI)(AX*4), Y1  \
	MOVQ    R8, BX            \
	MOVQ    R9, CX            \
	MOVQ    R10, DX           \
label:                        \
	MOVQ    (BX), R13         \
	MOVQ    (CX), R12         \
	VMOVUPS (R13)(AX*4), Y2   \
	VMOVUPS 32(R13)(AX*4), Y3 \
	VMULPS  (R12)(AX*4), Y2, Y2   \
	VMULPS  32(R12)(AX*4), Y3, Y3 \
	MOVQ    24(BX), R13       \
	MOVQ    24(CX), R12       \
	VMOVUPS (R13)(AX*4), Y4   \
	VMOVUPS 32(R13)(AX*4), Y5 \
	VMULPS  (R12)(AX*4), Y4, Y4   \
	VMULPS  32(R12)(AX*4), Y5, Y5 \
	VADDPS  Y4, Y2, Y2        \
	VADDPS  Y5, Y3, Y3        \
	VADDPS  Y2, Y0, Y0        \
	VADDPS  Y3, Y1, Y1        \
	ADDQ    $48, BX           \
	ADDQ    $48, CX           \
	DECQ    DX                \
	JNZ     label

// func relaxAVX2(x, b *float32, coef, nb *[]float32, pairs, n, first int)
TEXT ·relaxAVX2(SB), NOSPLIT, $0-56
	MOVQ    x+0(FP), DI
	MOVQ    b+8(FP), SI
	MOVQ    coef+16(FP), R8
	MOVQ    nb+24(FP), R9
	MOVQ    pairs+32(FP), R10
	MOVQ    n+40(FP), R11
	MOVQ    first+48(FP), R12
	LEAQ    lanes<>(SB), BX
	SHLQ    $2, R12
	VMOVUPS (BX)(R12*1), Y15
	XORQ    AX, AX

relaxloop:
	SUM16(relaxpair)
	VMOVUPS   (DI)(AX*4), Y2
	VMOVUPS   32(DI)(AX*4), Y3
	VBLENDVPS Y15, Y0, Y2, Y0
	VBLENDVPS Y15, Y1, Y3, Y1
	VMOVUPS   Y0, (DI)(AX*4)
	VMOVUPS   Y1, 32(DI)(AX*4)
	ADDQ      $16, AX
	CMPQ      AX, R11
	JLT       relaxloop
	VZEROUPPER
	RET

// func relaxZeroAVX2(x, b *float32, n, first int)
// x = b in every second cell, 0 in the others, for n a multiple of 8.
TEXT ·relaxZeroAVX2(SB), NOSPLIT, $0-32
	MOVQ    x+0(FP), DI
	MOVQ    b+8(FP), SI
	MOVQ    n+16(FP), R11
	MOVQ    first+24(FP), R12
	LEAQ    lanes<>(SB), BX
	SHLQ    $2, R12
	VMOVUPS (BX)(R12*1), Y15
	XORQ    AX, AX

zeroloop:
	VANDPS  (SI)(AX*4), Y15, Y0
	VMOVUPS Y0, (DI)(AX*4)
	ADDQ    $8, AX
	CMPQ    AX, R11
	JLT     zeroloop
	VZEROUPPER
	RET

// func normaliseAVX2(dst *float32, v, w *float64, n int)
// dst = float32(v*w) for n a multiple of 8.
TEXT ·normaliseAVX2(SB), NOSPLIT, $0-32
	MOVQ dst+0(FP), DI
	MOVQ v+8(FP), SI
	MOVQ w+16(FP), BX
	MOVQ n+24(FP), R11
	XORQ AX, AX

normloop:
	VMOVUPD    (SI)(AX*8), Y0
	VMOVUPD    32(SI)(AX*8), Y1
	VMULPD     (BX)(AX*8), Y0, Y0
	VMULPD     32(BX)(AX*8), Y1, Y1
	VCVTPD2PSY Y0, X0
	VCVTPD2PSY Y1, X1
	VMOVUPS    X0, (DI)(AX*4)
	VMOVUPS    X1, 16(DI)(AX*4)
	ADDQ       $8, AX
	CMPQ       AX, R11
	JLT        normloop
	VZEROUPPER
	RET

// func residualAVX2(r, x, b, w *float32, coef, nb *[]float32, pairs, n int)
TEXT ·residualAVX2(SB), NOSPLIT, $0-64
	MOVQ x+8(FP), DI
	MOVQ b+16(FP), SI
	MOVQ coef+32(FP), R8
	MOVQ nb+40(FP), R9
	MOVQ pairs+48(FP), R10
	MOVQ n+56(FP), R11
	XORQ AX, AX

residualloop:
	SUM16(residualpair)
	MOVQ    w+24(FP), R12
	MOVQ    r+0(FP), R13
	VSUBPS  (DI)(AX*4), Y0, Y0
	VSUBPS  32(DI)(AX*4), Y1, Y1
	VMULPS  (R12)(AX*4), Y0, Y0
	VMULPS  32(R12)(AX*4), Y1, Y1
	VMOVUPS Y0, (R13)(AX*4)
	VMOVUPS Y1, 32(R13)(AX*4)
	ADDQ    $16, AX
	CMPQ    AX, R11
	JLT     residualloop
	VZEROUPPER
	RET

// func pairSumAVX2(dst, a, b *float32, n int)
// dst[i] = (a[2i]+b[2i]) + (a[2i+1]+b[2i+1]) for n a multiple of 8.
TEXT ·pairSumAVX2(SB), NOSPLIT, $0-32
	MOVQ dst+0(FP), DI
	MOVQ a+8(FP), SI
	MOVQ b+16(FP), BX
	MOVQ n+24(FP), R11
	XORQ AX, AX

pairloop:
	VMOVUPS (SI)(AX*8), Y0
	VMOVUPS 32(SI)(AX*8), Y1
	VADDPS  (BX)(AX*8), Y0, Y0
	VADDPS  32(BX)(AX*8), Y1, Y1
	VHADDPS Y1, Y0, Y2
	VPERMPD $0xd8, Y2, Y2
	VMOVUPS Y2, (DI)(AX*4)
	ADDQ    $8, AX
	CMPQ    AX, R11
	JLT     pairloop
	VZEROUPPER
	RET

// func spreadAVX2(f, t *float32, n int, quarter, threeQuarters float32)
// f[2i] += 0.75 t[i] + 0.25 t[i-1], f[2i+1] += 0.75 t[i] + 0.25 t[i+1]
// for n a multiple of 8.
TEXT ·spreadAVX2(SB), NOSPLIT, $0-32
	MOVQ         f+0(FP), DI
	MOVQ         t+8(FP), SI
	MOVQ         n+16(FP), R11
	VBROADCASTSS quarter+24(FP), Y14
	VBROADCASTSS threeQuarters+28(FP), Y15
	XORQ         AX, AX

spreadloop:
	VMULPS     (SI)(AX*4), Y15, Y0
	VMULPS     -4(SI)(AX*4), Y14, Y1
	VMULPS     4(SI)(AX*4), Y14, Y2
	VADDPS     Y1, Y0, Y1
	VADDPS     Y2, Y0, Y2
	VUNPCKLPS  Y2, Y1, Y3
	VUNPCKHPS  Y2, Y1, Y4
	VPERM2F128 $0x20, Y4, Y3, Y5
	VPERM2F128 $0x31, Y4, Y3, Y6
	VADDPS     (DI)(AX*8), Y5, Y5
	VADDPS     32(DI)(AX*8), Y6, Y6
	VMOVUPS    Y5, (DI)(AX*8)
	VMOVUPS    Y6, 32(DI)(AX*8)
	ADDQ       $8, AX
	CMPQ       AX, R11
	JLT        spreadloop
	VZEROUPPER
	RET

// func blendAVX2(t, a, b *float32, n int, u, w float32)
// t = u*a + w*b for n a multiple of 8.
TEXT ·blendAVX2(SB), NOSPLIT, $0-40
	MOVQ         t+0(FP), DI
	MOVQ         a+8(FP), SI
	MOVQ         b+16(FP), BX
	MOVQ         n+24(FP), R11
	VBROADCASTSS u+32(FP), Y14
	VBROADCASTSS w+36(FP), Y15
	XORQ         AX, AX

blendloop:
	VMULPS  (SI)(AX*4), Y14, Y0
	VMULPS  (BX)(AX*4), Y15, Y1
	VADDPS  Y1, Y0, Y0
	VMOVUPS Y0, (DI)(AX*4)
	ADDQ    $8, AX
	CMPQ    AX, R11
	JLT     blendloop
	VZEROUPPER
	RET
