package worldline

// KerrState is a point mass on a Kerr hole of spin a at one instant, in
// coordinates regular through the future horizon. With Sigma = r^2 + a^2 cos^2,
// K = r^2 + a^2, P = E K - a L, and a prime for d/d(proper time):
type KerrState struct {
	Rho        float64 // grid coordinate of the slicing it was made for
	R          float64 // Boyer–Lindquist radius
	Cos, Sin   float64 // of the polar angle
	Phi        float64 // ingoing azimuth phi~
	Wr, Wtheta float64 // Sigma r' and Sigma theta'
	E, L, Q    float64 // energy, angular momentum, Carter's constant
}

// Carter returns K_C = Q + (L - a E)^2.
func (k KerrState) Carter(a float64) float64 {
	d := k.L - a*k.E
	return k.Q + d*d
}

// Ingoing returns N = v' - a sin^2 phi~' = (P + Sigma r')/Delta, in the form
// (r^2 + K_C)/(P - Sigma r') when the particle moves inwards, which is finite
// at the horizon.
func (k KerrState) Ingoing(a float64) float64 {
	p := k.E*(k.R*k.R+a*a) - a*k.L
	if k.Wr <= 0 {
		return (k.R*k.R + k.Carter(a)) / (p - k.Wr)
	}
	return (p + k.Wr) / (k.R*k.R - 2*k.R + a*a)
}

// Outgoing returns P - Sigma r' = Delta (r^2 + K_C)/(P + Sigma r').
func (k KerrState) Outgoing(a float64) float64 {
	p := k.E*(k.R*k.R+a*a) - a*k.L
	if k.Wr <= 0 {
		return p - k.Wr
	}
	return (k.R*k.R - 2*k.R + a*a) * (k.R*k.R + k.Carter(a)) / (p + k.Wr)
}

// SigmaTau returns Sigma tau' on a slicing with tau = v - int B dr:
// Sigma v' - B Sigma r', Sigma v' = K N + a (L - a E sin^2).
func (k KerrState) SigmaTau(a, b float64) float64 {
	return (k.R*k.R+a*a)*k.Ingoing(a) + a*(k.L-a*k.E*k.Sin*k.Sin) - b*k.Wr
}

// SigmaPhi returns Sigma phi~' = a N + L/sin^2 - a E.
func (k KerrState) SigmaPhi(a float64) float64 {
	l := 0.0
	if k.L != 0 {
		l = k.L / (k.Sin * k.Sin)
	}
	return a*k.Ingoing(a) + l - a*k.E
}

// Twist returns sin (a E - L/sin^2), which with Sigma theta' makes up the
// component of the four-velocity along the complex leg of the tetrad.
func (k KerrState) Twist(a float64) float64 {
	t := a * k.E * k.Sin
	if k.L != 0 {
		t -= k.L / k.Sin
	}
	return t
}
