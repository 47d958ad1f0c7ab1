//go:build !amd64

package semi

// fastest is the only set of kernels here.
func fastest() instructions { return goCode }

func (instructions) flat12(out, psi, diag []float64, d2 *[7]float64, lo, hi int) {
	flat12(out, psi, diag, d2, lo, hi)
}

func (instructions) flatAny(out, psi, diag, d2 []float64, lo, hi int) {
	flatAny(out, psi, diag, d2, lo, hi)
}

func (instructions) rows13(out, psi, pi, diag, w []float64, d1 *[6]float64, lo, hi int) {
	rows13(out, psi, pi, diag, w, d1, lo, hi)
}

func (instructions) rowsAny(out, psi, pi, diag, w []float64, width, first, slide, lo, hi int) {
	rowsAny(out, psi, pi, diag, w, width, first, slide, lo, hi)
}
