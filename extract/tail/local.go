package tail

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"nullmark/extract/result"
)

// The local index: a polynomial of degree localDegree in ln u, fitted to
// ln|psi| on a stretch of 2 localHalf around each time.
const (
	localStep   = 0.02
	localHalf   = 0.08
	localDegree = 4
)

// local is the local power index -d ln|psi|/d ln u, with a bar from the
// scatter of the samples about the polynomial and from the change to a stretch
// half as long; both grow as round-off takes over.
func local(s Series, n *noise, begin, end float64) Index {
	var out Index
	for x := math.Log(begin) + localHalf; x <= math.Log(end)-localHalf; x += localStep {
		p, e, ok := slope(s, n, x, localHalf)
		if !ok {
			continue
		}
		if q, _, ok := slope(s, n, x, localHalf/2); ok {
			e += math.Abs(p - q)
		}
		out.Times = append(out.Times, math.Exp(x))
		out.Values = append(out.Values, result.Q{Value: p, Error: e})
	}
	return out
}

// slope fits the polynomial around x = ln u and returns minus its slope there
// with three times its standard error.
func slope(s Series, n *noise, x, half float64) (p, e float64, ok bool) {
	a, b := s.index(math.Exp(x-half)), s.index(math.Exp(x+half))
	stride := max(1, (b-a)/200)
	count := (b-a)/stride + 1
	const m = localDegree + 1
	if count < 2*m {
		return 0, 0, false
	}
	design := mat.NewDense(count, m, nil)
	rhs := mat.NewVecDense(count, nil)
	for i := range count {
		k := a + i*stride
		z := (math.Log(s.time(k)) - x) / half
		v := 1.0
		for j := range m {
			design.Set(i, j, v)
			v *= z
		}
		rhs.SetVec(i, math.Log(math.Abs(s.Values[k])))
	}
	var qr mat.QR
	qr.Factorize(design)
	var c mat.VecDense
	if err := qr.SolveVecTo(&c, false, rhs); err != nil {
		return 0, 0, false
	}
	rss := 0.0
	for i := range count {
		r := rhs.AtVec(i)
		for j := range m {
			r -= design.At(i, j) * c.AtVec(j)
		}
		rss += r * r
	}
	// For points spread evenly over [-1, 1] the slope at the centre of a
	// quartic has the variance 75/(4 n) sigma^2 (discrete Legendre sums).
	sigma := math.Sqrt(rss / float64(count-m))
	if k := s.index(math.Exp(x)); s.Values[k] != 0 {
		sigma = math.Max(sigma, n.level(k)/math.Abs(s.Values[k]))
	}
	return -c.AtVec(1) / half, 3 * sigma * math.Sqrt(18.75/float64(count)) / half, true
}
