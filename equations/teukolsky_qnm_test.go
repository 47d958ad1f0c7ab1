package equations

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/hyperboloidal"
)

// The eigenvalues of the discretised Teukolsky operator on the layers are the
// quasinormal frequencies: every coefficient enters, in all three parts of the
// slicing. The references are Leaver's (E. W. Leaver, Proc. R. Soc. A 402, 285
// (1985)), recomputed to more digits by his continued fraction. The eigenvalue problem
// of s = +-2 is ill-conditioned (its fields span many decades between the two
// ends): measured 3e-10 at s = -2, 2e-9 at s = +2 on this short domain, and
// worse on a longer one although the evolution is not.
func TestTeukolskyQuasinormal(t *testing.T) {
	for _, c := range []struct {
		a       float64
		s, l, m int
		want    complex128
		tol     float64
	}{
		{0, -2, 2, 2, 0.373671684418042 - 0.0889623156889357i, 5e-10},
		{0, 0, 2, 1, 0.483643872210713 - 0.0967587759782879i, 5e-10},
		{0.5, -2, 2, 2, 0.4641230260 - 0.0856388350i, 5e-10},
		{0.7, -2, 2, 2, 0.5326002436 - 0.0807928732i, 5e-10},
		{0.7, 2, 2, 2, 0.5326002436 - 0.0807928732i, 1e-8},
		{0.7, -2, 2, 1, 0.4551214854 - 0.0820852262i, 5e-10},
		{0.7, -2, 3, 2, 0.7591747232 - 0.0841896458i, 5e-10},
	} {
		got := eigenfrequency(c.a, c.s, c.m, 7, 120, c.want*complex(1.01, 0.01), c.l)
		if d := cmplx.Abs(got-c.want) / cmplx.Abs(c.want); !(d < c.tol) {
			t.Errorf("a=%g s=%d l=%d m=%d: %.13f, want %.13f (relative %.1e)", c.a, c.s, c.l, c.m, got, c.want, d)
		} else {
			t.Logf("a=%g s=%d l=%d m=%d: off by %.1e", c.a, c.s, c.l, c.m, d)
		}
	}
}

// eigenfrequency solves (w^2 Mq + w Cq + Kq) u = 0 near the guess by Newton's
// method for eigenpairs, with differences of order 12 on points+1 nodes.
func eigenfrequency(a float64, s, m, modes, points int, guess complex128, l int) complex128 {
	h, err := hyperboloidal.NewKerr(a)
	if err != nil {
		panic(err)
	}
	sl := hyperboloidal.KerrLayers{Hole: h, Si: -4, Ri: 1.5, Ro: 2, So: 7, Steepness: 3}
	q := Teukolsky{S: s, M: m, Spin: a}
	cp := q.Couple(modes)
	const order = 12
	dx := (sl.So - sl.Si) / float64(points)
	n := (points + 1) * modes
	bw := (order + 2) * modes
	assemble := func(w complex128) (op, dop *band) {
		op, dop = newBand(n, bw), newBand(n, bw)
		for i := 0; i <= points; i++ {
			p := sl.At(math.Min(sl.Si+dx*float64(i), sl.So))
			c := q.At(p)
			lo := min(max(i-order/2, 0), points-order)
			w1 := fornberg(i-lo, order+1, 1)
			w2 := w1
			lo2, n2 := lo, order+1
			if i-order/2 < 0 || i+order/2 > points {
				n2 = order + 2
				lo2 = min(max(i-order/2, 0), points-order-1)
			}
			w2 = fornberg(i-lo2, n2, 2)
			for k := range modes {
				row := i*modes + k
				for j, v := range w1 {
					d := complex(v/dx, 0)
					op.add(row, (lo+j)*modes+k, d*(-1i*w*complex(c.Axt, 0)+c.Ax))
					dop.add(row, (lo+j)*modes+k, d*(-1i)*complex(c.Axt, 0))
				}
				for j, v := range w2 {
					op.add(row, (lo2+j)*modes+k, complex(v/dx/dx*c.Axx, 0))
				}
				put := func(kk int, sin, cos float64) {
					if kk < 0 || kk >= modes {
						return
					}
					col := i*modes + kk
					op.add(row, col, w*w*complex(a*a*sin, 0)+w*complex(2*a*float64(s)*cos, 0))
					dop.add(row, col, 2*w*complex(a*a*sin, 0)+complex(2*a*float64(s)*cos, 0))
				}
				put(k, cp.Sin0[k], cp.Cos0[k])
				put(k+1, cp.Sin1[k], cp.Cos1[k])
				put(k+2, cp.Sin2[k], 0)
				if k > 0 {
					put(k-1, cp.Sin1[k-1], cp.Cos1[k-1])
				}
				if k > 1 {
					put(k-2, cp.Sin2[k-2], 0)
				}
				op.add(row, row, -w*w*complex(c.A0, 0)-1i*w*c.At+complex(q.Eigenvalue(cp.LMin+k), 0)+c.V)
				dop.add(row, row, -2*w*complex(c.A0, 0)-1i*c.At)
			}
		}
		return
	}
	u := make([]complex128, n)
	for i := 0; i <= points; i++ {
		u[i*modes+l-cp.LMin] = 1
	}
	w := guess
	for it := range 12 {
		op, dop := assemble(w)
		v := dop.apply(u)
		op.solve(v)
		big := 0
		for i := range v {
			if cmplx.Abs(v[i]) > cmplx.Abs(v[big]) {
				big = i
			}
		}
		step := u[big] / v[big]
		// the first steps only turn the vector
		if it >= 2 {
			w -= step
		}
		for i := range v {
			u[i] = v[i] / v[big]
		}
		if it > 3 && cmplx.Abs(step) < 1e-14 {
			break
		}
	}
	return w
}

