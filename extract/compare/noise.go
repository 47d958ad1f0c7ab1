package compare

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"

	"nullmark/extract/result"
	"nullmark/extract/table"
)

// SolarMassSeconds is G M_sun/c^3: the nominal solar mass parameter
// 1.3271244e20 m^3/s^2 (International Astronomical Union, resolution B3 of
// 2015) over the cube of 299792458 m/s.
const SolarMassSeconds = 1.3271244e20 / (299792458. * 299792458. * 299792458.)

// Noise is a detector's amplitude spectral density. The zero value is flat
// noise, the same at all frequencies.
type Noise struct {
	File      string
	Frequency []float64 // Hz, increasing, positive
	Density   []float64 // per sqrt(Hz), positive
	TotalMass float64   // solar masses: frequencies scale with its inverse
}

// ReadNoise reads a curve from two columns of a table: the frequency in Hz and
// the amplitude spectral density. Faults are *table.Fault.
func ReadNoise(tab *table.Table, frequency, density string, totalMass float64) (*Noise, error) {
	if !(totalMass > 0) || math.IsInf(totalMass, 0) {
		return nil, &InputError{What: fmt.Sprintf("the total mass for the noise curve is %v", totalMass), Remedy: "write it in solar masses, above zero"}
	}
	f, err := tab.Increasing(frequency)
	if err != nil {
		return nil, err
	}
	d, err := tab.Real(density)
	if err != nil {
		return nil, err
	}
	if len(d) != len(f) {
		return nil, &table.Fault{File: tab.File(), Array: density, Row: -1, Kind: table.Shape, What: fmt.Sprintf("has %d rows where the frequencies have %d", len(d), len(f))}
	}
	for i := range f {
		if f[i] <= 0 || d[i] <= 0 {
			return nil, &table.Fault{File: tab.File(), Array: density, Row: i, Kind: table.Cell, What: "frequency or density is not above zero", Remedy: "leave such rows out"}
		}
	}
	return &Noise{File: tab.File(), Frequency: f, Density: d, TotalMass: totalMass}, nil
}

// weight is 1/S at |omega| (rad/M), up to a constant; zero outside the curve.
func (n *Noise) weight(omega float64) float64 {
	if n == nil || len(n.Frequency) == 0 {
		return 1
	}
	f := math.Abs(omega) / (2 * math.Pi * SolarMassSeconds * n.TotalMass)
	k := len(n.Frequency)
	if f < n.Frequency[0] || f > n.Frequency[k-1] {
		return 0
	}
	lo, hi := 0, k-1
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; n.Frequency[mid] <= f {
			lo = mid
		} else {
			hi = mid
		}
	}
	x := math.Log(f/n.Frequency[lo]) / math.Log(n.Frequency[hi]/n.Frequency[lo])
	d := math.Exp(math.Log(n.Density[lo])*(1-x) + math.Log(n.Density[hi])*x)
	return n.best() / (d * d)
}

// best is the smallest power density, which keeps weights near one.
func (n *Noise) best() float64 {
	b := n.Density[0]
	for _, d := range n.Density {
		b = math.Min(b, d)
	}
	return b * b
}

// mostPoints bounds the transforms; longer series are thinned as far as their
// frequencies allow.
const mostPoints = 1 << 17

