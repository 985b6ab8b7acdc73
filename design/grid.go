package design

import (
	"math"
	"math/cmplx"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/filter"
)

// An axis is the time grid of one span on one line: the steps of the
// propagation, and the instants (ns after arrival) at which the field is wanted.
type axis struct {
	robust.Grid
	times []float64 // of the Gauss nodes of all steps but the last cell
	cell  bool      // the last step stands for everything after the last time
	end   float64   // ns after arrival, of the last true step
}

const (
	// stepShare is the length of a step in units of 1/|p|, p the fastest pole that
	// still lives. With it, two steps a sample on the demo line err by 5e-10 in
	// infidelity; a pulse is finished with half of it. What its record claims is
	// computed with an eighth: a gate that is 4e-7 off is 2e-9 off in an infidelity
	// of 1e-5, which window ends easily have.
	stepShare  = 0.85
	fineShare  = stepShare / 2
	claimShare = stepShare / 8
	// turnShare bounds the angle, in rad, that full scale turns in one step.
	turnShare = 0.3
	dead      = 1e-9 // a pole has died when its decay is below this
	mostSteps = 200_000
)

// newAxis builds the grid for n samples of period h. settled goes on after the
// window until the angle still to come is negligible. full is the largest field
// (rad/ns), static that of the undriven device, quiet the largest field expected
// after the span, in rad/ns.
func newAxis(l filter.Line, n int, h, share float64, settled bool, full, static, quiet float64) axis {
	var a axis
	pattern := graded(l, h, share, full+static, h)
	if len(l.Terms) == 0 {
		pattern = []float64{h}
	}
	for k := range n {
		a.extend(float64(k)*h, pattern)
	}
	a.Last = len(a.Steps)
	a.end = float64(n) * h
	if !settled || len(l.Terms) == 0 {
		return a
	}
	// After the span: until every pole but the slowest has died when nothing
	// else turns the device (its field then keeps its axis, and one cell carries
	// it to infinity); else until all have died.
	until := 0.0
	slow := l.SlowestTime()
	for _, t := range l.Terms {
		tau := -1 / real(t.Pole)
		if static != 0 || tau < slow*(1-1e-9) || imag(t.Pole) != 0 || t.Power > 1 {
			until = math.Max(until, tau*math.Log(1/dead))
		}
	}
	tail := graded(l, until, share, quiet+static, h)
	a.extend(a.end, tail)
	a.end += until
	a.Trail = until
	if static == 0 {
		a.cell = true
		a.Steps = append(a.Steps, 1)
	}
	return a
}

func (a *axis) extend(at float64, steps []float64) {
	for _, s := range steps {
		for _, g := range dynamics.GaussNodes {
			a.times = append(a.times, at+g*s)
		}
		a.Steps = append(a.Steps, s)
		at += s
	}
}

// graded cuts length ns after an edge of the input into steps that grow as the
// line's poles die.
func graded(l filter.Line, length, share, full, h float64) []float64 {
	var steps []float64
	for s := 0.0; s < length && len(steps) < mostSteps; {
		fastest := 0.0
		for _, t := range l.Terms {
			if math.Exp(real(t.Pole)*s) > dead {
				fastest = math.Max(fastest, cmplx.Abs(t.Pole))
			}
		}
		step := length - s
		if fastest > 0 {
			step = math.Min(step, share/fastest)
		}
		if full > 0 {
			step = math.Min(step, share/stepShare*turnShare/full)
		}
		if left := length - s; step >= left*(1-1e-9) {
			step = left
		} else if left < 2*step {
			step = left / 2
		}
		steps = append(steps, step)
		s += step
		if length-s < 1e-9*length {
			break
		}
	}
	return steps
}

// response gives the field at the nodes of the axis for each column of samples.
func (a *axis) response(l filter.Line, columns [][]complex128, h float64) robust.Response {
	n := len(columns)
	nodes := 2 * len(a.Steps)
	r := robust.Response{N: n, Re: make([]float64, nodes*n)}
	if !l.Real() {
		r.Im = make([]float64, nodes*n)
	}
	var u []complex128
	for j, x := range columns {
		u = a.field(l, x, h, u)
		for i, v := range u {
			r.Re[i*n+j] = real(v)
			if r.Im != nil {
				r.Im[i*n+j] = imag(v)
			}
		}
	}
	return r
}

// field returns what arrives at the nodes for samples x, in dst when it has the
// room; the last cell's two nodes carry the integral of all that is left.
func (a *axis) field(l filter.Line, x []complex128, h float64, dst []complex128) []complex128 {
	dst = l.Held(x, h, a.times, dst[:0])
	if a.cell {
		v := l.Remaining(x, h, a.end)
		dst = append(dst, v, v)
	}
	return dst
}
