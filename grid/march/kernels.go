package march

// The loops over whole states. Every kernel here is plain Go and the reference
// of the vector forms in kernels_amd64.s, which do the same operations in the
// same order and so give the same bits. The conversions float64(x*y) keep a
// compiler from fusing a product into a sum, which would round once instead of
// twice.

// accumulate scales w by c and adds it to u, of the same length.
func accumulate(u, w []float64, c float64) {
	u = u[:len(w)]
	for i, x := range w {
		x = float64(x * c)
		w[i] = x
		u[i] += x
	}
}

// combine writes u + sum_j c_j k_j into y, the sum from the left. All vectors
// have the length of y; y may be u but no k_j.
func combine(y, u []float64, k [][]float64, c []float64) {
	copy(y, u)
	for j, x := range k {
		a := c[j]
		x = x[:len(y)]
		for i := range y {
			y[i] += float64(a * x[i])
		}
	}
}

// pair adds c_0 p + c_1 q to x and c_2 p + c_3 q to y.
func pair(x, y, p, q []float64, c *[4]float64) {
	y, p, q = y[:len(x)], p[:len(x)], q[:len(x)]
	for i := range x {
		v, w := p[i], q[i]
		x[i] += float64(c[0]*v) + float64(c[1]*w)
		y[i] += float64(c[2]*v) + float64(c[3]*w)
	}
}

// axpy adds a x to y.
func axpy(y, x []float64, a float64) {
	active.combine(y, y, [][]float64{x}, []float64{a})
}

// instructions says which form of the kernels runs. All give the same bits
// (but for the sign and payload of a NaN).
type instructions uint8

const (
	goCode instructions = iota // the Go kernels above
	avx2                       // registers of four numbers
	avx512                     // registers of eight numbers
)

// active is chosen once for the processor; tests and benchmarks set it.
var active = fastest()