// mismatch is 1 - max |<a,b>|/sqrt(<a,a><b,b>) over a relative time and phase,
// where <a,b> = int conj(a~) b~/S df over positive and negative frequencies:
// both polarisations together, in equal noise. The samples are equidistant;
// the first and last twentieth are tapered. bar is the bar of each sample of
// a - b. ok is false where there is nothing to weigh.
//
// The value is computed as half the squared norm of the difference of the two
// normalised signals, so that it keeps its digits when it is tiny. Its bar
// follows from the bar of that norm, eps: sqrt(2 M) eps + eps^2/2.
func mismatch(u []float64, a, b []complex128, bar []float64, noise *Noise) (q result.Q, ok bool) {
	n := len(u)
	if n < 8 {
		return q, false
	}
	dt := (u[n-1] - u[0]) / float64(n-1)
	stride := 1
	if n > mostPoints {
		fastest := 0.0
		for i := 1; i < n; i++ {
			if cmplx.Abs(a[i]) > 1e-6 {
				fastest = math.Max(fastest, math.Abs(cmplx.Phase(a[i]*cmplx.Conj(a[i-1])))/dt)
			}
		}
		for n/(2*stride) > mostPoints && math.Pi/(float64(2*stride)*dt) > 4*fastest {
			stride *= 2
		}
	}
	k := (n + stride - 1) / stride
	step := dt * float64(stride)
	size := 1
	for size < k+k/4 {
		size *= 2
	}
	fft := fourier.NewCmplxFFT(size)
	ta, tb := make([]complex128, size), make([]complex128, size)
	edge := max(k/20, 1)
	var norm, err float64
	for i := 0; i < k; i++ {
		w := 1.0
		if e := min(i, k-1-i); e < edge {
			s := math.Sin(math.Pi / 2 * (float64(e) + 0.5) / float64(edge))
			w = s * s
		}
		ta[i] = complex(w, 0) * a[i*stride]
		tb[i] = complex(w, 0) * b[i*stride]
		norm += sq(ta[i])
		err += w * w * bar[i*stride] * bar[i*stride]
	}
	if norm == 0 {
		return q, false
	}
	eps := math.Sqrt(err / norm)
	fa, fb := fft.Coefficients(nil, ta), fft.Coefficients(nil, tb)
	omega := make([]float64, size)
	var aa, bb float64
	cross := ta // reused
	for i := range omega {
		omega[i] = 2 * math.Pi * float64(i) / (float64(size) * step)
		if i > size/2 {
			omega[i] -= 2 * math.Pi / step
		}
		w := math.Sqrt(noise.weight(omega[i]))
		fa[i] *= complex(w, 0)
		fb[i] *= complex(w, 0)
		aa += sq(fa[i])
		bb += sq(fb[i])
		cross[i] = cmplx.Conj(fa[i]) * fb[i]
	}
	if aa == 0 {
		return q, false
	}
	if bb == 0 { // nothing of the signal is there
		return result.Q{Value: 1}, true
	}
	// Coarse shift: the largest sample of the correlation.
	corr := fft.Sequence(tb, cross)
	top := 0
	for i := range corr {
		if sq(corr[i]) > sq(corr[top])*(1+1e-12) {
			top = i
		}
	}
	tau := float64(top) * step
	if top > size/2 {
		tau -= float64(size) * step
	}
	tau = refine(cross, omega, tau, step)
	c := shifted(cross, omega, tau)[0]
	turn := complex(1, 0)
	if c != 0 {
		turn = cmplx.Conj(c) / complex(cmplx.Abs(c), 0)
	}
	ra, rb := complex(1/math.Sqrt(aa), 0), turn*complex(1/math.Sqrt(bb), 0)
	m := 0.0
	for i := range fa {
		s, co := math.Sincos(omega[i] * tau)
		m += sq(ra*fa[i] - rb*fb[i]*complex(co, s))
	}
	m /= 2
	return result.Q{Value: m, Error: math.Sqrt(2*m)*eps + eps*eps/2}, true
}

func sq(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

// shifted returns sum c e^{i w tau} and its first two derivatives in tau.
func shifted(c []complex128, w []float64, tau float64) (s [3]complex128) {
	for i, x := range c {
		if x == 0 {
			continue
		}
		si, co := math.Sincos(w[i] * tau)
		x *= complex(co, si)
		s[0] += x
		x *= complex(0, w[i])
		s[1] += x
		s[2] += x * complex(0, w[i])
	}
	return s
}

// refine moves tau to the nearest maximum of |sum c e^{i w tau}|^2 by Newton's
// method, never further than step.
func refine(c []complex128, w []float64, tau, step float64) float64 {
	start := tau
	best := sq(shifted(c, w, tau)[0])
	for it := 0; it < 12; it++ {
		s := shifted(c, w, tau)
		d1 := 2 * real(cmplx.Conj(s[0])*s[1])
		d2 := 2 * (sq(s[1]) + real(cmplx.Conj(s[0])*s[2]))
		if !(d2 < 0) {
			break
		}
		next := tau - d1/d2
		if math.Abs(next-start) > step {
			break
		}
		p := sq(shifted(c, w, next)[0])
		if p < best {
			break
		}
		done := math.Abs(next-tau) < 1e-12*step
		best, tau = p, next
		if done {
			break
		}
	}
	return tau
}

// visible is the signal-to-noise ratio from which a mismatch could be noticed,
// sqrt(D/(2 mismatch)) (common practice, no source). Where the bar of the
// mismatch reaches zero it is a lower limit ("at least"); a mismatch that is
// exactly zero has none (nil).
func visible(m result.Q, d int) (*result.Q, string) {
	at := func(x float64) float64 { return math.Sqrt(float64(d) / (2 * x)) }
	low := at(m.Value + m.Error)
	switch {
	case m.Value+m.Error <= 0:
		return nil, ""
	case m.Value-m.Error <= 0:
		return &result.Q{Value: low}, "at least"
	}
	v := at(m.Value)
	return &result.Q{Value: v, Error: math.Max(v-low, at(m.Value-m.Error)-v)}, ""
}
