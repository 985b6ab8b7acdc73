package design

import (
	"math"
	"testing"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/hardware"
)

func BenchmarkZZ(b *testing.B) {
	p, err := hardware.Load("../testdata/skerry/rack-b.toml")
	if err != nil {
		b.Fatal(err)
	}
	full := p.Channels[0].FullScale
	any := robust.Class{Name: "any", Kind: robust.Any, Weight: 1, Size: 2 * math.Pi * 1e-3}
	target := dynamics.Vec{math.Pi / 2, 0, 0}
	s := robust.Spin{Axes: [2]dynamics.Vec{{full, 0, 0}, {0, full, 0}}, Target: dynamics.Turn(target), Held: []robust.Class{any}}
	q, err := newProblem(p, 0, 112, "slepian", 0, s, target, true)
	if err != nil {
		b.Fatal(err)
	}
	g := q.finite(1)
	st := q.start(6)
	r, jac := make([]float64, g.Rows()), make([]float64, g.Rows()*g.Dim())
	b.Run("res", func(b *testing.B) {
		for b.Loop() {
			g.Residuals(st.c, r)
		}
	})
	b.Run("jac", func(b *testing.B) {
		for b.Loop() {
			g.Jacobian(jac)
		}
	})
	b.Run("der", func(b *testing.B) {
		gb, hb := make([]float64, g.Dim()), make([]float64, g.Dim()*g.Dim())
		for b.Loop() {
			q.set.Bench(st.c, gb, hb)
		}
	})
}
