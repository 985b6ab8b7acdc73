package design

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"runtime"
	"slices"
	"sync"
	"time"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/design/solve"
	"holdfast/hardware"
)

// Inputs are what a design starts from, checked against each other
// (brief.LoadAll does it).
type Inputs struct {
	Brief   *brief.Brief
	Profile *hardware.Profile
	Device  *device.Device
	Version string // of the program, for the record
}

// Status says how a design ended.
type Status string

// The ways.
const (
	Found       Status = "found"
	NotFound    Status = "not found: the best miss"
	Interrupted Status = "interrupted: the best so far"
)

// Progress is what a run tells while it works.
type Progress struct {
	Stage     string        // "search", "refine"
	Done, Of  int           // starts, or candidates
	Successes int           // starts that ended at a zero
	Best      float64       // smallest sum of squared residuals so far
	Expected  time.Duration // before the first start: what the whole search may take at most, roughly
}

// A Pulse is a finished design.
type Pulse struct {
	Status   Status
	Record   Record
	Channels []Waveform // in the order of the record's [[model.channel]]
	Turned   []Turned   // the gate at the angles that the brief asks for by samples
	inputs   Inputs
}

// Turned is the pulse with its quadratures turned by an angle.
type Turned struct {
	Angle    float64 // rad
	Channels []Waveform
}

// A Waveform is what one channel plays.
type Waveform struct {
	Channel int          // of the profile
	Exact   []complex128 // samples before rounding, what the converter puts out, share of full scale
	Codes   []int16      // I0 Q0 I1 Q1 ..., or of a baseband channel x0 x1 ...
}

// What the finish of a design spends: successes are refined against finite
// errors, all of them in two short stages, of which the first looks at larger
// errors and so leaves shallow basins, then the best few for longer. Budgets
// count iterations, never seconds.
const (
	candidates   = 12
	finalists    = 4
	refineWeight = 1 // of the finite errors beside the first order
	refineKappa  = 1
	refineStalls = 12
)

// A stage is some iterations of the refinement at stretched errors.
type stage struct {
	stretch    float64
	oneSided   bool // of robust.Class
	iterations int
}

var rounds = [2][]stage{
	{{3, true, 30}, {1, true, 20}},
	{{1, false, 150}},
}

// Run designs the pulse. It uses all processors; its result depends on the
// inputs alone. When ctx is cancelled it returns the best so far with status
// Interrupted. progress, unless nil, is called from one goroutine at a time.
func Run(ctx context.Context, in Inputs, progress func(Progress)) (*Pulse, error) {
	if progress == nil {
		progress = func(Progress) {}
	}
	families := []string{in.Brief.Basis.Family}
	if in.Brief.Basis.Family == brief.Best {
		families = []string{brief.Slepian, brief.Fourier, brief.BSpline}
	}
	var q *problem
	var out outcome
	for _, family := range families {
		next, err := newTask(in, family)
		if err != nil {
			return nil, err
		}
		o := next.find(ctx, in.Brief, progress)
		if q == nil || o.better(out) {
			q, out = next, o
		}
		if ctx.Err() != nil {
			break
		}
	}
	return q.finish(in, out)
}

