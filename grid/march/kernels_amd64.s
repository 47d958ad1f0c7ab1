#include "textflag.h"

// The vector forms of kernels.go: products and sums apart, in the order of the
// plain kernels, so that the bits agree. n counts numbers and is a multiple of
// eight; CX counts what is left to do, R10 the bytes done.

// func accumulateAVX512(u, w *float64, c float64, n int)
TEXT ·accumulateAVX512(SB), NOSPLIT, $0-32
	MOVQ u+0(FP), DI
	MOVQ w+8(FP), SI
	VBROADCASTSD c+16(FP), Z0
	MOVQ n+24(FP), CX
	SHRQ $3, CX
	JEQ  accumulate512done

accumulate512:
	VMULPD  (SI), Z0, Z1
	VADDPD  (DI), Z1, Z2
	VMOVUPD Z1, (SI)
	VMOVUPD Z2, (DI)
	ADDQ    $64, SI
	ADDQ    $64, DI
	DECQ    CX
	JNE     accumulate512

accumulate512done:
	VZEROUPPER
	RET

// func accumulateAVX2(u, w *float64, c float64, n int)
TEXT ·accumulateAVX2(SB), NOSPLIT, $0-32
	MOVQ u+0(FP), DI
	MOVQ w+8(FP), SI
	VBROADCASTSD c+16(FP), Y0
	MOVQ n+24(FP), CX
	SHRQ $3, CX
	JEQ  accumulate256done

accumulate256:
	VMULPD  (SI), Y0, Y1
	VMULPD  32(SI), Y0, Y2
	VADDPD  (DI), Y1, Y3
	VADDPD  32(DI), Y2, Y4
	VMOVUPD Y1, (SI)
	VMOVUPD Y2, 32(SI)
	VMOVUPD Y3, (DI)
	VMOVUPD Y4, 32(DI)
	ADDQ    $64, SI
	ADDQ    $64, DI
	DECQ    CX
	JNE     accumulate256

accumulate256done:
	VZEROUPPER
	RET

// func combineAVX512(y, u *float64, k *[]float64, c *float64, terms, n int)
TEXT ·combineAVX512(SB), NOSPLIT, $0-48
	MOVQ y+0(FP), DI
	MOVQ u+8(FP), SI
	MOVQ k+16(FP), R8
	MOVQ c+24(FP), R9
	MOVQ terms+32(FP), R11
	MOVQ n+40(FP), CX
	SHLQ $3, CX
	XORQ R10, R10
	SUBQ $256, CX
	JLT  combine512rest

combine512:
	VMOVUPD (SI)(R10*1), Z0
	VMOVUPD 64(SI)(R10*1), Z1
	VMOVUPD 128(SI)(R10*1), Z2
	VMOVUPD 192(SI)(R10*1), Z3
	MOVQ    R8, R12 // slice headers: 24 bytes each
	XORQ    AX, AX

combine512term:
	MOVQ         (R12), BX
	VBROADCASTSD (R9)(AX*8), Z4
	VMULPD       (BX)(R10*1), Z4, Z5
	VMULPD       64(BX)(R10*1), Z4, Z6
	VMULPD       128(BX)(R10*1), Z4, Z7
	VMULPD       192(BX)(R10*1), Z4, Z8
	VADDPD       Z5, Z0, Z0
	VADDPD       Z6, Z1, Z1
	VADDPD       Z7, Z2, Z2
	VADDPD       Z8, Z3, Z3
	ADDQ         $24, R12
	INCQ         AX
	CMPQ         AX, R11
	JLT          combine512term
	VMOVUPD      Z0, (DI)(R10*1)
	VMOVUPD      Z1, 64(DI)(R10*1)
	VMOVUPD      Z2, 128(DI)(R10*1)
	VMOVUPD      Z3, 192(DI)(R10*1)
	ADDQ         $256, R10
	SUBQ         $256, CX
	JGE          combine512

combine512rest:
	ADDQ $256, CX
	JEQ  combine512done

combine512one:
	VMOVUPD (SI)(R10*1), Z0
	MOVQ    R8, R12
	XORQ    AX, AX

combine512oneTerm:
	MOVQ         (R12), BX
	VBROADCASTSD (R9)(AX*8), Z4
	VMULPD       (BX)(R10*1), Z4, Z5
	VADDPD       Z5, Z0, Z0
	ADDQ         $24, R12
	INCQ         AX
	CMPQ         AX, R11
	JLT          combine512oneTerm
	VMOVUPD      Z0, (DI)(R10*1)
	ADDQ         $64, R10
	SUBQ         $64, CX
	JNE          combine512one

combine512done:
	VZEROUPPER
	RET

// func combineAVX2(y, u *float64, k *[]float64, c *float64, terms, n int)
TEXT ·combineAVX2(SB), NOSPLIT, $0-48
	MOVQ y+0(FP), DI
	MOVQ u+8(FP), SI
	MOVQ k+16(FP), R8
	MOVQ c+24(FP), R9
	MOVQ terms+32(FP), R11
	MOVQ n+40(FP), CX
	SHLQ $3, CX
	XORQ R10, R10
	SUBQ $128, CX
	JLT  combine256rest

