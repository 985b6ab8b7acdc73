package design

import (
	"math"
	"testing"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/hardware"
	"holdfast/shape"
)

// BenchmarkAny96 times one residual vector with its Jacobian for the X90 held
// against any static error in 96 samples of rack B, settled ends: what the search
// does some hundred times a start.
func BenchmarkAny96(b *testing.B) {
	p, err := hardware.Load("../testdata/skerry/rack-b.toml")
	if err != nil {
		b.Fatal(err)
	}
	full := p.Channels[0].FullScale
	target := dynamics.Vec{math.Pi / 2, 0, 0}
	s := robust.Spin{
		Axes:   []dynamics.Vec{{full, 0, 0}, {0, full, 0}},
		Target: dynamics.Turn(target),
		Held:   []robust.Class{{Name: "any", Kind: robust.Any, Weight: 1}},
	}
	q, err := newProblem(p, wish{channels: []int{0}, samples: 96, family: shape.FamilySlepian, spin: s, target: target, settled: true})
	if err != nil {
		b.Fatal(err)
	}
	c := q.start(0).c
	for _, grid := range []string{"coarse", "fine"} {
		b.Run(grid, func(b *testing.B) {
			g := q.gate(grid == "fine")
			r, jac := make([]float64, g.Rows()), make([]float64, g.Rows()*g.Dim())
			for b.Loop() {
				g.Residuals(c, r)
				g.Jacobian(jac)
			}
		})
	}
}
