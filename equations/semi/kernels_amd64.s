#include "textflag.h"

// The vector forms of kernels.go: products and sums apart, in the order of the
// plain kernels, so that the bits agree. One point is eight lanes: one Z
// register, or two Y registers.
//
// Pointers: DI out, SI psi and R8 pi at the centre of the first row (rowsAny:
// at its first column), DX diag, R9 the weights of the rows; CX counts points.

// TAP2 adds w (a0+b0) to Z24 and w (a1+b1) to Z25.
#define TAP2(w, a0, b0, a1, b1) \
	VADDPD a0, b0, Z26   \
	VADDPD a1, b1, Z27   \
	VMULPD w, Z26, Z26   \
	VMULPD w, Z27, Z27   \
	VADDPD Z26, Z24, Z24 \
	VADDPD Z27, Z25, Z25

// TAP1 adds w (psi[-k] + psi[k]) to Z24.
#define TAP1(w, below, above) \
	VMOVUPD below(SI), Z26     \
	VADDPD  above(SI), Z26, Z26 \
	VMULPD  w, Z26, Z26        \
	VADDPD  Z26, Z24, Z24

// func flat12AVX512(out, psi, diag *float64, d2 *[7]float64, n int)
TEXT ·flat12AVX512(SB), NOSPLIT, $0-40
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ diag+16(FP), DX
	MOVQ d2+24(FP), AX
	MOVQ n+32(FP), CX
	VBROADCASTSD 8(AX), Z1
	VBROADCASTSD 16(AX), Z2
	VBROADCASTSD 24(AX), Z3
	VBROADCASTSD 32(AX), Z4
	VBROADCASTSD 40(AX), Z5
	VBROADCASTSD 48(AX), Z6
	SUBQ $2, CX
	JLT  flat512last

flat512two:
	// Z10..Z23 = psi at -6..7: two rows share their loads.
	VMOVUPD -384(SI), Z10
	VMOVUPD -320(SI), Z11
	VMOVUPD -256(SI), Z12
	VMOVUPD -192(SI), Z13
	VMOVUPD -128(SI), Z14
	VMOVUPD -64(SI), Z15
	VMOVUPD (SI), Z16
	VMOVUPD 64(SI), Z17
	VMOVUPD 128(SI), Z18
	VMOVUPD 192(SI), Z19
	VMOVUPD 256(SI), Z20
	VMOVUPD 320(SI), Z21
	VMOVUPD 384(SI), Z22
	VMOVUPD 448(SI), Z23
	VMULPD  (DX), Z16, Z24
	VMULPD  64(DX), Z17, Z25
	TAP2(Z1, Z15, Z17, Z16, Z18)
	TAP2(Z2, Z14, Z18, Z15, Z19)
	TAP2(Z3, Z13, Z19, Z14, Z20)
	TAP2(Z4, Z12, Z20, Z13, Z21)
	TAP2(Z5, Z11, Z21, Z12, Z22)
	TAP2(Z6, Z10, Z22, Z11, Z23)
	VMOVUPD Z24, (DI)
	VMOVUPD Z25, 64(DI)
	ADDQ    $128, SI
	ADDQ    $128, DX
	ADDQ    $128, DI
	SUBQ    $2, CX
	JGE     flat512two

flat512last:
	ADDQ $2, CX
	JEQ  flat512done
	VMOVUPD (SI), Z24
	VMULPD  (DX), Z24, Z24
	TAP1(Z1, -64, 64)
	TAP1(Z2, -128, 128)
	TAP1(Z3, -192, 192)
	TAP1(Z4, -256, 256)
	TAP1(Z5, -320, 320)
	TAP1(Z6, -384, 384)
	VMOVUPD Z24, (DI)

flat512done:
	VZEROUPPER
	RET

// HALFTAP is TAP1 on four lanes with the accumulator Y8.
#define HALFTAP(w, below, above) \
	VMOVUPD below(SI), Y9      \
	VADDPD  above(SI), Y9, Y9  \
	VMULPD  w, Y9, Y9          \
	VADDPD  Y9, Y8, Y8