// newTask readies the problem of the brief in one family of shapes.
func newTask(in Inputs, family string) (*problem, error) {
	d, err := drives(in)
	if err != nil {
		return nil, err
	}
	b := in.Brief
	w := wish{
		samples: int(math.Round(b.Span / in.Profile.SamplePeriod)),
		family:  family, count: b.Basis.Coefficients, degree: b.Basis.Degree,
		settled: b.Ends == brief.Settled,
		target:  dynamics.Vec{b.Target.Axis[0] * b.Target.Angle, b.Target.Axis[1] * b.Target.Angle, b.Target.Axis[2] * b.Target.Angle},
	}
	if w.turns, err = turns(in, d); err != nil {
		return nil, err
	}
	if in.Device.Dim() == 2 {
		w.spin.Static = scale(pauli(in.Device.Static()), 2)
	} // a ladder's detuning is in its levels
	w.spin.Target = dynamics.Turn(w.target)
	w.spin.FreeBefore = b.Target.FreeZ == brief.Before || b.Target.FreeZ == brief.Both
	w.spin.FreeAfter = b.Target.FreeZ == brief.After || b.Target.FreeZ == brief.Both
	shifted := false
	for _, x := range d {
		ch := &in.Profile.Channels[x.channel]
		w.channels = append(w.channels, x.channel)
		for _, op := range x.operators {
			w.spin.Axes = append(w.spin.Axes, scale(pauli(op), 2*ch.FullScale))
			// H += Shift |u|² Z/2
			w.spin.Shifts = append(w.spin.Shifts, dynamics.Vec{0, 0, ch.Shift})
			shifted = shifted || ch.Shift != 0
		}
	}
	if !shifted {
		w.spin.Shifts = nil
	}
	if in.Device.Dim() > 2 {
		if b.Target.FreeZ != brief.NoFreeZ && b.Target.FreeZ != "" {
			return nil, fmt.Errorf("target.free_z: found %q on a ladder; allowed: \"none\" with more than two levels", b.Target.FreeZ)
		}
		if shifted {
			return nil, fmt.Errorf("%s: found a drive-induced shift; allowed: none on a ladder of more than two levels", in.Profile.File)
		}
		w.levels = &robust.Levels{Dim: in.Device.Dim(), Code: 2, Static: in.Device.Static().Data, Target: b.Target.Matrix.Data}
		for _, x := range d {
			for _, op := range x.operators {
				w.levels.Axes = append(w.levels.Axes, op.Scale(complex(in.Profile.Channels[x.channel].FullScale, 0)).Data)
			}
		}
	}
	if w.spin.Held, w.slopes, err = classes(in, d); err != nil {
		return nil, err
	}
	q, err := newProblem(in.Profile, w)
	if err != nil {
		return nil, err
	}
	q.seed, q.starts = b.Seed, b.Starts
	return q, nil
}

// turns are the phases by which the samples are turned for the angles that they
// are emitted at: none, and those that the brief asks for.
func turns(in Inputs, d []driven) ([]complex128, error) {
	list := []complex128{1}
	if in.Brief.PhaseBy != brief.BySamples {
		return list, nil
	}
	for i, x := range d {
		// what does not turn with the samples must not mind: a bias along Z alone
		if v := pauli(x.operators[0]); len(x.operators) == 1 && v[0]*v[0]+v[1]*v[1] > 0 {
			return nil, fmt.Errorf("phase_by: found \"samples\" beside a bias along %s by channel %q, which does not turn with them; allowed: with biases along Z, or phase_by = \"instrument\"",
				axisName(v), in.Profile.Channels[d[i].channel].Name)
		}
	}
	for _, phase := range in.Brief.Phases {
		if z := cmplx.Rect(1, sense(d)*phase); cmplx.Abs(z-1) > 1e-12 {
			list = append(list, z)
		}
	}
	return list, nil
}

func axisName(v dynamics.Vec) string {
	if v[1] != 0 {
		return "Y"
	}
	return "X"
}

// sense is the way in which a phase of the samples turns the gate's axis about Z: 1
// where Q turns about +Y, -1 where it turns about -Y.
func sense(d []driven) float64 {
	for _, x := range d {
		if len(x.operators) == 2 && pauli(x.operators[1])[1] < 0 {
			return -1
		}
	}
	return 1
}

// A driven channel of the target's site, and what its controls do there.
type driven struct {
	channel   int
	control   int // the first of its controls
	operators []device.Matrix
}

// drives finds the channels that drive the target's site: quadrature channels
// first, then baseband ones.
func drives(in Inputs) (list []driven, err error) {
	control := 0
	add := func(name string, operators func(ch *hardware.Channel) []device.Matrix) error {
		i, ok := in.Profile.Channel(name)
		if !ok {
			return fmt.Errorf("%s: channel %q is not in the profile", in.Device.File, name)
		}
		d := driven{i, control, operators(&in.Profile.Channels[i])}
		control += len(d.operators)
		list = append(list, d)
		return nil
	}
	for i, d := range in.Device.Drives {
		if d.Site == in.Brief.Target.Site {
			err = errors.Join(err, add(d.Channel, func(ch *hardware.Channel) []device.Matrix {
				ops := in.Device.Operators(i, string(ch.Mixing))
				return ops[:]
			}))
		}
	}
	for i, d := range in.Device.Biases {
		if d.Site == in.Brief.Target.Site {
			err = errors.Join(err, add(d.Channel, func(*hardware.Channel) []device.Matrix { return []device.Matrix{in.Device.BiasOperator(i)} }))
		}
	}
	if err == nil && len(list) == 0 {
		err = fmt.Errorf("%s: nothing drives site %q", in.Device.File, in.Brief.Target.Site)
	}
	return list, err
}

