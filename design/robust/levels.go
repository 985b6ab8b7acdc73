package robust

import (
	"fmt"
	"math"
	"slices"

	"holdfast/design/dynamics"
)

// Levels is the problem of one driven system of Dim levels, of which those listed in
// Code are the code space, in the order of the target's. Matrices are row by row.
type Levels struct {
	Grid Grid
	// Within bounds what the toggled integrals err by inside a step; default 1e-11. A search may do with 1e-9.
	Within float64
	Dim    int
	Code   []int
	Static []complex128   // rad/ns
	Axes   [][]complex128 // of each control at full scale, rad/ns
	Shifts [][]complex128 // what the square of each control's share adds, rad/ns; nil for none
	Maps   []Map          // as of Spin
	// Rotating terms are given functions of the time since the window's start.
	Rotating []Rotating

	Target []complex128 // on the code space; nil for states
	// From and To are states on the code space, as many of either, orthonormal: the span of
	// From is to become that of To.
	From, To [][]complex128
	// FreeBefore and FreeAfter leave rotations about Z of every site to the playback, Local
	// every rotation of every site, before and after. The code space then has two levels a site, the first site slowest.
	FreeBefore, FreeAfter, Local bool

	Held []Class
}

// Rotating is H += cos(Frequency t) Cosine + sin(Frequency t) Sine; rad/ns, and t in ns
// from the start of the window.
type Rotating struct {
	Frequency    float64
	Cosine, Sine []complex128
}

// A LevelsGate evaluates a Levels problem, as Gate does a Spin. Its residuals are those of
// the gate (see aim), of which the sum of squares is 1 - F_pro plus the leakage to first
// order; then for every held class the averaged toggled errors A, relative to the errors V:
//
//	P A P without its trace    of a gate on the code space
//	(1 - P) A P                of a class that is to leak nothing
//	(1 - Q) A Q                of states, Q the projector on the first ones
//
// and then those of the finite errors, at the rotations of the gate without error, as
// playback has them.
type LevelsGate struct {
	drive
	spec    Levels
	span    float64
	aim     *aim
	nominal dynamics.Levels
	finite  dynamics.Levels
	read    [2]reading // of classes, and of those with Leak
	leaves  reading    // what leads out of the code space
	toggles []toggledClass
	waves   []wave
	members []placedLevels
	blocks  []blend // of gates, each some residuals
	rows    int

	views []*view // of the nominal gate, then of the members
	bend  *bend   // of the nominal gate
	coord []float64

	jac *levelsJacobian // made by the first call of Jacobian
}

// A wave is one component of a noise: V cos wt or V sin wt, t from the start of the window.
type wave struct {
	class  int
	node   int
	time   []float64 // cos wt or sin wt at the nodes of the grid
	v      []float64 // of the controls
	toggle int
	factor float64 // of what is left: its square is what of 1 - F_pro the error leaves
}

// toggledClass says which toggled error of nominal belongs to which class, and the
// factor that makes its residuals relative.
type toggledClass struct {
	class, toggle int
	factor        float64
}

// placedLevels is a finite error with the class that it comes from: λ times an
// operator, or an error that rides on the controls.
type placedLevels struct {
	member
	class    int
	operator []complex128 // of a static one
}