// func flat12AVX2(out, psi, diag *float64, d2 *[7]float64, n int)
TEXT ·flat12AVX2(SB), NOSPLIT, $0-40
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ diag+16(FP), DX
	MOVQ d2+24(FP), AX
	MOVQ n+32(FP), CX
	VBROADCASTSD 8(AX), Y1
	VBROADCASTSD 16(AX), Y2
	VBROADCASTSD 24(AX), Y3
	VBROADCASTSD 32(AX), Y4
	VBROADCASTSD 40(AX), Y5
	VBROADCASTSD 48(AX), Y6
	ADDQ  CX, CX // half points: neighbours stay 64 bytes apart
	TESTQ CX, CX
	JLE   flat256done

flat256:
	VMOVUPD (SI), Y8
	VMULPD  (DX), Y8, Y8
	HALFTAP(Y1, -64, 64)
	HALFTAP(Y2, -128, 128)
	HALFTAP(Y3, -192, 192)
	HALFTAP(Y4, -256, 256)
	HALFTAP(Y5, -320, 320)
	HALFTAP(Y6, -384, 384)
	VMOVUPD Y8, (DI)
	ADDQ    $32, SI
	ADDQ    $32, DX
	ADDQ    $32, DI
	DECQ    CX
	JNE     flat256

flat256done:
	VZEROUPPER
	RET

// The weights of one row stand 112 bytes apart: twelve on psi, then c at 96 and
// e at 104.

// ROW adds to a row's sum its weight at w times a column of psi in register z.
#define ROW(z, w, sum) \
	VMULPD.BCST w(R9), z, Z5 \
	VADDPD      Z5, sum, sum

// DIFF4 is the term d (r+ - r-) of four rows, added to Z16..Z19.
#define DIFF4(d, above0, above1, above2, above3, below0, below1, below2, below3) \
	VSUBPD below0, above0, Z20 \
	VSUBPD below1, above1, Z21 \
	VSUBPD below2, above2, Z22 \
	VSUBPD below3, above3, Z23 \
	VMULPD d, Z20, Z20         \
	VMULPD d, Z21, Z21         \
	VMULPD d, Z22, Z22         \
	VMULPD d, Z23, Z23         \
	VADDPD Z20, Z16, Z16       \
	VADDPD Z21, Z17, Z17       \
	VADDPD Z22, Z18, Z18       \
	VADDPD Z23, Z19, Z19

// REST makes e pi + c s of a row in s, the weights at c and e.
#define REST(s, pi, c, e) \
	VMULPD.BCST c(R9), s, s   \
	VMULPD.BCST e(R9), pi, pi \
	VADDPD      s, pi, s

// PSI1 and DIFF1 are the like for one row, with the sums Z22 and Z24.
#define PSI1(column, w0) \
	VMOVUPD     column(SI), Z16    \
	VMULPD.BCST w0(R9), Z16, Z17   \
	VADDPD      Z17, Z22, Z22

#define DIFF1(d, above, below) \
	VMOVUPD above(R8), Z19      \
	VSUBPD  below(R8), Z19, Z19 \
	VMULPD  d, Z19, Z19         \
	VADDPD  Z19, Z24, Z24

// func rows13AVX512(out, psi, pi, diag, w *float64, d1 *[6]float64, n int)
TEXT ·rows13AVX512(SB), NOSPLIT, $0-56
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ pi+16(FP), R8
	MOVQ diag+24(FP), DX
	MOVQ w+32(FP), R9
	MOVQ d1+40(FP), AX
	MOVQ n+48(FP), CX
	VBROADCASTSD (AX), Z26
	VBROADCASTSD 8(AX), Z27
	VBROADCASTSD 16(AX), Z28
	VBROADCASTSD 24(AX), Z29
	VBROADCASTSD 32(AX), Z30
	VBROADCASTSD 40(AX), Z31
	SUBQ $4, CX
	JLT  rows512last

