package semi

import "golang.org/x/sys/cpu"

// fastest is the best set of kernels for the processor at hand.
func fastest() instructions {
	switch {
	case cpu.X86.HasAVX512F:
		return avx512
	case cpu.X86.HasAVX2:
		return avx2
	}
	return goCode
}

// The vector kernels check nothing: the methods below do, and hand them pointers
// to the first row of a range of n >= 0 points.

//go:noescape
func flat12AVX512(out, psi, diag *float64, d2 *[7]float64, n int)

//go:noescape
func flat12AVX2(out, psi, diag *float64, d2 *[7]float64, n int)

//go:noescape
func flatAnyAVX512(out, psi, diag, d2 *float64, half, n int)

//go:noescape
func flatAnyAVX2(out, psi, diag, d2 *float64, half, n int)

//go:noescape
func rows13AVX512(out, psi, pi, diag, w *float64, d1 *[6]float64, n int)

//go:noescape
func rows13AVX2(out, psi, pi, diag, w *float64, d1 *[6]float64, n int)

//go:noescape
func rowsAnyAVX512(out, here, psi, pi, diag, w *float64, width, slide, n int)

//go:noescape
func rowsAnyAVX2(out, here, psi, pi, diag, w *float64, width, slide, n int)

func (s instructions) flat12(out, psi, diag []float64, d2 *[7]float64, lo, hi int) {
	if s == goCode || lo >= hi {
		flat12(out, psi, diag, d2, lo, hi)
		return
	}
	checkFlat(out, psi, diag, 6, lo, hi)
	at := lo * lanes
	if s == avx512 {
		flat12AVX512(&out[at], &psi[at], &diag[at], d2, hi-lo)
	} else {
		flat12AVX2(&out[at], &psi[at], &diag[at], d2, hi-lo)
	}
}

func (s instructions) flatAny(out, psi, diag, d2 []float64, lo, hi int) {
	if s == goCode || lo >= hi {
		flatAny(out, psi, diag, d2, lo, hi)
		return
	}
	checkFlat(out, psi, diag, len(d2)-1, lo, hi)
	at := lo * lanes
	if s == avx512 {
		flatAnyAVX512(&out[at], &psi[at], &diag[at], &d2[0], len(d2)-1, hi-lo)
	} else {
		flatAnyAVX2(&out[at], &psi[at], &diag[at], &d2[0], len(d2)-1, hi-lo)
	}
}

func (s instructions) rows13(out, psi, pi, diag, w []float64, d1 *[6]float64, lo, hi int) {
	if s == goCode || lo >= hi {
		rows13(out, psi, pi, diag, w, d1, lo, hi)
		return
	}
	checkFlat(out, psi, diag, 6, lo, hi)
	_, _ = pi[(hi+6)*lanes-1], w[(hi-lo)*rowStride-1]
	at := lo * lanes
	if s == avx512 {
		rows13AVX512(&out[at], &psi[at], &pi[at], &diag[at], &w[0], d1, hi-lo)
	} else {
		rows13AVX2(&out[at], &psi[at], &pi[at], &diag[at], &w[0], d1, hi-lo)
	}
}

func (s instructions) rowsAny(out, psi, pi, diag, w []float64, width, first, slide, lo, hi int) {
	if s == goCode || lo >= hi || width == 0 {
		rowsAny(out, psi, pi, diag, w, width, first, slide, lo, hi)
		return
	}
	checkFlat(out, psi, diag, 0, lo, hi)
	end := (first+(hi-lo-1)*slide+width)*lanes - 1
	_, _, _ = psi[end], pi[end], w[(hi-lo)*2*width-1]
	at, from := lo*lanes, first*lanes
	if s == avx512 {
		rowsAnyAVX512(&out[at], &psi[at], &psi[from], &pi[from], &diag[at], &w[0], width, slide, hi-lo)
	} else {
		rowsAnyAVX2(&out[at], &psi[at], &psi[from], &pi[from], &diag[at], &w[0], width, slide, hi-lo)
	}
}

// checkFlat panics, as the plain kernels would, when rows lo..hi-1 with reach
// neighbours on both sides leave a slice.
func checkFlat(out, psi, diag []float64, reach, lo, hi int) {
	_, _, _, _ = out[hi*lanes-1], diag[hi*lanes-1], psi[(lo-reach)*lanes], psi[(hi+reach)*lanes-1]
}