// classes turns the brief's errors into those of package robust, with the lines
// of those that are errors of a line.
func classes(in Inputs, d []driven) (held []robust.Class, slopes []*slope, err error) {
	controls := 0
	for _, x := range d {
		controls += len(x.operators)
	}
	on := func(name string) (lane int) {
		return slices.IndexFunc(d, func(x driven) bool { return in.Profile.Channels[x.channel].Name == name })
	}
	opening := opening(in.Profile, d)
	for _, e := range in.Brief.Errors {
		c := robust.Class{Name: e.Name, Weight: e.Weight, Size: e.Size}
		var s *slope
		lane := -1
		if len(e.Channels) > 0 {
			if lane = on(e.Channels[0]); lane < 0 {
				return nil, nil, fmt.Errorf("error %q: channel %q does not drive site %q", e.Name, e.Channels[0], in.Brief.Target.Site)
			}
		}
		mix := func() [][]float64 {
			m := make([][]float64, controls)
			for i := range m {
				m[i] = make([]float64, controls)
			}
			return m
		}
		switch e.Kind {
		case brief.Static:
			c.Kind, c.Vector = robust.Static, pauli(e.Operator)
			if in.Device.Dim() > 2 {
				c.Operator = in.Device.Lift(e.Operator).Data
				c.Vector = dynamics.Vec{0, 0, length(c.Vector)} // its length along the operator is what counts
			}
			// the field that an operator of that size adds: H = F·σ/2
			c.Size = 2 * e.Size * length(c.Vector)
		case brief.Any:
			c.Kind = robust.Any
		case brief.Amplitude:
			if c.Kind = robust.Amplitude; e.Quadrature == "" && (len(e.Channels) == 0 || len(e.Channels) == len(d)) {
				break
			}
			c.Kind, c.Mix = robust.Mixed, mix()
			for _, name := range e.Channels {
				i := on(name)
				if i < 0 {
					return nil, nil, fmt.Errorf("error %q: channel %q does not drive site %q", e.Name, name, in.Brief.Target.Site)
				}
				for k := range d[i].operators {
					if e.Quadrature == "" || e.Quadrature == "IQ"[k:k+1] {
						c.Mix[d[i].control+k][d[i].control+k] = 1
					}
				}
			}
		case brief.Skew:
			c.Kind, c.Mix = robust.Mixed, mix()
			c.Mix[d[lane].control][d[lane].control+1] = -1
		case brief.Offset: // what a constant at the converter makes of H, per rad/ns
			i := 0
			if e.Quadrature == "Q" {
				i = 1
			}
			ch := &in.Profile.Channels[d[lane].channel]
			c.Kind, c.Vector = robust.Static, pauli(d[lane].operators[i])
			c.Size = 2 * e.Size * ch.FullScale * cmplx.Abs(ch.Line.DC()) * length(c.Vector)
			if in.Device.Dim() > 2 {
				c.Operator, c.Vector = d[lane].operators[i].Data, dynamics.Vec{0, 0, 1}
			}
		case brief.Line:
			ch := &in.Profile.Channels[d[lane].channel]
			p, ok := ch.Parameter(e.Parameter)
			if !ok || p.Refused != "" {
				return nil, nil, fmt.Errorf("error %q: parameter %q of channel %q has no derivative", e.Name, e.Parameter, ch.Name)
			}
			c.Kind = robust.Line
			s = &slope{lane, feed{p.Slope, in.Profile.Start(d[lane].channel) - opening}}
		default:
			return nil, nil, fmt.Errorf("error %q: kind %q is not known here", e.Name, e.Kind)
		}
		held, slopes = append(held, c), append(slopes, s)
	}
	if n := toggles(held); n > dynamics.MaxToggles {
		return nil, nil, fmt.Errorf("found %d errors that a search must follow at once; allowed: up to %d, any number of static ones counting as three", n, dynamics.MaxToggles)
	}
	return held, slopes, nil
}