rows512four:
	// Z0..Z15 = pi at -6..9: four rows share their loads.
	VMOVUPD -384(R8), Z0
	VMOVUPD -320(R8), Z1
	VMOVUPD -256(R8), Z2
	VMOVUPD -192(R8), Z3
	VMOVUPD -128(R8), Z4
	VMOVUPD -64(R8), Z5
	VMOVUPD (R8), Z6
	VMOVUPD 64(R8), Z7
	VMOVUPD 128(R8), Z8
	VMOVUPD 192(R8), Z9
	VMOVUPD 256(R8), Z10
	VMOVUPD 320(R8), Z11
	VMOVUPD 384(R8), Z12
	VMOVUPD 448(R8), Z13
	VMOVUPD 512(R8), Z14
	VMOVUPD 576(R8), Z15

	VSUBPD Z5, Z7, Z16
	VSUBPD Z6, Z8, Z17
	VSUBPD Z7, Z9, Z18
	VSUBPD Z8, Z10, Z19
	VMULPD Z26, Z16, Z16
	VMULPD Z26, Z17, Z17
	VMULPD Z26, Z18, Z18
	VMULPD Z26, Z19, Z19
	DIFF4(Z27, Z8, Z9, Z10, Z11, Z4, Z5, Z6, Z7)
	DIFF4(Z28, Z9, Z10, Z11, Z12, Z3, Z4, Z5, Z6)
	DIFF4(Z29, Z10, Z11, Z12, Z13, Z2, Z3, Z4, Z5)
	DIFF4(Z30, Z11, Z12, Z13, Z14, Z1, Z2, Z3, Z4)
	DIFF4(Z31, Z12, Z13, Z14, Z15, Z0, Z1, Z2, Z3)
	REST(Z16, Z6, 96, 104)
	REST(Z17, Z7, 208, 216)
	REST(Z18, Z8, 320, 328)
	REST(Z19, Z9, 432, 440)

	// The centres, whose weights are in diag; then column by column.
	VMOVUPD (SI), Z0
	VMOVUPD 64(SI), Z1
	VMOVUPD 128(SI), Z2
	VMOVUPD 192(SI), Z3
	VMULPD (DX), Z0, Z20
	VMULPD 64(DX), Z1, Z21
	VMULPD 128(DX), Z2, Z22
	VMULPD 192(DX), Z3, Z23
	VMOVUPD -384(SI), Z4
	ROW(Z4, 0, Z20)
	VMOVUPD -320(SI), Z4
	ROW(Z4, 8, Z20)
	ROW(Z4, 112, Z21)
	VMOVUPD -256(SI), Z4
	ROW(Z4, 16, Z20)
	ROW(Z4, 120, Z21)
	ROW(Z4, 224, Z22)
	VMOVUPD -192(SI), Z4
	ROW(Z4, 24, Z20)
	ROW(Z4, 128, Z21)
	ROW(Z4, 232, Z22)
	ROW(Z4, 336, Z23)
	VMOVUPD -128(SI), Z4
	ROW(Z4, 32, Z20)
	ROW(Z4, 136, Z21)
	ROW(Z4, 240, Z22)
	ROW(Z4, 344, Z23)
	VMOVUPD -64(SI), Z4
	ROW(Z4, 40, Z20)
	ROW(Z4, 144, Z21)
	ROW(Z4, 248, Z22)
	ROW(Z4, 352, Z23)
	ROW(Z0, 152, Z21)
	ROW(Z0, 256, Z22)
	ROW(Z0, 360, Z23)
	ROW(Z1, 48, Z20)
	ROW(Z1, 264, Z22)
	ROW(Z1, 368, Z23)
	ROW(Z2, 56, Z20)
	ROW(Z2, 160, Z21)
	ROW(Z2, 376, Z23)
	ROW(Z3, 64, Z20)
	ROW(Z3, 168, Z21)
	ROW(Z3, 272, Z22)
	VMOVUPD 256(SI), Z4
	ROW(Z4, 72, Z20)
	ROW(Z4, 176, Z21)
	ROW(Z4, 280, Z22)
	ROW(Z4, 384, Z23)
	VMOVUPD 320(SI), Z4
	ROW(Z4, 80, Z20)
	ROW(Z4, 184, Z21)
	ROW(Z4, 288, Z22)
	ROW(Z4, 392, Z23)
	VMOVUPD 384(SI), Z4
	ROW(Z4, 88, Z20)
	ROW(Z4, 192, Z21)
	ROW(Z4, 296, Z22)
	ROW(Z4, 400, Z23)
	VMOVUPD 448(SI), Z4
	ROW(Z4, 200, Z21)
	ROW(Z4, 304, Z22)
	ROW(Z4, 408, Z23)
	VMOVUPD 512(SI), Z4
	ROW(Z4, 312, Z22)
	ROW(Z4, 416, Z23)
	VMOVUPD 576(SI), Z4
	ROW(Z4, 424, Z23)

	VADDPD Z16, Z20, Z20
	VADDPD Z17, Z21, Z21
	VADDPD Z18, Z22, Z22
	VADDPD Z19, Z23, Z23
	VMOVUPD Z20, (DI)
	VMOVUPD Z21, 64(DI)
	VMOVUPD Z22, 128(DI)
	VMOVUPD Z23, 192(DI)
	ADDQ $256, SI
	ADDQ $256, R8
	ADDQ $256, DX
	ADDQ $256, DI
	ADDQ $448, R9
	SUBQ $4, CX
	JGE  rows512four