// NewLevelsGate prepares the residuals. The error says what the problem asks for that
// this kernel does not know.
func NewLevelsGate(s Levels, r Response, refine float64) (*LevelsGate, error) {
	d := s.Dim
	// noise along an operator rides on a control of its own that nothing drives
	quiet := map[int]int{}
	s.Axes, s.Shifts = slices.Clone(s.Axes), slices.Clone(s.Shifts)
	for i, class := range s.Held {
		if class.Noise != nil && class.Kind == Static && len(class.Operators) == 1 {
			quiet[i] = len(s.Axes)
			if s.Axes = append(s.Axes, class.Operators[0]); s.Shifts != nil {
				s.Shifts = append(s.Shifts, make([]complex128, d*d))
			}
		}
	}
	g := &LevelsGate{drive: newDrive(r, s.Held, len(s.Axes), s.Grid, s.Maps), spec: s, span: s.Grid.Window(), aim: newAim(&s), coord: make([]float64, d*d)}
	if err := g.give(); err != nil {
		return nil, err
	}
	var outside []int
	for i := range d {
		if !slices.Contains(s.Code, i) {
			outside = append(outside, i)
		}
	}
	g.leaves = readLeak(d, s.Code, outside)
	if g.read = [2]reading{readCode(d, s.Code), g.leaves}; g.aim.target == nil {
		states := readStates(d, g.aim.k, g.aim.from)
		g.read = [2]reading{states, states}
	}
	full := 0.0
	for _, a := range s.Axes[:len(s.Axes)-len(quiet)] {
		full = math.Max(full, g.size(a, false))
	}
	for i, class := range s.Held {
		if class.Kind != Static && class.Kind != Any {
			continue
		}
		if len(class.Operators) == 0 {
			return nil, fmt.Errorf("error %q: names no operator", class.Name)
		}
		rms := 0.0
		for k, op := range class.Operators {
			w := class.factor(k) * g.size(op, class.Leak)
			rms += w * w / float64(len(class.Operators))
		}
		if rms = math.Sqrt(rms); !(rms > 0) {
			return nil, fmt.Errorf("error %q: does nothing on the code space", class.Name)
		}
		for k, op := range class.Operators {
			g.toggles = append(g.toggles, toggledClass{i, len(g.nominal.Held), class.factor(k) / (g.span * rms)})
			g.nominal.Held = append(g.nominal.Held, op)
		}
	}
	if len(g.borne) > 0 && !(full > 0) {
		return nil, fmt.Errorf("error %q: no channel does anything on the code space", s.Held[g.borne[0]].Name)
	}
	for k, i := range g.borne {
		g.toggles = append(g.toggles, toggledClass{i, len(g.nominal.Held) + k, 1 / (g.span * full)})
		g.nominal.Borne = append(g.nominal.Borne, g.v[i])
	}
	if err := g.fluctuate(quiet); err != nil {
		return nil, err
	}
	g.blocks = []blend{{[]int{0}, []float64{1}}}
	for i := range s.Held {
		_, factors := s.Held[i].spread()
		for k, p := range s.Held[i].placed(i) {
			g.members = append(g.members, p)
			g.blocks = append(g.blocks, blend{[]int{len(g.members)}, factors[k : k+1]})
		}
		if s.Held[i].Order != 2 {
			continue
		}
		ways, sizes := g.ways(i, full)
		for k, way := range ways {
			b := secondDifference(len(g.members)+1, s.Held[i].Weight*sizes[k])
			for _, f := range secondPoints {
				g.members = append(g.members, way(f))
			}
			g.blocks = append(g.blocks, b)
		}
	}
	if refine > 0 {
		for i := range s.Held {
			for _, m := range s.Held[i].members(i) {
				g.members = append(g.members, m)
				g.blocks = append(g.blocks, blend{[]int{len(g.members)}, []float64{refine}})
			}
		}
	}
	if err := g.nominal.Reset(); err != nil {
		return nil, err
	}
	if err := g.finite.Reset(); err != nil {
		return nil, err
	}
	g.rows = g.aim.rows() * len(g.blocks)
	for _, t := range g.toggles {
		g.rows += g.reading(t.class).rows
	}
	for range g.waves {
		g.rows += g.read[0].rows
	}
	g.views = make([]*view, 1+len(g.members))
	return g, nil
}

// fluctuate makes the waves of all noises; quiet are the controls of those along an operator.
func (g *LevelsGate) fluctuate(quiet map[int]int) error {
	for i, class := range g.held {
		if class.Noise == nil {
			continue
		}
		control, along := quiet[i]
		if !along && class.Kind != Amplitude && class.Kind != Mixed {
			return fmt.Errorf("error %q: its noise has no filter function here", class.Name)
		}
		if len(g.spec.Grid.Times) < g.last { // behind the window no error acts
			return fmt.Errorf("robust: %d instants of %d nodes", len(g.spec.Grid.Times), g.last)
		}
		for n, node := range class.Noise {
			for _, f := range []func(float64) float64{math.Cos, math.Sin} {
				w := wave{
					class: i, node: n, v: make([]float64, g.total*g.nodes), toggle: len(g.nominal.Held) + len(g.nominal.Borne),
					factor: math.Sqrt(node.Weight / float64(g.aim.k)),
				}
				w.time = make([]float64, g.nodes)
				for k, t := range g.spec.Grid.Times[:g.last] {
					w.time[k] = f(node.Frequency * t)
				}
				if along {
					copy(w.v[control*g.nodes:], w.time)
				}
				g.nominal.Borne = append(g.nominal.Borne, w.v)
				g.waves = append(g.waves, w)
			}
		}
	}
	return nil
}

// rides tells whether a wave goes with the controls, and not along an operator.
func (g *LevelsGate) rides(w *wave) bool { return g.held[w.class].Kind != Static }

