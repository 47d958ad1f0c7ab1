package equations

// Zerilli is, with mu = (l-1)(l+2),
//
//	V = f/(mu+6/r)^2 [ mu^2((mu+2)/r^2 + 6/r^3) + (36/r^4)(mu+2/r) ],
//
// the even gravitational perturbations.
//
// Source: F. J. Zerilli, Phys. Rev. Lett. 24, 737 (1970), in the form of
// K. Martel and E. Poisson, Phys. Rev. D 71, 104003 (2005).
type Zerilli struct{ L int }

// Reduced implements Potential.
func (v Zerilli) Reduced(x float64) float64 {
	mu := float64((v.L - 1) * (v.L + 2))
	d := mu + 6*x
	return (mu*mu*((mu+2)+6*x) + 36*x*x*(mu+2*x)) / (d * d)
}
