package design

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/filter"
)

// A feed is a line with the instant at which its first sample arrives, in ns
// from the start of the gate's window; it is never later than the window.
type feed struct {
	line   filter.Line
	at     float64
	curved bool // what it drives is no multiple of what arrives
}

// An axis is the time grid of one span: the steps of the propagation, and the
// instants (ns from the start of the window) at which the fields are wanted.
type axis struct {
	robust.Grid         // its Times are of all steps but the last cell
	cell        bool    // the last step stands for everything after the last time
	end         float64 // of the last true step
	h           float64 // sample period
}

const (
	// stepShare is the length of a step in units of 1/|p|, p the fastest pole that
	// still lives. With it, two steps a sample on the demo line err by 5e-10 in
	// infidelity and 8e-6 in susceptibility: good enough to search. The finish uses
	// half of it, and what the record claims an eighth, so that the claims are off
	// by far less than replay is asked to agree with them (1e-9, 1e-5).
	stepShare  = 0.85
	fineShare  = stepShare / 2
	claimShare = stepShare / 8
	// turnShare bounds the angle, in rad, that full scale turns in one step.
	turnShare = 0.3
	// A ladder's energies turn its levels faster than any drive, but a step is exact
	// for a constant Hamiltonian: what counts is how the drive changes meanwhile, much
	// in the window, little in the ring-out. These are the weights of the energies
	// beside the field: 0.7 and 2.8 rad a step.
	inWindow, afterIt = turnShare / 0.7, turnShare / 2.8

	dead      = 1e-9    // a pole has died when its decay is below this
	mostSteps = 100_000 // of one grid: some seconds of propagation, 50 MB
)

// newAxis builds the grid for n samples of period h on every feed. settled goes
// on until the angle still to come is negligible, and begins where the first feed
// does. full is the largest field (rad/ns), static that of the undriven device,
// spread the largest difference of a ladder's energies, zero for a spin.
// It is an error when that would take more than mostSteps.
func newAxis(feeds []feed, n int, h, share float64, settled bool, full, static, spread float64) (axis, error) {
	a := axis{h: h}
	tooMany := fmt.Errorf("span: %d samples, and what the lines still bring after them, take more than %d steps of propagation; allowed: a shorter span, ends = \"window\", or a line and a detuning that turn the device less while they settle", n, mostSteps)
	span := float64(n) * h
	var poles []filter.Term
	slow := 0.0
	edges := []float64{0, span}
	for _, f := range feeds {
		poles = append(poles, f.line.Terms...)
		slow = math.Max(slow, f.line.SlowestTime())
		if n > mostSteps {
			return a, tooMany
		}
		for k := range n + 1 {
			edges = append(edges, f.at+float64(k)*h)
		}
	}
	slices.Sort(edges)
	last := math.Inf(-1)
	for _, t := range edges {
		begin := last
		if t-begin <= 1e-9*h { // the same edge, up to rounding
			continue
		}
		if last = t; math.IsInf(begin, -1) || t > span*(1+1e-12) {
			continue
		}
		if t <= 1e-9*h { // before the window
			if !settled {
				continue
			}
			a.Lead += t - begin
		}
		if len(poles) == 0 { // the field is constant between edges, and a step is exact
			a.extend(begin, []float64{t - begin})
		} else {
			steps, ok := graded(poles, t-begin, share, func(float64) float64 { return full + static + spread*inWindow })
			if !ok || len(a.Steps)+len(steps) > mostSteps {
				return a, tooMany
			}
			a.extend(begin, steps)
		}
		if t <= 1e-9*h {
			a.First = len(a.Steps)
		}
	}
	a.Last = len(a.Steps)
	a.end = span
	if !settled || len(poles) == 0 {
		return a, nil
	}
	// After the span: until every pole but the slowest has died when nothing
	// else turns the device and there is but one feed (its field then keeps its
	// axis, and one cell carries it to infinity, unless the rate is curved); else until all have died.
	alone := static == 0 && spread == 0 && len(feeds) == 1 && !feeds[0].curved
	until := 0.0
	for _, t := range poles {
		tau := -1 / real(t.Pole)
		if !alone || tau < slow*(1-1e-9) || imag(t.Pole) != 0 || t.Power > 1 {
			until = math.Max(until, tau*math.Log(1/dead))
		}
	}
	steps, ok := graded(poles, until, share, func(s float64) float64 { return static + full*left(poles, s) + spread*afterIt })
	if !ok || len(a.Steps)+len(steps) > mostSteps {
		return a, tooMany
	}
	a.extend(a.end, steps)
	a.end += until
	a.Trail = until
	if alone {
		a.cell = true
		a.Steps = append(a.Steps, 1)
	}
	return a, nil
}

