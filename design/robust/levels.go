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

// A reading takes the coordinates of a toggled integral to residuals.
type reading struct {
	rows   int
	parts  []readingPart
	needed []int // coordinates, ascending
}

type readingPart struct {
	row, coordinate int
	factor          float64
}

func (r *reading) add(row, coordinate int, factor float64) {
	if factor == 0 {
		return
	}
	r.parts = append(r.parts, readingPart{row, coordinate, factor})
	r.rows = max(r.rows, row+1)
}

// readCode reads the code space's block without its trace.
func readCode(d int, code []int) (r reading) {
	row := 0
	for k := 1; k < len(code); k++ { // an orthonormal basis of traceless diagonals
		n := math.Sqrt(float64(k * (k + 1)))
		for i := range k {
			r.add(row, dynamics.Coordinate(code[i], code[i], d), 1/n)
		}
		r.add(row, dynamics.Coordinate(code[k], code[k], d), -float64(k)/n)
		row++
	}
	for i := range code {
		for _, q := range code[i+1:] {
			at := dynamics.Coordinate(min(code[i], q), max(code[i], q), d)
			r.add(row, at, 1)
			r.add(row+1, at+1, 1)
			row += 2
		}
	}
	return r.done(d)
}

// readLeak reads what couples the code space to the rest: (1 - P) A P, whose entries are
// those of A, of half the squares of the coordinates.
func readLeak(d int, code, outside []int) (r reading) {
	row := 0
	for _, o := range outside {
		for _, i := range code {
			at := dynamics.Coordinate(min(i, o), max(i, o), d)
			r.add(row, at, math.Sqrt2/2)
			r.add(row+1, at+1, math.Sqrt2/2)
			row += 2
		}
	}
	return r.done(d)
}

// readStates reads (1 - Q) A F, F the d x k columns of the first states.
func readStates(d, k int, from []complex128) (r reading) {
	row := 0
	left := diagonal(d)
	for i, x := range product(from, adjoint(from, d, k), d, k, d) {
		left[i] -= x
	}
	for p := range d {
		for j := range k {
			for a := range d {
				for b := a; b < d; b++ {
					// entry (a, b) of A is (x + i y)/√2, entry (b, a) its conjugate
					f, g := left[p*d+a]*from[b*k+j], left[p*d+b]*from[a*k+j]
					at := dynamics.Coordinate(a, b, d)
					if a == b {
						r.add(row, at, real(f))
						r.add(row+1, at, imag(f))
						continue
					}
					const h = math.Sqrt2 / 2
					r.add(row, at, h*(real(f)+real(g)))
					r.add(row+1, at, h*(imag(f)+imag(g)))
					r.add(row, at+1, h*(imag(g)-imag(f)))
					r.add(row+1, at+1, h*(real(f)-real(g)))
				}
			}
			row += 2
		}
	}
	r.rows = row
	return r.done(d)
}

func (r reading) done(d int) reading {
	seen := make([]bool, d*d)
	for _, p := range r.parts {
		seen[p.coordinate] = true
	}
	for i, s := range seen {
		if s {
			r.needed = append(r.needed, i)
		}
	}
	return r
}

// of returns the residuals of a matrix.
func (r *reading) of(a []complex128, d int, coord []float64) []float64 {
	dynamics.Coordinates(coord, a, d)
	out := make([]float64, r.rows)
	for _, p := range r.parts {
		out[p.row] += p.factor * coord[p.coordinate]
	}
	return out
}