// toggles counts what dynamics has to follow for the classes: see robust.NewGate.
func toggles(held []robust.Class) int {
	statics, others, all := 0, 0, false
	for _, c := range held {
		switch c.Kind {
		case robust.Static:
			statics++
		case robust.Any:
			all = true
		default:
			others++
		}
	}
	if all {
		statics = 3
	}
	return min(statics, 3) + others
}

// opening is the instant of the gate's window: that of the last channel to arrive.
func opening(p *hardware.Profile, d []driven) float64 {
	t := math.Inf(-1)
	for _, x := range d {
		t = math.Max(t, p.Start(x.channel))
	}
	return t
}

// pauli returns v with v·σ the traceless part of a Hermitian matrix's first two
// rows and columns.
func pauli(m device.Matrix) dynamics.Vec {
	return dynamics.Vec{
		real(m.At(0, 1)+m.At(1, 0)) / 2,
		real(complex(0, 1)*(m.At(0, 1)-m.At(1, 0))) / 2,
		real(m.At(0, 0)-m.At(1, 1)) / 2,
	}
}

func scale(v dynamics.Vec, f float64) dynamics.Vec {
	return dynamics.Vec{f * v[0], f * v[1], f * v[2]}
}

// An outcome is what the search and the refinement leave.
type outcome struct {
	c           []float64
	miss        float64
	loss        float64 // of the finite errors, once refined
	status      Status
	winner      int
	tried       int
	successes   int
	evaluations int
	refined     bool
}

// better says whether an outcome is worth more: found before not found, then less
// loss under finite errors, then a smaller miss.
func (o outcome) better(p outcome) bool {
	if (o.status == Found) != (p.status == Found) {
		return o.status == Found
	}
	if o.loss != p.loss {
		return o.loss < p.loss
	}
	return o.miss < p.miss
}

// find searches from many starts, refines the lowest-numbered successes and
// keeps the best of them.
func (q *problem) find(ctx context.Context, b *brief.Brief, progress func(Progress)) outcome {
	want := 1
	refine := b.Refine && len(q.spin.Held) > 0
	if refine {
		want = candidates
	}
	workers := runtime.GOMAXPROCS(0)
	progress(Progress{Stage: "search", Of: q.starts, Expected: q.expected() * time.Duration(q.starts) / time.Duration(workers)})
	list := solve.Search(ctx, q.starts, want, workers, q.solve, func(done, won int, best float64) {
		progress(Progress{Stage: "search", Done: done, Of: q.starts, Successes: won, Best: best})
	})
	out := outcome{tried: len(list), status: Interrupted}
	if len(list) == 0 { // interrupted before the first start: its playable beginning
		out.c = q.start(0).c
		out.miss = math.Inf(1)
		return out
	}
	var won []solve.Numbered
	for _, r := range list {
		out.evaluations += r.Evaluations
		if r.Status == solve.Converged {
			won = append(won, r)
		}
	}
	out.successes = len(won)
	if len(won) == 0 {
		best := solve.Best(list)
		out.c, out.miss, out.winner = best.C, best.Miss, best.Start
		if ctx.Err() == nil {
			out.status = NotFound
		}
		return out
	}
	if !refine {
		won = won[:1]
	}
	pool := q.refine(ctx, won, refine, progress)
	best := pool[0]
	for _, c := range pool {
		out.evaluations += c.evaluations
		if c.better(best) {
			best = c
		}
	}
	out.c, out.miss, out.loss, out.winner, out.refined = best.c, best.miss, best.loss, best.start, refine
	if ctx.Err() == nil {
		out.status = Found
		if !best.zero {
			out.status = NotFound
		}
	}
	return out
}

// expected is a rough upper bound of the time of one start: that of its
// evaluations, were they all used. It is shown, and nothing depends on it.
func (q *problem) expected() time.Duration {
	g := q.gate(false)
	c := q.start(0).c
	r, jac := make([]float64, g.Rows()), make([]float64, g.Rows()*g.Dim())
	begun := time.Now()
	g.Residuals(c, r)
	g.Jacobian(jac)
	return 300 * time.Since(begun)
}