func (a *axis) extend(at float64, steps []float64) {
	for _, s := range steps {
		for _, g := range dynamics.GaussNodes {
			a.Times = append(a.Times, at+g*s)
		}
		a.Steps = append(a.Steps, s)
		at += s
	}
}

// graded cuts length ns after an edge of the input into steps that grow as the
// poles die; false when there would be more than mostSteps. field bounds the
// field, rad/ns, from the given time on.
func graded(poles []filter.Term, length, share float64, field func(s float64) float64) (steps []float64, ok bool) {
	for s := 0.0; s < length; {
		if len(steps) > mostSteps {
			return nil, false
		}
		fastest := 0.0
		for _, t := range poles {
			if math.Exp(real(t.Pole)*s) > dead {
				fastest = math.Max(fastest, cmplx.Abs(t.Pole))
			}
		}
		step := length - s
		if fastest > 0 {
			step = math.Min(step, share/fastest)
		}
		if f := field(s); f > 0 {
			step = math.Min(step, share/stepShare*turnShare/f)
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
	return steps, true
}

// left bounds what arrives s ns after the last sample, as a share of the largest
// sample: a pole that samples have driven for ever holds |residue/pole^m|, and
// decays, a repeated one with the polynomial of its power.
func left(poles []filter.Term, s float64) float64 {
	sum := 0.0
	for _, t := range poles {
		rate := -real(t.Pole)
		series, term := 0.0, 1.0
		for k := range t.Power {
			series += term
			term *= rate * s / float64(k+1)
		}
		sum += cmplx.Abs(t.Residue) / math.Pow(rate, float64(t.Power)) * series * math.Exp(-rate*s)
	}
	return math.Min(1, sum)
}

// nodes is how many instants the grid has, two a step.
func (a *axis) nodes() int { return 2 * len(a.Steps) }

// field returns what arrives at the nodes for samples x, in dst when it has the
// room; the last cell's two nodes carry the integral of all that is left.
func (a *axis) field(f feed, x []complex128, dst []complex128) []complex128 {
	times := a.Times
	if f.at != 0 {
		times = make([]float64, len(a.Times))
		for i, t := range a.Times {
			times[i] = t - f.at
		}
	}
	dst = f.line.Held(x, a.h, times, dst[:0])
	if a.cell {
		v := f.line.Remaining(x, a.h, a.end-f.at)
		dst = append(dst, v, v)
	}
	return dst
}

// blocks give the response of one lane at the nodes, of each of its ways to the device.
func (a *axis) blocks(l *lane, f feed) []robust.Block {
	n, nodes := len(l.columns), a.nodes()
	list := []robust.Block{{First: l.first, N: n, Control: l.control, Quadrature: l.quadratures == 2, Re: make([]float64, nodes*n)}}
	if list[0].Quadrature && !f.line.Real() {
		list[0].Im = make([]float64, nodes*n)
	}
	for _, p := range l.paths {
		list = append(list, robust.Block{First: l.first, N: n, Control: p.control, Quadrature: true, Re: make([]float64, nodes*n), Im: make([]float64, nodes*n)})
	}
	var u []complex128
	for j, x := range l.columns {
		u = a.field(f, x, u)
		for k := range list {
			b := &list[k]
			for i, v := range u {
				if k > 0 {
					v *= a.phase(l.paths[k-1], i)
				}
				b.Re[j*nodes+i] = real(v)
				if b.Im != nil {
					b.Im[j*nodes+i] = imag(v)
				}
			}
		}
	}
	return list
}

// phase is what a path turns a channel by at a node. A grid with paths has no last cell.
func (a *axis) phase(p path, node int) complex128 { return cmplx.Rect(1, -p.frequency*a.Times[node]) }

// put stores the field of one lane in the controls u.
func (a *axis) put(l *lane, f feed, x []complex128, u []float64) {
	n := a.nodes()
	for i, v := range a.field(f, x, nil) {
		u[l.control*n+i] = real(v)
		if l.quadratures == 2 {
			u[(l.control+1)*n+i] = imag(v)
		}
		for _, p := range l.paths {
			w := v * a.phase(p, i)
			u[p.control*n+i], u[(p.control+1)*n+i] = real(w), imag(w)
		}
	}
}