rows512last:
	ADDQ $4, CX
	JEQ  rows512done

rows512one:
	VMOVUPD 64(R8), Z24
	VSUBPD  -64(R8), Z24, Z24
	VMULPD  Z26, Z24, Z24
	DIFF1(Z27, 128, -128)
	DIFF1(Z28, 192, -192)
	DIFF1(Z29, 256, -256)
	DIFF1(Z30, 320, -320)
	DIFF1(Z31, 384, -384)
	VMOVUPD     (R8), Z6
	VMULPD.BCST 96(R9), Z24, Z24
	VMULPD.BCST 104(R9), Z6, Z6
	VADDPD      Z24, Z6, Z24

	VMOVUPD (SI), Z22
	VMULPD  (DX), Z22, Z22
	PSI1(-384, 0)
	PSI1(-320, 8)
	PSI1(-256, 16)
	PSI1(-192, 24)
	PSI1(-128, 32)
	PSI1(-64, 40)
	PSI1(64, 48)
	PSI1(128, 56)
	PSI1(192, 64)
	PSI1(256, 72)
	PSI1(320, 80)
	PSI1(384, 88)
	VADDPD  Z24, Z22, Z22
	VMOVUPD Z22, (DI)
	ADDQ    $64, SI
	ADDQ    $64, R8
	ADDQ    $64, DX
	ADDQ    $64, DI
	ADDQ    $112, R9
	DECQ    CX
	JNE     rows512one

rows512done:
	VZEROUPPER
	RET

// HALFPSI adds a column of psi to both halves of a row's sum, Y0 and Y1.
#define HALFPSI(low, high, w) \
	VBROADCASTSD w(R9), Y5         \
	VMULPD       low(SI), Y5, Y6   \
	VMULPD       high(SI), Y5, Y7  \
	VADDPD       Y6, Y0, Y0        \
	VADDPD       Y7, Y1, Y1

// HALFDIFF adds d (r+ - r-) to both halves, Y2 and Y3.
#define HALFDIFF(d, above, above2, below, below2) \
	VMOVUPD above(R8), Y6      \
	VMOVUPD above2(R8), Y7     \
	VSUBPD  below(R8), Y6, Y6  \
	VSUBPD  below2(R8), Y7, Y7 \
	VMULPD  d, Y6, Y6          \
	VMULPD  d, Y7, Y7          \
	VADDPD  Y6, Y2, Y2         \
	VADDPD  Y7, Y3, Y3