// solve runs one start on the coarse grid.
func (q *problem) solve(ctx context.Context, number int) solve.Result {
	st := q.start(number)
	return solve.GaussNewton(ctx, q.residuals(q.gate(false)), q.set, st.c, solve.Options{Kappa: st.kappa})
}

// A candidate is a success on its way to the finish.
type candidate struct {
	start       int
	c           []float64 // last point at which the first order vanished
	wide        []float64 // last point of the refinement
	miss        float64   // on the fine grid
	zero        bool      // polished to a zero on the fine grid
	loss        float64   // of the finite errors after the polish
	evaluations int
}

func (c candidate) better(d candidate) bool {
	if c.zero != d.zero {
		return c.zero
	}
	return c.loss < d.loss
}

// refine polishes every success on the fine grid and, if wanted, first lowers
// its finite errors: all of them a little, the best few for longer.
func (q *problem) refine(ctx context.Context, won []solve.Numbered, wanted bool, progress func(Progress)) []candidate {
	pool := make([]candidate, len(won))
	for i, r := range won {
		pool[i] = candidate{start: r.Start, wide: r.C}
	}
	plan := rounds[:]
	if !wanted {
		plan = [][]stage{nil}
	}
	left := pool
	for round, stages := range plan {
		if round > 0 {
			sortByLoss(pool)
			left = pool[:min(finalists, len(pool))]
		}
		var mu sync.Mutex
		done := 0
		each(len(left), func(i int) {
			q.improve(ctx, &left[i], stages)
			mu.Lock()
			done++
			progress(Progress{Stage: "refine", Done: done, Of: len(left), Successes: len(won)})
			mu.Unlock()
		})
	}
	return pool
}

// sortByLoss puts the best first; equals keep their order.
func sortByLoss(pool []candidate) {
	for i := range pool {
		for k := i; k > 0 && pool[k].better(pool[k-1]); k-- {
			pool[k], pool[k-1] = pool[k-1], pool[k]
		}
	}
}

// improve takes a candidate through stages of the refinement and polishes what
// comes of it, the success itself the first time. A polish that ends at no zero,
// or at a worse one, is dropped.
func (q *problem) improve(ctx context.Context, c *candidate, stages []stage) {
	if c.c == nil {
		q.polish(ctx, c)
	}
	if len(stages) == 0 {
		return
	}
	for _, s := range stages {
		r := solve.GaussNewton(ctx, q.residuals(q.finite(s)), q.set, c.wide,
			solve.Options{Kappa: refineKappa, Tolerance: -1, Iterations: s.iterations, Stalls: refineStalls})
		c.wide = r.C
		c.evaluations += r.Evaluations
	}
	q.polish(ctx, c)
}

// polish brings the first order back to zero on the fine grid. It is short, and
// ends what was begun even when interrupted.
func (q *problem) polish(ctx context.Context, c *candidate) {
	r := solve.GaussNewton(context.WithoutCancel(ctx), q.residuals(q.gate(true)), q.set, c.wide, solve.Options{Iterations: 100})
	c.evaluations += r.Evaluations
	next := candidate{zero: r.Status == solve.Converged, loss: q.loss(r.C)}
	if c.c == nil || next.better(*c) {
		c.c, c.miss, c.zero, c.loss = r.C, r.Miss, next.zero, next.loss
	}
}

// loss is the mean infidelity over the finite errors of every held class, on
// the fine grid, summed over the classes.
func (q *problem) loss(c []float64) float64 {
	g := q.gate(true)
	u, v := q.controls(&q.fine, q.sampled(c))
	sum := 0.0
	for i := range q.spin.Held {
		sum += g.MeanInfidelity(u, v, i)
	}
	return sum
}

// each calls f for 0 .. n-1 on all processors.
func each(n int, f func(i int)) {
	var wg sync.WaitGroup
	next := make(chan int)
	for range min(n, runtime.GOMAXPROCS(0)) {
		wg.Go(func() {
			for i := range next {
				f(i)
			}
		})
	}
	for i := range n {
		next <- i
	}
	close(next)
	wg.Wait()
}