// swing fills the waves that ride on the controls.
func (g *LevelsGate) swing() {
	for i := range g.waves {
		w := &g.waves[i]
		if !g.rides(w) {
			continue
		}
		for k := range g.count {
			for n, f := range w.time {
				w.v[k*g.nodes+n] = f * g.v[w.class][k*g.nodes+n]
			}
		}
	}
}

// give makes the kernels, with the rotating terms as controls that are known, and the
// free evolution before and after the window.
func (g *LevelsGate) give() error {
	s := &g.spec
	d := s.Dim
	axes := append([][]complex128(nil), s.Axes...)
	var given []float64
	if len(s.Rotating) > 0 && len(s.Grid.Times) != g.nodes {
		return fmt.Errorf("robust: %d instants of %d nodes", len(s.Grid.Times), g.nodes)
	}
	for _, r := range s.Rotating {
		axes = append(axes, r.Cosine, r.Sine)
		for _, f := range []func(float64) float64{math.Cos, math.Sin} {
			for _, t := range s.Grid.Times {
				given = append(given, f(r.Frequency*t))
			}
		}
	}
	g.total = len(axes)
	g.u, g.moved = append(g.u, given...), append(g.moved, given...)
	for _, i := range g.borne {
		if g.held[i].Kind == Amplitude { // it is no longer the controls themselves: known terms have no error
			g.v[i] = make([]float64, g.total*g.nodes)
		} else {
			g.v[i] = append(g.v[i], make([]float64, len(given))...)
		}
	}
	shifts := s.Shifts
	if shifts != nil {
		shifts = append([][]complex128(nil), shifts...)
		for len(shifts) < len(axes) {
			shifts = append(shifts, make([]complex128, d*d))
		}
	}
	within := s.Within
	if within == 0 {
		within = 1e-11
	}
	base := dynamics.Levels{
		Dim: d, Static: s.Static, Axes: axes, Shifts: shifts, Known: len(axes) - len(s.Axes),
		Steps: s.Grid.Steps, First: s.Grid.First, Last: s.Grid.Last, Within: within,
	}
	g.nominal, g.finite = base, base
	free := func(from, to int) ([]complex128, error) {
		if from == to {
			return diagonal(d), nil
		}
		l := base
		l.Steps, l.First, l.Last = s.Grid.Steps[from:to], 0, 0
		l.Axes, l.Shifts, l.Known = axes[len(s.Axes):], nil, len(axes)-len(s.Axes)
		var u []float64
		for k := range l.Axes {
			u = append(u, given[k*g.nodes+2*from:k*g.nodes+2*to]...)
		}
		if err := l.Reset(); err != nil {
			return nil, err
		}
		l.Run(u, nil)
		return adjoint(l.Gate, d, d), nil
	}
	var err error
	if g.aim.before, err = free(0, s.Grid.First); err != nil {
		return err
	}
	g.aim.after, err = free(s.Grid.Last, len(s.Grid.Steps))
	return err
}

// factor is how large operator k of the class is beside the others.
func (c *Class) factor(k int) float64 {
	if c.Factors == nil {
		return 1
	}
	return c.Factors[k]
}

// members lists the finite errors of a class: both signs of its size of each operator.
func (c *Class) members(class int) (list []placedLevels) {
	if c.Kind != Static && c.Kind != Any {
		for _, m := range c.ensemble() {
			list = append(list, placedLevels{member: m, class: class})
		}
		return list
	}
	if c.Size == 0 || c.Values != nil || c.Noise != nil {
		return nil
	}
	for k, op := range c.Operators {
		x := c.Size * c.factor(k)
		list = append(list, placedLevels{member{scale: 1, lambda: x}, class, op})
		if !c.OneSided || c.Kind == Static {
			list = append(list, placedLevels{member{scale: 1, lambda: -x}, class, op})
		}
	}
	return list
}

// placed lists the errors of a class's Values.
func (c *Class) placed(class int) (list []placedLevels) {
	for _, x := range c.Values {
		p := placedLevels{member: c.at(x), class: class}
		if c.Kind == Static {
			p.member, p.operator = member{scale: 1, lambda: x}, c.Operators[0]
		}
		list = append(list, p)
	}
	return list
}