// func rows13AVX2(out, psi, pi, diag, w *float64, d1 *[6]float64, n int)
TEXT ·rows13AVX2(SB), NOSPLIT, $0-56
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ pi+16(FP), R8
	MOVQ diag+24(FP), DX
	MOVQ w+32(FP), R9
	MOVQ d1+40(FP), AX
	MOVQ n+48(FP), CX
	VBROADCASTSD (AX), Y10
	VBROADCASTSD 8(AX), Y11
	VBROADCASTSD 16(AX), Y12
	VBROADCASTSD 24(AX), Y13
	VBROADCASTSD 32(AX), Y14
	VBROADCASTSD 40(AX), Y15
	TESTQ CX, CX
	JLE   rows256done

rows256:
	VMOVUPD 64(R8), Y2
	VMOVUPD 96(R8), Y3
	VSUBPD  -64(R8), Y2, Y2
	VSUBPD  -32(R8), Y3, Y3
	VMULPD  Y10, Y2, Y2
	VMULPD  Y10, Y3, Y3
	HALFDIFF(Y11, 128, 160, -128, -96)
	HALFDIFF(Y12, 192, 224, -192, -160)
	HALFDIFF(Y13, 256, 288, -256, -224)
	HALFDIFF(Y14, 320, 352, -320, -288)
	HALFDIFF(Y15, 384, 416, -384, -352)
	VBROADCASTSD 96(R9), Y4
	VBROADCASTSD 104(R9), Y5
	VMULPD       Y4, Y2, Y2
	VMULPD       Y4, Y3, Y3
	VMULPD       (R8), Y5, Y6
	VMULPD       32(R8), Y5, Y7
	VADDPD       Y2, Y6, Y2
	VADDPD       Y3, Y7, Y3

	VMOVUPD (SI), Y0
	VMOVUPD 32(SI), Y1
	VMULPD  (DX), Y0, Y0
	VMULPD  32(DX), Y1, Y1
	HALFPSI(-384, -352, 0)
	HALFPSI(-320, -288, 8)
	HALFPSI(-256, -224, 16)
	HALFPSI(-192, -160, 24)
	HALFPSI(-128, -96, 32)
	HALFPSI(-64, -32, 40)
	HALFPSI(64, 96, 48)
	HALFPSI(128, 160, 56)
	HALFPSI(192, 224, 64)
	HALFPSI(256, 288, 72)
	HALFPSI(320, 352, 80)
	HALFPSI(384, 416, 88)
	VADDPD  Y2, Y0, Y0
	VADDPD  Y3, Y1, Y1
	VMOVUPD Y0, (DI)
	VMOVUPD Y1, 32(DI)
	ADDQ    $64, SI
	ADDQ    $64, R8
	ADDQ    $64, DX
	ADDQ    $64, DI
	ADDQ    $112, R9
	DECQ    CX
	JNE     rows256

rows256done:
	VZEROUPPER
	RET

// func rowsAnyAVX512(out, here, psi, pi, diag, w *float64, width, slide, n int)
//
// here is psi at the row itself; slide is in points.
TEXT ·rowsAnyAVX512(SB), NOSPLIT, $0-72
	MOVQ out+0(FP), DI
	MOVQ here+8(FP), BX
	MOVQ psi+16(FP), SI
	MOVQ pi+24(FP), R8
	MOVQ diag+32(FP), DX
	MOVQ w+40(FP), R9
	MOVQ width+48(FP), R10
	MOVQ slide+56(FP), R11
	MOVQ n+64(FP), CX
	SHLQ  $6, R11
	JNE   any512rows
	TESTQ R10, R10
	JLE   any512rows

	// The rows have their columns in common: three at a time share the loads.
	MOVQ R10, R11
	SHLQ $4, R11 // bytes between the weights of two rows
	SUBQ $3, CX
	JLT  any512fewer

any512three:
	VMOVUPD (BX), Z0
	VMOVUPD 64(BX), Z2
	VMOVUPD 128(BX), Z4
	VMULPD  (DX), Z0, Z0
	VMULPD  64(DX), Z2, Z2
	VMULPD  128(DX), Z4, Z4
	VPXORQ  Z1, Z1, Z1
	VPXORQ  Z3, Z3, Z3
	VPXORQ  Z5, Z5, Z5
	MOVQ    SI, R12
	MOVQ    R8, R13
	MOVQ    R10, AX