func sumSquares(list []float64) float64 {
	s := 0.0
	for _, v := range list {
		s += v * v
	}
	return s
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
		list, factors := s.Held[i].spread()
		for k, m := range list {
			p := placedLevels{member: m, class: i}
			if s.Held[i].Kind == Static {
				p.member, p.operator = member{scale: 1, lambda: s.Held[i].Values[k]}, s.Held[i].Operators[0]
			}
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

// levelsJacobian is the working memory of Jacobian.
type levelsJacobian struct {
	d, raw  []float64 // raw rows: d² of every gate, nominal first, then what is needed of each toggled error
	gate    []dynamics.LevelsSlopes
	toggled [][]int // raw row of each coordinate, by toggle and then by wave; -1 where not needed
	lever   []float64
	bent    []float64 // angles x d²
	angle   []float64 // angles x coefficients
}

func (g *LevelsGate) newJacobian() *levelsJacobian {
	j := new(levelsJacobian)
	dd, w := g.spec.Dim*g.spec.Dim, g.total*g.nodes
	gates := 1 + len(g.members)
	rows := gates * dd
	place := func(r *reading) {
		at := make([]int, dd)
		for k := range at {
			at[k] = -1
		}
		for _, k := range r.needed {
			at[k] = rows
			rows++
		}
		j.toggled = append(j.toggled, at)
	}
	for _, t := range g.toggles {
		place(g.reading(t.class))
	}
	for range g.waves {
		place(&g.read[0])
	}
	j.d, j.raw = make([]float64, rows*w), make([]float64, rows*g.response.Dim)
	row := func(i int) []float64 { return j.d[i*w : (i+1)*w] }
	for i := range gates {
		s := dynamics.LevelsSlopes{}
		for k := range dd {
			s.Gate = append(s.Gate, row(i*dd+k))
		}
		j.gate = append(j.gate, s)
	}
	s := &j.gate[0]
	if n := len(g.toggles) + len(g.waves); n > 0 {
		s.Toggle = make([][]float64, dd*n)
	}
	if n := len(g.nominal.Borne); n > 0 {
		s.Direct = make([][]float64, dd*n)
	}
	for i := range j.toggled {
		for k, at := range j.toggled[i] {
			if at < 0 {
				continue
			}
			toggle, direct := g.toggle(i)
			s.Toggle[dd*toggle+k] = row(at)
			if b := toggle - len(g.nominal.Held); direct {
				s.Direct[dd*b+k] = make([]float64, w)
			}
		}
	}
	j.lever = make([]float64, g.aim.rows()*dd)
	n := g.aim.angles()
	j.bent, j.angle = make([]float64, n*dd), make([]float64, n*g.response.Dim)
	return j
}

// toggle gives the number that dynamics has for a toggled error, by toggle and then by
// wave, and whether it moves with the controls by itself.
func (g *LevelsGate) toggle(i int) (number int, direct bool) {
	if i < len(g.toggles) {
		return g.toggles[i].toggle, g.toggles[i].toggle >= len(g.nominal.Held)
	}
	w := &g.waves[i-len(g.toggles)]
	return w.toggle, g.rides(w)
}

// Jacobian stores the derivatives at the c of the last call of Residuals in jac.
func (g *LevelsGate) Jacobian(jac []float64) {
	if g.jac == nil {
		g.jac = g.newJacobian()
	}
	j := g.jac
	n, dd := g.response.Dim, g.spec.Dim*g.spec.Dim
	w := g.total * g.nodes
	clear(j.raw)
	g.nominal.Derive(g.u, &j.gate[0])
	for _, rows := range [][][]float64{j.gate[0].Gate, j.gate[0].Toggle} {
		for _, row := range rows {
			if row != nil {
				g.multiply(g.slope, row)
			}
		}
	}
	for i, t := range g.toggles {
		b := t.toggle - len(g.nominal.Held)
		if b < 0 {
			continue
		}
		c := &g.held[t.class]
		for k, at := range j.toggled[i] {
			if at < 0 {
				continue
			}
			direct, toggle := j.gate[0].Direct[dd*b+k], j.d[at*w:(at+1)*w]
			if g.mapped != nil {
				g.unmap(direct, toggle, g.w[t.class])
			}
			switch c.Kind {
			case Amplitude:
				for q, v := range direct[:g.count*g.nodes] {
					toggle[q] += v
				}
			case Mixed:
				g.unmix(c.Mix, 1, direct, toggle, 0, g.nodes)
			case Line:
				g.contract(g.response.Slopes[t.class], 1, direct, 1, g.first, g.last, j.raw[at*n:])
			}
		}
	}
	for i := range g.waves {
		x := &g.waves[i]
		if !g.rides(x) {
			continue
		}
		b := x.toggle - len(g.nominal.Held)
		for k, at := range j.toggled[len(g.toggles)+i] {
			if at >= 0 {
				g.lend(x, j.gate[0].Direct[dd*b+k], j.d[at*w:(at+1)*w])
			}
		}
	}
	for i := range g.members {
		u := g.runMember(i)
		g.finite.Derive(u, &j.gate[1+i])
		g.chain(i, j.gate[1+i].Gate, func(f float64, rows []float64, k int) {
			g.contract(g.response.Slopes[g.members[i].class], f, rows, 1, g.first, g.last, j.raw[((1+i)*dd+k)*n:])
		})
	}
	g.contract(g.response.Blocks, 1, j.d, len(j.d)/w, 0, g.nodes, j.raw)

	clear(jac[:g.rows*n])
	if g.bend != nil {
		g.bend.slopes(g.views[0], j.bent)
		for i := range g.bend.n {
			combine(j.angle[i*n:(i+1)*n], j.bent[i*dd:(i+1)*dd], j.raw, n)
		}
	}
	at := 0
	for b, x := range g.blocks {
		for k, gate := range x.gates {
			v := g.views[gate]
			v.lever(j.lever)
			for row := range g.aim.rows() {
				dst := jac[(at+row)*n : (at+row+1)*n]
				for q, f := range j.lever[row*dd : (row+1)*dd] {
					if f != 0 {
						axpy(dst, x.factors[k]*f, j.raw[(gate*dd+q)*n:(gate*dd+q+1)*n])
					}
				}
			}
			if g.bend == nil {
				continue
			}
			v.turns()
			for a := range g.bend.n {
				for row, f := range v.along(a) {
					axpy(jac[(at+row)*n:(at+row+1)*n], x.factors[k]*f, j.angle[a*n:(a+1)*n])
				}
			}
		}
		if at += g.aim.rows(); b > 0 {
			continue
		}
		for i, t := range g.toggles {
			f := t.factor * g.held[t.class].heldWeight()
			r := g.reading(t.class)
			for _, p := range r.parts {
				raw := j.toggled[i][p.coordinate]
				axpy(jac[(at+p.row)*n:(at+p.row+1)*n], f*p.factor, j.raw[raw*n:(raw+1)*n])
			}
			at += r.rows
		}
		for i := range g.waves {
			x := &g.waves[i]
			f := x.factor * g.held[x.class].Weight
			for _, p := range g.read[0].parts {
				raw := j.toggled[len(g.toggles)+i][p.coordinate]
				axpy(jac[(at+p.row)*n:(at+p.row+1)*n], f*p.factor, j.raw[raw*n:(raw+1)*n])
			}
			at += g.read[0].rows
		}
	}
}

// lend adds to the derivatives by the controls what those by the wave's own v, direct, make of them.
// direct is spoilt.
func (g *LevelsGate) lend(w *wave, direct, to []float64) {
	for k := range g.count {
		for n, f := range w.time {
			direct[k*g.nodes+n] *= f
		}
	}
	if g.mapped != nil {
		g.unmap(direct, to, g.w[w.class])
	}
	if c := &g.held[w.class]; c.Kind == Mixed {
		g.unmix(c.Mix, 1, direct, to, 0, g.nodes)
		return
	}
	axpy(to[:g.count*g.nodes], 1, direct[:g.count*g.nodes])
}

// axpy adds f src to dst.
func axpy(dst []float64, f float64, src []float64) {
	for i, v := range src {
		dst[i] += f * v
	}
}

// combine stores the combination of the first rows of raw in dst.
func combine(dst, factors, raw []float64, n int) {
	clear(dst)
	for k, f := range factors {
		if f != 0 {
			axpy(dst, f, raw[k*n:(k+1)*n])
		}
	}
}

// chain turns rows of derivatives by the controls of a member into those by what
// arrives without its error; line is called, for an error of a line, with what its own slope is to bring.
func (g *LevelsGate) chain(i int, rows [][]float64, line func(f float64, row []float64, k int)) {
	e := &g.members[i]
	c := &g.held[e.class]
	slope := g.movedSlope
	if e.operator != nil {
		slope = g.slope
	}
	for _, row := range rows {
		g.multiply(slope, row)
	}
	if e.operator != nil {
		return
	}
	switch {
	case e.scale != 1:
		for _, row := range rows {
			for a := range g.count {
				part := row[a*g.nodes+g.first : a*g.nodes+g.last]
				for k := range part {
					part[k] *= e.scale
				}
			}
		}
	case e.lambda != 0 && c.Kind == Line:
		for k, row := range rows {
			line(e.lambda, row, k)
		}
	case e.lambda != 0:
		for _, row := range rows {
			copy(g.moved, row)
			g.unmix(c.Mix, e.lambda, g.moved, row, g.first, g.last)
		}
	}
}

// Gradient stores Jᵀr in grad, J the Jacobian at the c of the last call of Residuals
// and r given residuals, without forming J: for many residuals, or many levels.
func (g *LevelsGate) Gradient(r, grad []float64) {
	d := g.spec.Dim
	dd := d * d
	clear(grad)
	cot := make([][]complex128, len(g.views))
	angles := make([]float64, g.aim.angles())
	var toggle [][]complex128
	if n := len(g.toggles) + len(g.waves); n > 0 {
		toggle = make([][]complex128, n)
	}
	at, rows := 0, g.aim.rows()
	z := make([]float64, rows)
	for b, x := range g.blocks {
		for k, gate := range x.gates {
			for i, v := range r[at : at+rows] {
				z[i] = x.factors[k] * v
			}
			if cot[gate] == nil {
				cot[gate] = make([]complex128, dd)
			}
			v := g.views[gate]
			v.cotangent(cot[gate], z)
			if g.bend == nil {
				continue
			}
			v.turns()
			for a := range angles {
				for i, y := range v.along(a) {
					angles[a] += z[i] * y
				}
			}
		}
		if at += rows; b > 0 {
			continue
		}
		back := func(number int, reading *reading, f float64) {
			clear(g.coord)
			for _, p := range reading.parts {
				g.coord[p.coordinate] += f * p.factor * r[at+p.row]
			}
			m := make([]complex128, dd)
			dynamics.FromCoordinates(m, g.coord, d)
			toggle[number] = m
			at += reading.rows
		}
		for _, t := range g.toggles {
			back(t.toggle, g.reading(t.class), t.factor*g.held[t.class].heldWeight())
		}
		for _, w := range g.waves {
			back(w.toggle, &g.read[0], w.factor*g.held[w.class].Weight)
		}
	}
	if g.bend != nil {
		g.bend.cotangent(g.views[0], cot[0], angles)
	}
	w := g.total * g.nodes
	u := make([]float64, w)
	var direct [][]float64
	for range g.nominal.Borne {
		direct = append(direct, make([]float64, w))
	}
	g.nominal.Pull(g.u, &dynamics.LevelsCotangent{Gate: cot[0], Toggle: toggle}, u, direct)
	g.multiply(g.slope, u)
	for k, class := range g.borne {
		c := &g.held[class]
		if g.mapped != nil {
			g.unmap(direct[k], u, g.w[class])
		}
		switch c.Kind {
		case Amplitude:
			axpy(u[:g.count*g.nodes], 1, direct[k][:g.count*g.nodes])
		case Mixed:
			g.unmix(c.Mix, 1, direct[k], u, 0, g.nodes)
		case Line:
			g.contract(g.response.Slopes[class], 1, direct[k], 1, g.first, g.last, grad)
		}
	}
	for i := range g.waves {
		if x := &g.waves[i]; g.rides(x) {
			g.lend(x, direct[x.toggle-len(g.nominal.Held)], u)
		}
	}
	g.contract(g.response.Blocks, 1, u, 1, 0, g.nodes, grad)
	for i := range g.members {
		if cot[1+i] == nil {
			continue
		}
		g.finite.Pull(g.runMember(i), &dynamics.LevelsCotangent{Gate: cot[1+i]}, u, nil)
		g.chain(i, [][]float64{u}, func(f float64, row []float64, _ int) {
			g.contract(g.response.Slopes[g.members[i].class], f, row, 1, g.first, g.last, grad)
		})
		g.contract(g.response.Blocks, 1, u, 1, 0, g.nodes, grad)
	}
}

// loadLevels is load, where the errors of amplitudes leave given terms alone.
func (g *LevelsGate) loadLevels(u []float64, v [][]float64) {
	g.load(u, v)
	g.copyAmplitudes()
}

// Figures evaluates controls u and the v of classes of kind Line.
func (g *LevelsGate) Figures(u []float64, v [][]float64) Figures {
	g.loadLevels(u, v)
	g.nominal.Run(g.u, nil)
	g.aim.reset()
	var f Figures
	f.Infidelity, f.Leakage = g.aim.see(g.nominal.Gate, true).losses()
	f.Rotations = g.aim.set.clone()
	f.Susceptibility, f.Leak = make([]float64, len(g.held)), make([]float64, len(g.held))
	d := g.spec.Dim
	f.Noise = make([]float64, len(g.held))
	for _, w := range g.waves {
		f.Noise[w.class] += w.factor * w.factor * sumSquares(g.read[0].of(g.nominal.Toggle[w.toggle], d, g.coord))
	}
	if c := float64(g.aim.c); g.aim.target != nil {
		for i := range f.Noise { // average gate infidelity
			f.Noise[i] *= c / (c + 1)
		}
	}
	for class := range g.held {
		c := &g.held[class]
		r := g.reading(class)
		member := 0
		sum, leak, size, whole := 0.0, 0.0, 0.0, 0.0
		for _, t := range g.toggles {
			if t.class != class {
				continue
			}
			a := g.nominal.Toggle[t.toggle]
			col := r.of(a, d, g.coord)
			w := 1.0
			if c.Kind == Static || c.Kind == Any {
				op := g.nominal.Held[t.toggle]
				w = c.factor(member)
				x := g.size(op, c.Leak)
				size += w * w * x * x
				whole += w * w * squared(op, d)
			} else {
				size, whole = g.power(g.v[class])
				size, whole = size/g.span, whole/g.span
			}
			for i := range col {
				col[i] *= w
			}
			sum += sumSquares(col)
			leak += w * w * sumSquares(g.leaves.of(a, d, g.coord))
			member++
		}
		if size > 0 {
			f.Susceptibility[class] = math.Sqrt(sum/size) / g.span
		}
		if whole > 0 {
			f.Leak[class] = math.Sqrt(leak/whole) / g.span
		}
	}
	return f
}

// squared is the square of the Frobenius norm without the trace.
func squared(v []complex128, d int) float64 {
	sum := 0.0
	for _, x := range v {
		sum += real(x)*real(x) + imag(x)*imag(x)
	}
	trace := real(traceOf(v, d))
	return math.Max(0, sum-trace*trace/float64(d))
}

// power returns ∫ ||V||² dt over the window of the error that rides on the controls as
// v: of what residuals are compared to, and of the whole V.
func (g *LevelsGate) power(v []float64) (size, whole float64) {
	dd := g.spec.Dim * g.spec.Dim
	m := make([]complex128, dd)
	for j := g.spec.Grid.First; j < g.spec.Grid.Last; j++ {
		for node := 2 * j; node < 2*j+2; node++ {
			clear(m)
			for k, e := range g.spec.Axes {
				at := k*g.nodes + node
				f := complex(v[at], 0)
				for i, x := range e {
					m[i] += f * x
				}
				if g.spec.Shifts != nil {
					f *= complex(2*g.u[at], 0)
					for i, x := range g.spec.Shifts[k] {
						m[i] += f * x
					}
				}
			}
			h := g.spec.Grid.Steps[j] / 2
			s := g.size(m, false)
			size += h * s * s
			whole += h * squared(m, g.spec.Dim)
		}
	}
	return size, whole
}

// InfidelityAt returns the infidelity of controls u at given rotations.
func (g *LevelsGate) InfidelityAt(u []float64, r Rotations) float64 {
	g.set(u)
	g.nominal.Run(g.u, nil)
	g.aim.set, g.aim.warm = r.clone(), true
	loss, _ := g.aim.see(g.nominal.Gate, false).losses()
	return loss
}

// MeanInfidelity is that of Gate, at the rotations that are best without error.
func (g *LevelsGate) MeanInfidelity(u []float64, v [][]float64, class int) float64 {
	g.loadLevels(u, v)
	c := g.held[class]
	c.OneSided = false
	kept := g.members
	defer func() { g.members = kept }()
	g.members = c.members(class)
	for _, x := range c.Values {
		p := placedLevels{member: c.at(x), class: class}
		if c.Kind == Static {
			p.member, p.operator = member{scale: 1, lambda: x}, c.Operators[0]
		}
		g.members = append(g.members, p)
	}
	if len(g.members) == 0 {
		return 0
	}
	if g.aim.free() {
		g.nominal.Run(g.u, nil)
		g.aim.reset()
		g.aim.see(g.nominal.Gate, true)
	}
	losses := make([]float64, len(g.members))
	for i := range g.members {
		g.runMember(i)
		loss, _ := g.aim.see(g.finite.Gate, false).losses()
		losses[i] = loss
	}
	return c.mean(losses)
}

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
