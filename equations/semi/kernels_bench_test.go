package semi

import (
	"fmt"
	"testing"

	"nullmark/grid/march"
)

// Benchmarks of the kernels by form: 0 plain, 1 AVX2, 2 AVX-512. "ns/point" is
// per real field and grid point. The steppers' own loops run in their fastest
// form here; GODEBUG=cpu.avx512f=off,cpu.avx2=off takes it from them as well.

func perPoint(b *testing.B, points int) {
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(points*lanes), "ns/point")
}

func BenchmarkRows(b *testing.B) {
	m := block(b, 401, 12)
	u := wave(m)
	n := len(u) / 2
	out := make([]float64, n)
	for k := range m.geo.ranges {
		r := &m.geo.ranges[k]
		for _, f := range forms() {
			b.Run(fmt.Sprintf("%s/rows%d-%d/form%d", []string{"flat", "layer", "end"}[r.form], r.lo, r.hi, f), func(b *testing.B) {
				force(b, f)
				for b.Loop() {
					m.apply(r, out, u[:n], u[n:], r.lo, r.hi)
				}
				perPoint(b, r.hi-r.lo)
			})
		}
	}
}

func BenchmarkWholeApply(b *testing.B) {
	for _, order := range []int{8, 12} {
		m := block(b, 201, order)
		u := wave(m)
		out := make([]float64, len(u))
		for _, f := range forms() {
			b.Run(fmt.Sprintf("order%d/form%d", order, f), func(b *testing.B) {
				force(b, f)
				for b.Loop() {
					m.Apply(out, u)
				}
				perPoint(b, 201)
			})
		}
	}
}

// linear hides that a system is of second order in time.
type linear struct{ march.Linear }

// BenchmarkRun is a block of four complex modes on 201 points for 1000 steps;
// ns/point is per step and stage.
func BenchmarkRun(b *testing.B) {
	const points, steps, order = 201, 1000, 12
	m := block(b, points, 12)
	steppers := []struct {
		name   string
		stages int
		s      march.Stepper
	}{
		{"taylor", order, march.NewTaylor(m, order, m.Length())},
		{"taylor-copying", order, march.NewTaylor(linear{m}, order, m.Length())},
		{"rungekutta8", 11, march.NewRungeKutta(m, march.RK8(), m.Length())},
	}
	for _, st := range steppers {
		for _, f := range forms() {
			b.Run(fmt.Sprintf("%s/form%d", st.name, f), func(b *testing.B) {
				force(b, f)
				u := wave(m)
				for b.Loop() {
					for k := range steps {
						st.s.Step(u, float64(k)*.3, .3)
					}
				}
				perPoint(b, points*steps*st.stages)
			})
		}
	}
}