any512threeColumn:
	VMOVUPD     (R12), Z6
	VMOVUPD     (R13), Z7
	VMULPD.BCST (R9), Z6, Z8
	VMULPD.BCST 8(R9), Z7, Z9
	VMULPD.BCST (R9)(R11*1), Z6, Z10
	VMULPD.BCST 8(R9)(R11*1), Z7, Z11
	VMULPD.BCST (R9)(R11*2), Z6, Z12
	VMULPD.BCST 8(R9)(R11*2), Z7, Z13
	VADDPD      Z8, Z0, Z0
	VADDPD      Z9, Z1, Z1
	VADDPD      Z10, Z2, Z2
	VADDPD      Z11, Z3, Z3
	VADDPD      Z12, Z4, Z4
	VADDPD      Z13, Z5, Z5
	ADDQ        $64, R12
	ADDQ        $64, R13
	ADDQ        $16, R9
	DECQ        AX
	JNE         any512threeColumn
	VADDPD      Z1, Z0, Z0
	VADDPD      Z3, Z2, Z2
	VADDPD      Z5, Z4, Z4
	VMOVUPD     Z0, (DI)
	VMOVUPD     Z2, 64(DI)
	VMOVUPD     Z4, 128(DI)
	LEAQ        (R9)(R11*2), R9
	ADDQ        $192, BX
	ADDQ        $192, DX
	ADDQ        $192, DI
	SUBQ        $3, CX
	JGE         any512three

any512fewer:
	ADDQ $3, CX
	XORQ R11, R11

any512rows:
	TESTQ CX, CX
	JLE   any512done

any512row:
	VMOVUPD (BX), Z0
	VMULPD  (DX), Z0, Z0
	VPXORQ  Z1, Z1, Z1
	MOVQ    SI, R12
	MOVQ    R8, R13
	MOVQ    R10, AX
	TESTQ   AX, AX
	JLE     any512end

any512column:
	VMOVUPD     (R12), Z2
	VMOVUPD     (R13), Z3
	VMULPD.BCST (R9), Z2, Z2
	VMULPD.BCST 8(R9), Z3, Z3
	VADDPD      Z2, Z0, Z0
	VADDPD      Z3, Z1, Z1
	ADDQ        $64, R12
	ADDQ        $64, R13
	ADDQ        $16, R9
	DECQ        AX
	JNE         any512column

any512end:
	VADDPD  Z1, Z0, Z0
	VMOVUPD Z0, (DI)
	ADDQ    R11, SI
	ADDQ    R11, R8
	ADDQ    $64, BX
	ADDQ    $64, DX
	ADDQ    $64, DI
	DECQ    CX
	JNE     any512row

any512done:
	VZEROUPPER
	RET

// func rowsAnyAVX2(out, here, psi, pi, diag, w *float64, width, slide, n int)
TEXT ·rowsAnyAVX2(SB), NOSPLIT, $0-72
	MOVQ out+0(FP), DI
	MOVQ here+8(FP), BX
	MOVQ psi+16(FP), SI
	MOVQ pi+24(FP), R8
	MOVQ diag+32(FP), DX
	MOVQ w+40(FP), R9
	MOVQ width+48(FP), R10
	MOVQ slide+56(FP), R11
	MOVQ n+64(FP), CX
	SHLQ  $6, R11
	TESTQ CX, CX
	JLE   any256done

any256row:
	VMOVUPD (BX), Y0
	VMOVUPD 32(BX), Y1
	VMULPD  (DX), Y0, Y0
	VMULPD  32(DX), Y1, Y1
	VXORPD  Y2, Y2, Y2
	VXORPD  Y3, Y3, Y3
	MOVQ    SI, R12
	MOVQ    R8, R13
	MOVQ    R10, AX
	TESTQ   AX, AX
	JLE     any256end