combine256:
	VMOVUPD (SI)(R10*1), Y0
	VMOVUPD 32(SI)(R10*1), Y1
	VMOVUPD 64(SI)(R10*1), Y2
	VMOVUPD 96(SI)(R10*1), Y3
	MOVQ    R8, R12
	XORQ    AX, AX

combine256term:
	MOVQ         (R12), BX
	VBROADCASTSD (R9)(AX*8), Y4
	VMULPD       (BX)(R10*1), Y4, Y5
	VMULPD       32(BX)(R10*1), Y4, Y6
	VMULPD       64(BX)(R10*1), Y4, Y7
	VMULPD       96(BX)(R10*1), Y4, Y8
	VADDPD       Y5, Y0, Y0
	VADDPD       Y6, Y1, Y1
	VADDPD       Y7, Y2, Y2
	VADDPD       Y8, Y3, Y3
	ADDQ         $24, R12
	INCQ         AX
	CMPQ         AX, R11
	JLT          combine256term
	VMOVUPD      Y0, (DI)(R10*1)
	VMOVUPD      Y1, 32(DI)(R10*1)
	VMOVUPD      Y2, 64(DI)(R10*1)
	VMOVUPD      Y3, 96(DI)(R10*1)
	ADDQ         $128, R10
	SUBQ         $128, CX
	JGE          combine256

combine256rest:
	ADDQ $128, CX
	JEQ  combine256done

combine256one:
	VMOVUPD (SI)(R10*1), Y0
	VMOVUPD 32(SI)(R10*1), Y1
	MOVQ    R8, R12
	XORQ    AX, AX

combine256oneTerm:
	MOVQ         (R12), BX
	VBROADCASTSD (R9)(AX*8), Y4
	VMULPD       (BX)(R10*1), Y4, Y5
	VMULPD       32(BX)(R10*1), Y4, Y6
	VADDPD       Y5, Y0, Y0
	VADDPD       Y6, Y1, Y1
	ADDQ         $24, R12
	INCQ         AX
	CMPQ         AX, R11
	JLT          combine256oneTerm
	VMOVUPD      Y0, (DI)(R10*1)
	VMOVUPD      Y1, 32(DI)(R10*1)
	ADDQ         $64, R10
	SUBQ         $64, CX
	JNE          combine256one

combine256done:
	VZEROUPPER
	RET

// func pairAVX512(x, y, p, q *float64, c *[4]float64, n int)
TEXT ·pairAVX512(SB), NOSPLIT, $0-48
	MOVQ x+0(FP), DI
	MOVQ y+8(FP), SI
	MOVQ p+16(FP), R8
	MOVQ q+24(FP), R9
	MOVQ c+32(FP), AX
	MOVQ n+40(FP), CX
	VBROADCASTSD (AX), Z0
	VBROADCASTSD 8(AX), Z1
	VBROADCASTSD 16(AX), Z2
	VBROADCASTSD 24(AX), Z3
	XORQ R10, R10
	SHRQ $3, CX
	JEQ  pair512done

pair512:
	VMOVUPD (R8)(R10*1), Z4
	VMOVUPD (R9)(R10*1), Z5
	VMULPD  Z0, Z4, Z6
	VMULPD  Z1, Z5, Z7
	VMULPD  Z2, Z4, Z8
	VMULPD  Z3, Z5, Z9
	VADDPD  Z7, Z6, Z6
	VADDPD  Z9, Z8, Z8
	VADDPD  (DI)(R10*1), Z6, Z6
	VADDPD  (SI)(R10*1), Z8, Z8
	VMOVUPD Z6, (DI)(R10*1)
	VMOVUPD Z8, (SI)(R10*1)
	ADDQ    $64, R10
	DECQ    CX
	JNE     pair512

pair512done:
	VZEROUPPER
	RET

// func pairAVX2(x, y, p, q *float64, c *[4]float64, n int)
TEXT ·pairAVX2(SB), NOSPLIT, $0-48
	MOVQ x+0(FP), DI
	MOVQ y+8(FP), SI
	MOVQ p+16(FP), R8
	MOVQ q+24(FP), R9
	MOVQ c+32(FP), AX
	MOVQ n+40(FP), CX
	VBROADCASTSD (AX), Y0
	VBROADCASTSD 8(AX), Y1
	VBROADCASTSD 16(AX), Y2
	VBROADCASTSD 24(AX), Y3
	XORQ R10, R10
	SHRQ $2, CX
	JEQ  pair256done

pair256:
	VMOVUPD (R8)(R10*1), Y4
	VMOVUPD (R9)(R10*1), Y5
	VMULPD  Y0, Y4, Y6
	VMULPD  Y1, Y5, Y7
	VMULPD  Y2, Y4, Y8
	VMULPD  Y3, Y5, Y9
	VADDPD  Y7, Y6, Y6
	VADDPD  Y9, Y8, Y8
	VADDPD  (DI)(R10*1), Y6, Y6
	VADDPD  (SI)(R10*1), Y8, Y8
	VMOVUPD Y6, (DI)(R10*1)
	VMOVUPD Y8, (SI)(R10*1)
	ADDQ    $32, R10
	DECQ    CX
	JNE     pair256

pair256done:
	VZEROUPPER
	RET