// ways is Class.ways for more levels; sizes are what the second order of each counts, by the factors of its operators.
func (g *LevelsGate) ways(class int, full float64) (list []func(f float64) placedLevels, sizes []float64) {
	c := &g.held[class]
	switch c.Kind {
	case Static, Any:
		d := float64(g.spec.Dim)
		// V of norm √(d/4) turns by its size times the span, as Z/2 does
		static := func(op []complex128, size float64) {
			sizes = append(sizes, size)
			x := secondAngle / (g.span * 2 * math.Sqrt(squared(op, g.spec.Dim)/d))
			list = append(list, func(f float64) placedLevels { return placedLevels{member{scale: 1, lambda: f * x}, class, op} })
		}
		for k, op := range c.Operators {
			static(op, c.factor(k)*c.factor(k))
			for j := range k {
				pair := make([]complex128, len(op))
				for i := range pair {
					pair[i] = complex(c.factor(k), 0)*op[i] + complex(c.factor(j), 0)*c.Operators[j][i]
				}
				static(pair, c.factor(k)*c.factor(j))
			}
		}
	default:
		spin := Class{Kind: c.Kind}
		for _, way := range spin.ways(g.span, full) {
			list, sizes = append(list, func(f float64) placedLevels { return placedLevels{member: way(f), class: class} }), append(sizes, 1)
		}
	}
	return list, sizes
}

func (g *LevelsGate) reading(class int) *reading {
	if g.held[class].Leak {
		return &g.read[1]
	}
	return &g.read[0]
}

// size returns the norm to which what is left of an error is compared.
func (g *LevelsGate) size(v []complex128, leak bool) float64 {
	d := g.spec.Dim
	if g.aim.target == nil {
		trace := real(traceOf(v, d))
		sum := 0.0
		for _, x := range v {
			sum += real(x)*real(x) + imag(x)*imag(x)
		}
		return math.Sqrt(math.Max(0, sum-trace*trace/float64(d)) * float64(g.aim.k) / float64(d))
	}
	r := &g.read[0]
	if leak {
		r = &g.read[1]
	}
	return math.Sqrt(sumSquares(r.of(v, d, g.coord)))
}

// Rows returns the number of residuals, Dim the number of coefficients.
func (g *LevelsGate) Rows() int { return g.rows }

// Dim returns the number of coefficients.
func (g *LevelsGate) Dim() int { return g.response.Dim }

// Residuals stores the residuals at c in r, as solve.Problem asks.
func (g *LevelsGate) Residuals(c, r []float64) {
	g.levelsControls(c)
	g.evaluate(r)
}

// levelsControls is controls, where the errors of amplitudes leave given terms alone.
func (g *LevelsGate) levelsControls(c []float64) {
	g.controls(c)
	g.copyAmplitudes()
}

func (g *LevelsGate) copyAmplitudes() {
	for _, i := range g.borne {
		if g.held[i].Kind == Amplitude && g.mapped == nil {
			copy(g.v[i], g.u[:g.count*g.nodes])
		}
	}
	g.swing()
}

// evaluate finds all residuals of the controls in u.
func (g *LevelsGate) evaluate(r []float64) {
	g.nominal.Run(g.u, nil)
	g.views[0] = g.aim.see(g.nominal.Gate, true)
	if g.bend = nil; g.aim.free() {
		g.bend = g.views[0].bend()
	}
	for i := range g.members {
		g.runMember(i)
		g.views[1+i] = g.aim.see(g.finite.Gate, false)
	}
	n := g.aim.rows()
	clear(r)
	one := make([]float64, n)
	at := 0
	for b, x := range g.blocks {
		for k, gate := range x.gates {
			g.views[gate].residual(one)
			for i, v := range one {
				r[at+i] += x.factors[k] * v
			}
		}
		if at += n; b > 0 {
			continue
		}
		for _, t := range g.toggles { // behind the nominal gate
			f := t.factor * g.held[t.class].heldWeight()
			for i, v := range g.reading(t.class).of(g.nominal.Toggle[t.toggle], g.spec.Dim, g.coord) {
				r[at+i] = f * v
			}
			at += g.reading(t.class).rows
		}
		for _, w := range g.waves {
			f := w.factor * g.held[w.class].Weight
			for i, v := range g.read[0].of(g.nominal.Toggle[w.toggle], g.spec.Dim, g.coord) {
				r[at+i] = f * v
			}
			at += g.read[0].rows
		}
	}
}

// runMember propagates with a finite error and returns the controls.
func (g *LevelsGate) runMember(i int) []float64 {
	e := &g.members[i]
	u := g.u
	var offset []complex128
	if e.operator != nil {
		offset = make([]complex128, len(e.operator))
		for k, v := range e.operator {
			offset[k] = complex(e.lambda, 0) * v
		}
	} else {
		g.err(e.member, g.added(e.class))
		u = g.moved
	}
	g.finite.Run(u, offset)
	return u
}