any256column:
	VBROADCASTSD (R9), Y4
	VBROADCASTSD 8(R9), Y5
	VMULPD       (R12), Y4, Y6
	VMULPD       32(R12), Y4, Y7
	VMULPD       (R13), Y5, Y8
	VMULPD       32(R13), Y5, Y9
	VADDPD       Y6, Y0, Y0
	VADDPD       Y7, Y1, Y1
	VADDPD       Y8, Y2, Y2
	VADDPD       Y9, Y3, Y3
	ADDQ         $64, R12
	ADDQ         $64, R13
	ADDQ         $16, R9
	DECQ         AX
	JNE          any256column

any256end:
	VADDPD  Y2, Y0, Y0
	VADDPD  Y3, Y1, Y1
	VMOVUPD Y0, (DI)
	VMOVUPD Y1, 32(DI)
	ADDQ    R11, SI
	ADDQ    R11, R8
	ADDQ    $64, BX
	ADDQ    $64, DX
	ADDQ    $64, DI
	DECQ    CX
	JNE     any256row

any256done:
	VZEROUPPER
	RET

// func flatAnyAVX512(out, psi, diag, d2 *float64, half, n int)
//
// d2 is the centre weight, which is not read, and the half weights after it.
TEXT ·flatAnyAVX512(SB), NOSPLIT, $0-48
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ diag+16(FP), DX
	MOVQ d2+24(FP), R9
	MOVQ half+32(FP), R10
	MOVQ n+40(FP), CX
	TESTQ CX, CX
	JLE   flatAny512done

flatAny512row:
	VMOVUPD (SI), Z0
	VMULPD  (DX), Z0, Z0
	MOVQ    SI, R12
	MOVQ    SI, R13
	XORQ    AX, AX

flatAny512tap:
	INCQ        AX
	CMPQ        AX, R10
	JGT         flatAny512end
	SUBQ        $64, R12
	ADDQ        $64, R13
	VMOVUPD     (R12), Z1
	VADDPD      (R13), Z1, Z1
	VMULPD.BCST (R9)(AX*8), Z1, Z1
	VADDPD      Z1, Z0, Z0
	JMP         flatAny512tap

flatAny512end:
	VMOVUPD Z0, (DI)
	ADDQ    $64, SI
	ADDQ    $64, DX
	ADDQ    $64, DI
	DECQ    CX
	JNE     flatAny512row

flatAny512done:
	VZEROUPPER
	RET

// func flatAnyAVX2(out, psi, diag, d2 *float64, half, n int)
TEXT ·flatAnyAVX2(SB), NOSPLIT, $0-48
	MOVQ out+0(FP), DI
	MOVQ psi+8(FP), SI
	MOVQ diag+16(FP), DX
	MOVQ d2+24(FP), R9
	MOVQ half+32(FP), R10
	MOVQ n+40(FP), CX
	TESTQ CX, CX
	JLE   flatAny256done

flatAny256row:
	VMOVUPD (SI), Y0
	VMOVUPD 32(SI), Y1
	VMULPD  (DX), Y0, Y0
	VMULPD  32(DX), Y1, Y1
	MOVQ    SI, R12
	MOVQ    SI, R13
	XORQ    AX, AX

flatAny256tap:
	INCQ         AX
	CMPQ         AX, R10
	JGT          flatAny256end
	SUBQ         $64, R12
	ADDQ         $64, R13
	VBROADCASTSD (R9)(AX*8), Y4
	VMOVUPD      (R12), Y2
	VMOVUPD      32(R12), Y3
	VADDPD       (R13), Y2, Y2
	VADDPD       32(R13), Y3, Y3
	VMULPD       Y4, Y2, Y2
	VMULPD       Y4, Y3, Y3
	VADDPD       Y2, Y0, Y0
	VADDPD       Y3, Y1, Y1
	JMP          flatAny256tap

flatAny256end:
	VMOVUPD Y0, (DI)
	VMOVUPD Y1, 32(DI)
	ADDQ    $64, SI
	ADDQ    $64, DX
	ADDQ    $64, DI
	DECQ    CX
	JNE     flatAny256row

flatAny256done:
	VZEROUPPER
	RET
