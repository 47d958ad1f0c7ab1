package semi

import "nullmark/grid"

// The hot loops: free functions over slices. Layout u[i*8+lane]. Every kernel
// here is plain Go and the reference of the vector forms in kernels_amd64.s,
// which do the same operations in the same order and so give the same bits.
// The conversions float64(x*y) keep a compiler from fusing a product into a
// sum, which would round once instead of twice.

const lanes = grid.Lanes

// flatAny is the wave operator between the layers for any order:
// out_i = diag_i psi_i + sum_k d2_k (psi_{i-k} + psi_{i+k}) for i in [lo, hi),
// diag the centre weight and the potential together.
func flatAny(out, psi, diag, d2 []float64, lo, hi int) {
	for i := lo; i < hi; i++ {
		for l := 0; l < lanes; l++ {
			at := i*lanes + l
			a := float64(diag[at] * psi[at])
			for k := 1; k < len(d2); k++ {
				a += float64(d2[k] * (psi[at-k*lanes] + psi[at+k*lanes]))
			}
			out[at] = a
		}
	}
}

// flat12 is flatAny for order 12, unrolled over the stencil.
func flat12(out, psi, diag []float64, d2 *[7]float64, lo, hi int) {
	w1, w2, w3, w4, w5, w6 := d2[1], d2[2], d2[3], d2[4], d2[5], d2[6]
	for i := lo; i < hi; i++ {
		p := (*[13 * lanes]float64)(psi[(i-6)*lanes : (i+7)*lanes])
		c := (*[lanes]float64)(diag[i*lanes : (i+1)*lanes])
		o := (*[lanes]float64)(out[i*lanes : (i+1)*lanes])
		for l := 0; l < lanes; l++ {
			a := float64(c[l] * p[6*lanes+l])
			a += float64(w1 * (p[5*lanes+l] + p[7*lanes+l]))
			a += float64(w2 * (p[4*lanes+l] + p[8*lanes+l]))
			a += float64(w3 * (p[3*lanes+l] + p[9*lanes+l]))
			a += float64(w4 * (p[2*lanes+l] + p[10*lanes+l]))
			a += float64(w5 * (p[1*lanes+l] + p[11*lanes+l]))
			a += float64(w6 * (p[l] + p[12*lanes+l]))
			o[l] = a
		}
	}
}

// rows13 is a range of centred rows of order 12 in the layers, i in [lo, hi):
//
//	out_i = [ diag_i psi_i + sum_{j != 0} w_ij psi_{i+j} ]
//	      + [ e_i pi_i + c_i sum_{k=1}^{6} d1_k (pi_{i+k} - pi_{i-k}) ],
//
// j = -6..6; both brackets are summed from the left. w holds rowStride numbers
// a point, those of row lo first: w at j = -6..-1, 1..6, then c and e. The
// first differences of psi are part of w.
func rows13(out, psi, pi, diag, w []float64, d1 *[6]float64, lo, hi int) {
	for i := lo; i < hi; i++ {
		p := (*[13 * lanes]float64)(psi[(i-6)*lanes : (i+7)*lanes])
		r := (*[13 * lanes]float64)(pi[(i-6)*lanes : (i+7)*lanes])
		v := (*[rowStride]float64)(w[(i-lo)*rowStride : (i-lo+1)*rowStride])
		g := (*[lanes]float64)(diag[i*lanes : (i+1)*lanes])
		o := (*[lanes]float64)(out[i*lanes : (i+1)*lanes])
		for l := 0; l < lanes; l++ {
			a := float64(g[l] * p[6*lanes+l])
			a += float64(v[0] * p[l])
			a += float64(v[1] * p[1*lanes+l])
			a += float64(v[2] * p[2*lanes+l])
			a += float64(v[3] * p[3*lanes+l])
			a += float64(v[4] * p[4*lanes+l])
			a += float64(v[5] * p[5*lanes+l])
			a += float64(v[6] * p[7*lanes+l])
			a += float64(v[7] * p[8*lanes+l])
			a += float64(v[8] * p[9*lanes+l])
			a += float64(v[9] * p[10*lanes+l])
			a += float64(v[10] * p[11*lanes+l])
			a += float64(v[11] * p[12*lanes+l])
			s := float64(d1[0] * (r[7*lanes+l] - r[5*lanes+l]))
			s += float64(d1[1] * (r[8*lanes+l] - r[4*lanes+l]))
			s += float64(d1[2] * (r[9*lanes+l] - r[3*lanes+l]))
			s += float64(d1[3] * (r[10*lanes+l] - r[2*lanes+l]))
			s += float64(d1[4] * (r[11*lanes+l] - r[1*lanes+l]))
			s += float64(d1[5] * (r[12*lanes+l] - r[l]))
			b := float64(v[13]*r[6*lanes+l]) + float64(v[12]*s)
			o[l] = a + b
		}
	}
}

// rowStride is how many weights rows13 takes a point.
const rowStride = 14

// rowsAny is a range of rows of any width, i in [lo, hi):
//
//	out_i = [ diag_i psi_i + sum_j w_ij psi_{f+j} ] + [ sum_j q_ij pi_{f+j} ],
//
// j = 0..width-1, f = first + (i-lo) slide: slide is 1 where the stencil moves
// along with its row and 0 at an end of the grid. w holds the pairs (w_ij, q_ij)
// one row after another.
func rowsAny(out, psi, pi, diag, w []float64, width, first, slide, lo, hi int) {
	for i := lo; i < hi; i++ {
		v := w[(i-lo)*2*width : (i-lo+1)*2*width]
		at := (first + (i-lo)*slide) * lanes
		for l := 0; l < lanes; l++ {
			a := float64(diag[i*lanes+l] * psi[i*lanes+l])
			b := 0.0
			q := at + l
			for j := 0; j < len(v); j += 2 {
				a += float64(v[j] * psi[q])
				b += float64(v[j+1] * pi[q])
				q += lanes
			}
			out[i*lanes+l] = a + b
		}
	}
}

// instructions says which form of the kernels runs. All give the same bits
// (but for the sign and payload of a NaN).
type instructions uint8

const (
	goCode instructions = iota // the Go kernels above
	avx2                       // half a point a register
	avx512                     // a point a register
)

// active is chosen once for the processor; tests and benchmarks set it.
var active = fastest()
