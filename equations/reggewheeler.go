package equations

// ReggeWheeler is V = f [ l(l+1)/r^2 + 2(1-s^2)/r^3 ], f = 1-2/r: the odd
// gravitational perturbations for s = 2, the scalar field for s = 0.
//
// Source: T. Regge and J. A. Wheeler, Phys. Rev. 108, 1063 (1957).
type ReggeWheeler struct {
	L    int
	Spin int
}

// Reduced implements Potential: V r^2/f = l(l+1) + 2(1-s^2) x.
func (v ReggeWheeler) Reduced(x float64) float64 {
	return float64(v.L*(v.L+1)) + 2*float64(1-v.Spin*v.Spin)*x
}
