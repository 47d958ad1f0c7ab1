package semi

import "nullmark/grid"

// The hot loops: free functions over slices. Layout u[i*8+lane].

const lanes = grid.Lanes

// flatAny is the wave operator between the layers for any order:
// out_i = sum_k d2_k psi_{i±k} + pot_i psi_i for i in [lo, hi). It is the
// reference of the unrolled forms.
func flatAny(out, psi, pot, d2 []float64, lo, hi int) {
	for i := lo; i < hi; i++ {
		for l := 0; l < lanes; l++ {
			at := i*lanes + l
			a := (d2[0] + pot[at]) * psi[at]
			for k := 1; k < len(d2); k++ {
				a += d2[k] * (psi[at-k*lanes] + psi[at+k*lanes])
			}
			out[at] = a
		}
	}
}

// flat12 is flatAny for order 12, unrolled over the stencil.
func flat12(out, psi, pot []float64, d2 *[7]float64, lo, hi int) {
	w0, w1, w2, w3, w4, w5, w6 := d2[0], d2[1], d2[2], d2[3], d2[4], d2[5], d2[6]
	for i := lo; i < hi; i++ {
		p := (*[13 * lanes]float64)(psi[(i-6)*lanes : (i+7)*lanes])
		c := (*[lanes]float64)(pot[i*lanes : (i+1)*lanes])
		o := (*[lanes]float64)(out[i*lanes : (i+1)*lanes])
		for l := 0; l < lanes; l++ {
			o[l] = (w0+c[l])*p[6*lanes+l] +
				w1*(p[5*lanes+l]+p[7*lanes+l]) +
				w2*(p[4*lanes+l]+p[8*lanes+l]) +
				w3*(p[3*lanes+l]+p[9*lanes+l]) +
				w4*(p[2*lanes+l]+p[10*lanes+l]) +
				w5*(p[1*lanes+l]+p[11*lanes+l]) +
				w6*(p[l]+p[12*lanes+l])
		}
	}
}

// rows applies rows lo..hi-1 of the layers, weights of their own at each point:
// out_i = sum_j wpsi_ij psi_j + wpi_ij pi_j + pot_i psi_i.
func rows(g *Geometry, out, psi, pi, pot []float64, lo, hi int) {
	for i := lo; i < hi; i++ {
		wp, wq := g.psi[i], g.pi[i]
		at := g.first[i] * lanes
		if len(wp) == 13 && len(wq) == 13 {
			row13(
				(*[lanes]float64)(out[i*lanes:(i+1)*lanes]),
				(*[13 * lanes]float64)(psi[at:at+13*lanes]),
				(*[13 * lanes]float64)(pi[at:at+13*lanes]),
				(*[lanes]float64)(pot[i*lanes:(i+1)*lanes]),
				(*[lanes]float64)(psi[i*lanes:(i+1)*lanes]),
				(*[13]float64)(wp), (*[13]float64)(wq))
			continue
		}
		rowAny(out, psi, pi, pot, wp, wq, i, at)
	}
}

// rowAny is one row of any width; it is the reference of row13.
func rowAny(out, psi, pi, pot, wp, wq []float64, i, at int) {
	for l := 0; l < lanes; l++ {
		a := pot[i*lanes+l] * psi[i*lanes+l]
		q := at + l
		for j, w := range wp {
			a += w*psi[q] + wq[j]*pi[q]
			q += lanes
		}
		out[i*lanes+l] = a
	}
}

// row13 is a centred row of order 12.
func row13(out *[lanes]float64, psi, pi *[13 * lanes]float64, pot, here *[lanes]float64, wp, wq *[13]float64) {
	var a [lanes]float64
	for l := 0; l < lanes; l++ {
		a[l] = pot[l] * here[l]
	}
	for j := 0; j < 13; j++ {
		w, q := wp[j], wq[j]
		p := (*[lanes]float64)(psi[j*lanes : (j+1)*lanes])
		r := (*[lanes]float64)(pi[j*lanes : (j+1)*lanes])
		a[0] += w*p[0] + q*r[0]
		a[1] += w*p[1] + q*r[1]
		a[2] += w*p[2] + q*r[2]
		a[3] += w*p[3] + q*r[3]
		a[4] += w*p[4] + q*r[4]
		a[5] += w*p[5] + q*r[5]
		a[6] += w*p[6] + q*r[6]
		a[7] += w*p[7] + q*r[7]
	}
	*out = a
}
