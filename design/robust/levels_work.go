package robust

import (
	"math"
)

// quasiShare is how many times dearer residuals with their Jacobian may be than with a
// gradient alone before the latter is used: a quasi-Newton iteration needs that many times as
// many steps.
const quasiShare = 12

// Many tells whether the residuals are so many that the Jacobian costs more than it
// saves (see Work), or more memory than there may be.
func (g *LevelsGate) Many() bool {
	jacobian, gradient := g.Work()
	return jacobian > quasiShare*gradient || !g.Fits()
}

// mostJacobian bounds the memory of one Jacobian, bytes.
const mostJacobian = 512 << 20

// Fits tells whether Jacobian may be asked for: its working memory stays in bounds.
func (g *LevelsGate) Fits() bool { return g.Bytes() <= mostJacobian }

// Bytes is the working memory of Jacobian, roughly.
func (g *LevelsGate) Bytes() float64 {
	dd := float64(g.spec.Dim * g.spec.Dim)
	rows, direct := dd*float64(1+len(g.members)), 0.0
	for _, t := range g.toggles {
		n := float64(len(g.reading(t.class).needed))
		if rows += n; t.toggle >= len(g.nominal.Held) {
			direct += n
		}
	}
	n := float64(len(g.waves) * len(g.read[0].needed))
	rows, direct = rows+n, direct+n
	dim := float64(g.response.Dim)
	return 8 * ((rows+direct)*float64(g.total*g.nodes) + rows*dim + float64(g.aim.rows())*dd + float64(g.rows)*dim)
}

// Work counts the multiplications of real numbers, roughly, that an evaluation of the residuals takes
// with their Jacobian and its square, and with one gradient alone.
func (g *LevelsGate) Work() (jacobian, gradient float64) {
	const q = 3 // points of a step
	d, n := float64(g.spec.Dim), float64(g.response.Dim)
	steps := float64(len(g.spec.Grid.Steps))
	product := 4 * d * d * d * steps
	controls, nodes := float64(g.count), float64(g.nodes)
	toggles, members := float64(len(g.toggles)+len(g.waves)), float64(len(g.members))
	run := 4.0
	if toggles > 0 {
		run = 7 + q + 1.5*q*toggles
	}
	jacobian = product * (2*run + 2*controls*(1.5*q+1+(q+1)*toggles))
	jacobian += members * product * (8 + 2*controls*(1.5*q+1))
	rows := 0.0 // raw ones
	for _, t := range g.toggles {
		rows += float64(len(g.reading(t.class).needed))
	}
	rows += float64(len(g.waves) * len(g.read[0].needed))
	rows += d * d * (1 + members)
	jacobian += rows * controls * nodes * n / math.Max(1, controls/2) // each control sees the coefficients of its channel
	jacobian += float64(g.rows) * n * (n/2 + 1)

	pull := 2*q + 4 + q*toggles
	if g.gram() { // toggled through the frames, all at once
		entries := float64(g.occupied()) / d
		run, pull = 7+q*(1+entries), 2*q*(2+entries)
	}
	gradient = product*(2*run+pull) + members*product*(4+2*q+8)
	gradient += (1 + members) * controls * nodes * n / math.Max(1, controls/2)
	gradient += n * n * n / 6
	return jacobian, gradient
}

// occupied counts the entries, above the diagonal or on it, of the static errors that are followed.
func (g *LevelsGate) occupied() int {
	d := g.spec.Dim
	n := 0
	for i := range d {
		for j := i; j < d; j++ {
			for _, op := range g.nominal.Held {
				if op[i*d+j] != 0 {
					n++
					break
				}
			}
		}
	}
	return n
}

// gram tells whether dynamics follows the static errors through the frames.
func (g *LevelsGate) gram() bool { return g.nominal.ByFrames() }
