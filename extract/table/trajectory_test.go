package table

import (
	"strings"
	"testing"
)

func text(t *testing.T, s string) *Table {
	t.Helper()
	tab, err := New("orbit.csv", strings.NewReader(s), int64(len(s)))
	if err != nil {
		t.Fatal(err)
	}
	return tab
}

func TestTrajectory(t *testing.T) {
	tr, err := ReadTrajectory(text(t, "t,r,phi,E,extra\n0,10,0,0.95,1\n1,9.9,0.03,0.95,1\n2,9.8,0.06,0.949,1\n"), TrajectoryNames{})
	if err != nil {
		t.Fatal(err)
	}
	if tr.R[2] != 9.8 || tr.Phi[1] != 0.03 || tr.Energy[2] != 0.949 || tr.Theta != nil || tr.AngularMomentum != nil || len(tr.Ignored) != 1 {
		t.Errorf("%+v", tr)
	}
	tr, err = ReadTrajectory(text(t, "time rad az l\n0 10 0 3\n1 9 1 3\n"), TrajectoryNames{T: "time", R: "rad", Phi: "az", L: "l"})
	if err != nil || tr.R[1] != 9 || tr.AngularMomentum[0] != 3 {
		t.Errorf("%+v, %v", tr, err)
	}
	for s, want := range map[string]string{
		"t,r\n0,10\n1,9\n":                    `column "phi": is not there; map it with orbit.columns: {phi: NAME}; the file holds: t, r`,
		"t,r,phi\n0,10,0\n0,9,1\n":            `line 3: column "t": does not increase`,
		"t [s],r,phi\n0,10,0\n1,9,1\n":        `column "t": is in the unit "s"`,
		"# s,1,rad\nt,r,phi\n0,10,0\n1,9,1\n": `column "t": is in the unit "s"`,
		"t,r,phi\n0,10,0\n":                   `too few`,
	} {
		if _, err := ReadTrajectory(text(t, s), TrajectoryNames{}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %q", s, err, want)
		}
	}
	if _, err := ReadTrajectory(text(t, "t,r,phi\n0,10,0\n1,9,1\n"), TrajectoryNames{E: "energy"}); err == nil || !strings.Contains(err.Error(), `"energy": is not there`) {
		t.Errorf("a named column that is missing: %v", err)
	}
	// Arrays of an archive may differ in length.
	tab := open(t, "nan.npz")
	if _, err := ReadTrajectory(tab, TrajectoryNames{R: "back", Phi: "back"}); err == nil || !strings.Contains(err.Error(), `"back": has 3 rows where the time has 5`) {
		t.Errorf("lengths: %v", err)
	}
}
