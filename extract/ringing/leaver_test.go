package ringing

import (
	"math/cmplx"
	"testing"
)

// Published: E. W. Leaver, Proc. R. Soc. A 402, 285 (1985), tables 1 to 3 (there
// 2M = 1, 5 to 6 digits); E. Berti, V. Cardoso & A. Starinets, Class. Quantum
// Grav. 26, 163001 (2009) and its tables online for the scalar and the Kerr
// ones. The digits beyond theirs come from a second implementation in extended
// precision.
func TestFrequency(t *testing.T) {
	for _, q := range []struct {
		a          float64
		s, l, m, n int
		want       complex128
		tol        float64
	}{
		{0, -2, 2, 0, 0, complex(0.373671684418042, -0.0889623156889357), 1e-10},
		{0, 2, 2, 1, 1, complex(0.346710996879163, -0.273914875291235), 1e-10},
		{0, -2, 2, 0, 2, complex(0.301053, -0.478277), 2e-6},
		{0, -2, 4, -3, 1, complex(0.796631532034503, -0.284334349404841), 1e-10},
		{0, 0, 0, 0, 0, complex(0.11045493908042, -0.104895717086881), 1e-10},
		{0, 0, 1, 0, 1, complex(0.264448650604833, -0.306257391559047), 1e-10},
		{0, 0, 3, 0, 1, complex(0.660671497955962, -0.292284785138412), 1e-10},
		{0.5, -2, 2, 2, 0, complex(0.464123025975938, -0.085638834988064), 1e-10},
		{0.7, -2, 2, 2, 1, complex(0.521160765268038, -0.244238315812387), 1e-10},
		{0.7, -2, 2, 1, 0, complex(0.455121485426366, -0.0820852262212671), 1e-10},
		{0.7, -2, 2, 0, 1, complex(0.373184967475281, -0.258507482335663), 1e-10},
		{0.7, -2, 2, -2, 0, complex(0.309808130358262, -0.0887171911289156), 1e-10},
		{-0.7, -2, 2, 2, 0, complex(0.309808130358262, -0.0887171911289156), 1e-10},
		{0.7, -2, 3, 3, 1, complex(0.837504048488518, -0.24943545974171), 1e-10},
		{0.5, -2, 3, 2, 0, complex(0.693440394852917, -0.0892803539969004), 1e-10},
		{0.7, -2, 4, 4, 1, complex(1.13815739839929, -0.25323294702355), 1e-10},
	} {
		w, err := Frequency(q.a, q.s, q.l, q.m, q.n)
		if d := cmplx.Abs(w - q.want); err != nil || d > q.tol {
			t.Errorf("a = %g, s = %d, (%d,%d) n = %d: %v (%v), want %v", q.a, q.s, q.l, q.m, q.n, w, err, q.want)
		}
	}
}

func TestNeighbours(t *testing.T) {
	list := Neighbours(0.7, -2, 2, 2, 1)
	seen := map[[3]int]complex128{}
	for _, e := range list {
		seen[[3]int{e.L, e.M, e.N}] = e.Omega
	}
	for label, want := range map[[3]int]complex128{
		{2, 2, 0}: kerr220, {2, 2, 1}: kerr221, {3, 2, 0}: kerr320,
		// The mirror image of (2,-2): -conj(omega).
		{2, -2, 0}: complex(-0.309808130358262, -0.0887171911289156),
	} {
		if got, ok := seen[label]; !ok || cmplx.Abs(got-want) > 1e-9 {
			t.Errorf("%v: %v, want %v", label, got, want)
		}
	}
}