// fornberg returns the weights of derivative der at node at among n nodes of
// unit spacing, by differentiating the Lagrange polynomials.
func fornberg(at, n, der int) []float64 {
	w := make([]float64, n)
	for j := range n {
		// coefficients of prod_{k != j} (t - (k-at))/(j-k) in powers of t
		poly := []float64{1}
		for k := range n {
			if k == j {
				continue
			}
			next := make([]float64, len(poly)+1)
			for i, c := range poly {
				next[i+1] += c / float64(j-k)
				next[i] -= c * float64(k-at) / float64(j-k)
			}
			poly = next
		}
		w[j] = poly[der]
		if der == 2 {
			w[j] *= 2
		}
	}
	return w
}

// band is a complex banded matrix with room for partial pivoting.
type band struct {
	n, bw int
	rows  [][]complex128 // rows[i][j] is column i-bw+j
}

func newBand(n, bw int) *band {
	b := &band{n: n, bw: bw, rows: make([][]complex128, n)}
	for i := range b.rows {
		b.rows[i] = make([]complex128, 3*bw+1)
	}
	return b
}

func (b *band) add(i, j int, v complex128) { b.rows[i][j-i+b.bw] += v }

func (b *band) apply(u []complex128) []complex128 {
	out := make([]complex128, b.n)
	for i, r := range b.rows {
		for j, v := range r {
			if c := i - b.bw + j; v != 0 && c >= 0 && c < b.n {
				out[i] += v * u[c]
			}
		}
	}
	return out
}

// solve overwrites v by the solution and destroys b.
func (b *band) solve(v []complex128) {
	// shift[i] is the column of rows[i][0]
	shift := make([]int, b.n)
	for i := range shift {
		shift[i] = i - b.bw
	}
	for k := range b.n {
		piv := k
		for i := k + 1; i <= min(k+b.bw, b.n-1); i++ {
			if cmplx.Abs(b.rows[i][k-shift[i]]) > cmplx.Abs(b.rows[piv][k-shift[piv]]) {
				piv = i
			}
		}
		b.rows[k], b.rows[piv] = b.rows[piv], b.rows[k]
		shift[k], shift[piv] = shift[piv], shift[k]
		v[k], v[piv] = v[piv], v[k]
		if piv != k { // the row that went down keeps only what it still needs
			r := b.rows[piv]
			moved := copy(r, r[k-shift[piv]:])
			clear(r[moved:])
			shift[piv] = k
		}
		pk := b.rows[k][k-shift[k]]
		last := min(k+2*b.bw, b.n-1)
		for i := k + 1; i <= min(k+b.bw, b.n-1); i++ {
			f := b.rows[i][k-shift[i]] / pk
			if f == 0 {
				continue
			}
			for c := k; c <= last; c++ {
				if c-shift[k] >= len(b.rows[k]) || c-shift[i] >= len(b.rows[i]) {
					break
				}
				b.rows[i][c-shift[i]] -= f * b.rows[k][c-shift[k]]
			}
			v[i] -= f * v[k]
		}
	}
	for k := b.n - 1; k >= 0; k-- {
		for c := k + 1; c <= min(k+2*b.bw, b.n-1) && c-shift[k] < len(b.rows[k]); c++ {
			v[k] -= b.rows[k][c-shift[k]] * v[c]
		}
		v[k] /= b.rows[k][k-shift[k]]
	}
}
