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

	"gonum.org/v1/gonum/integrate/quad"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/dynamics"
	"holdfast/design/noise"
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
	w.plain = plain(in)
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
		w.paths = append(w.paths, x.paths)
		for _, op := range x.operators {
			if len(in.Device.Sites) == 1 {
				w.spin.Axes = append(w.spin.Axes, scale(pauli(op), 2*x.full))
			}
			// H += Shift |u|² Z/2
			w.spin.Shifts = append(w.spin.Shifts, dynamics.Vec{0, 0, ch.Shift})
			shifted = shifted || ch.Shift != 0
		}
	}
	if !shifted {
		w.spin.Shifts = nil
	}
	w.spin.Maps = curves(d)
	w.spin.Held, w.slopes, w.phantoms, err = classes(in, d, w.plain)
	if err != nil {
		return nil, err
	}
	if !w.plain {
		w.levels = levels(in, d, shifted, w.phantoms)
	}
	q, err := newProblem(in.Profile, w)
	if err != nil {
		return nil, err
	}
	q.seed, q.starts, q.require = b.Seed, b.Starts, b.Require
	return q, nil
}

// turns are the phases by which the samples are turned for the angles that they
// are emitted at: none, and those that the brief asks for.
func turns(in Inputs, d []driven) ([]complex128, error) {
	list := []complex128{1}
	if in.Brief.PhaseBy != brief.BySamples {
		return list, nil
	}
	if len(in.Device.Sites) > 1 || in.Brief.Target.From != nil {
		return nil, errors.New(`phase_by: found "samples" for several sites, or for states; allowed: for a gate on a device of one site, or phase_by = "instrument"`)
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

// plain tells whether the problem is one of a spin alone, for which there is a kernel of
// its own: a gate, held against single static errors or all of them.
func plain(in Inputs) bool {
	if in.Device.Dim() != 2 || in.Brief.Target.From != nil {
		return false
	}
	for _, e := range in.Brief.Errors {
		if e.Kind == brief.Any && len(e.Members) != 3 || e.Leak || e.Noise != nil {
			return false
		}
		for _, m := range e.Members {
			if m.Weight != 1 {
				return false
			}
		}
	}
	return true
}

// levels is the problem of a register or a ladder, without grid and errors. phantoms are
// what else is driven, by errors alone.
func levels(in Inputs, d []driven, shifted bool, phantoms []device.Matrix) *robust.Levels {
	t := &in.Brief.Target
	l := &robust.Levels{
		Dim: in.Device.Dim(), Code: in.Device.CodeSpace(), Static: in.Device.Static().Data, Target: t.Whole.Data, From: t.From, To: t.To,
		FreeBefore: t.FreeZ == brief.Before || t.FreeZ == brief.Both, FreeAfter: t.FreeZ == brief.After || t.FreeZ == brief.Both, Local: t.Local,
		Maps: curves(d),
	}
	for _, r := range in.Device.Rotating() {
		l.Rotating = append(l.Rotating, robust.Rotating{Frequency: r.Frequency, Cosine: r.Cosine.Data, Sine: r.Sine.Data})
	}
	none := device.Zero(l.Dim)
	for _, x := range d {
		ch := &in.Profile.Channels[x.channel]
		full := complex(x.full, 0)
		shift := in.Device.ShiftOperator(ch.Name).Scale(complex(ch.Shift, 0))
		for _, op := range x.operators {
			l.Axes, l.Shifts = append(l.Axes, op.Scale(full).Data), append(l.Shifts, shift.Data)
		}
		for _, path := range x.paths {
			for _, op := range path.operators {
				l.Axes, l.Shifts = append(l.Axes, op.Scale(full).Data), append(l.Shifts, none.Data)
			}
		}
	}
	for _, op := range phantoms {
		l.Axes, l.Shifts = append(l.Axes, op.Data), append(l.Shifts, none.Data)
	}
	if !shifted {
		l.Shifts = nil
	}
	return l
}

// A driven channel, and what its controls do to the device.
type driven struct {
	channel   int
	control   int // the first of its controls
	operators []device.Matrix
	paths     []path     // of other frequencies
	full      float64    // rate that a control of 1 drives, rad/ns: full scale, or what the curve has
	curve     robust.Map // of a bias that has a map
}

// A path is a channel's crosstalk to a site of another frame: u e^{-i frequency t} stands
// in the place of u.
type path struct {
	frequency float64 // rad/ns, t from the start of the window
	control   int     // the first of its two
	operators []device.Matrix
}

// drives finds the channels that drive the device: quadrature channels first, then
// baseband ones.
func drives(in Inputs) (list []driven, err error) {
	control := 0
	for _, name := range in.Device.Channels() {
		i, ok := in.Profile.Channel(name)
		if !ok {
			err = errors.Join(err, fmt.Errorf("%s: channel %q is not in the profile", in.Device.File, name))
			continue
		}
		ch := &in.Profile.Channels[i]
		d := driven{channel: i, control: control, full: ch.FullScale}
		if b := in.Device.Map(name); b != nil {
			if ch.Shift != 0 {
				err = errors.Join(err, fmt.Errorf("%s: channel %q: found a polynomial or a loop beside the shift of the channel in %s; allowed: one of the two", in.Device.File, name, in.Profile.File))
			}
			d.full, d.curve = curve(b, ch)
		}
		for k, p := range in.Device.Paths(name, string(ch.Mixing)) {
			if k == 0 {
				d.operators = p.Operators
			} else {
				d.paths = append(d.paths, path{p.Frequency, control, p.Operators})
			}
			control += len(p.Operators)
		}
		list = append(list, d)
	}
	return list, err
}

// controls counts those of all channels.
func controls(d []driven) (n int) {
	for _, x := range d {
		n += len(x.operators)
		for _, p := range x.paths {
			n += len(p.operators)
		}
	}
	return n
}

// classes turns the brief's errors into those of package robust, with the lines
// of those that are errors of a line, and what errors alone drive.
func classes(in Inputs, d []driven, plain bool) (held []robust.Class, slopes []*slope, phantoms []device.Matrix, err error) {
	opening := opening(in.Profile, d)
	count := controls(d)
	first := count // of the phantoms
	for _, e := range in.Brief.Errors {
		if e.Kind == brief.Crosstalk {
			count += len(e.Reach)
		}
	}
	for _, e := range in.Brief.Errors {
		c := robust.Class{Name: e.Name, Weight: e.Weight, Size: e.Size, Order: e.Order}
		c.Values, c.Shares = spread(&e)
		c.Worst = e.Spread == brief.Corners
		if e.Noise != nil {
			c.Noise, c.Size = nodes(e.Noise, in.Brief.Span, searchNodes), 0
		}
		var s *slope
		lane := -1
		if len(e.Channels) > 0 {
			if lane = on(in.Profile, d, e.Channels[0]); lane < 0 {
				return nil, nil, nil, fmt.Errorf("error %q: channel %q does not drive the device", e.Name, e.Channels[0])
			}
		}
		mix := func() [][]float64 {
			m := make([][]float64, count)
			for i := range m {
				m[i] = make([]float64, count)
			}
			return m
		}
		switch e.Kind {
		case brief.Static, brief.Any:
			if c.Kind = robust.Static; e.Kind == brief.Any {
				c.Kind = robust.Any
			}
			if plain {
				if e.Kind == brief.Static {
					c.Vector = pauli(e.Operator)
					// the field that an operator of that size adds: H = F·σ/2
					c.Size = 2 * e.Size * length(c.Vector)
					scaleAll(c.Values, 2*length(c.Vector))
				}
				break
			}
			c.Leak = e.Leak
			for _, m := range e.Members {
				c.Operators, c.Factors = append(c.Operators, m.Operator.Data), append(c.Factors, m.Weight)
			}
		case brief.Amplitude:
			if c.Kind = robust.Amplitude; e.Quadrature == "" && (len(e.Channels) == 0 || len(e.Channels) == len(d)) {
				break
			}
			c.Kind, c.Mix = robust.Mixed, mix()
			for _, name := range e.Channels {
				i := on(in.Profile, d, name)
				if i < 0 {
					return nil, nil, nil, fmt.Errorf("error %q: channel %q does not drive the device", e.Name, name)
				}
				if e.Quadrature != "" && len(d[i].paths) > 0 {
					return nil, nil, nil, fmt.Errorf("error %q: found a quadrature of %q, whose crosstalk turns against it; allowed: both quadratures", e.Name, name)
				}
				diagonal := func(first, n int) {
					for k := range n {
						if e.Quadrature == "" || e.Quadrature == "IQ"[k:k+1] {
							c.Mix[first+k][first+k] = 1
						}
					}
				}
				diagonal(d[i].control, len(d[i].operators))
				for _, p := range d[i].paths {
					diagonal(p.control, len(p.operators))
				}
			}
		case brief.Skew:
			if len(d[lane].paths) > 0 {
				return nil, nil, nil, fmt.Errorf("error %q: found the quadratures of %q, whose crosstalk turns against them; allowed: a channel without", e.Name, e.Channels[0])
			}
			c.Kind, c.Mix = robust.Mixed, mix()
			c.Mix[d[lane].control][d[lane].control+1] = -1
		case brief.Crosstalk:
			if d[lane].curve != nil {
				return nil, nil, nil, fmt.Errorf("error %q: found channel %q, whose bias has a polynomial or a loop; allowed: a channel without (what reaches another site has a map of its own)", e.Name, e.Channels[0])
			}
			c.Kind, c.Mix = robust.Mixed, mix()
			full := complex(in.Profile.Channels[d[lane].channel].FullScale, 0)
			for k, op := range e.Reach {
				c.Mix[first+len(phantoms)][d[lane].control+k] = 1
				phantoms = append(phantoms, op.Scale(full))
			}
		case brief.Offset: // what a constant at the converter makes of H, per rad/ns
			i := 0
			if e.Quadrature == "Q" {
				i = 1
			}
			ch := &in.Profile.Channels[d[lane].channel]
			rate := atRest(in, ch) * cmplx.Abs(ch.Line.DC())
			if math.Abs(atRest(in, ch)) <= flat*d[lane].full {
				return nil, nil, nil, fmt.Errorf("error %q: found channel %q, whose bias is flat where nothing is played; allowed: a channel of which an offset does something to first order", e.Name, e.Channels[0])
			}
			op := d[lane].operators[i]
			if plain {
				c.Vector = pauli(op)
				rate *= 2 * length(c.Vector)
			}
			c.Kind, c.Size = robust.Static, e.Size*math.Abs(rate)
			if scaleAll(c.Values, rate); !plain {
				c.Operators = [][]complex128{op.Data}
			}
		case brief.Line:
			ch := &in.Profile.Channels[d[lane].channel]
			p, ok := ch.Parameter(e.Parameter)
			if !ok || p.Refused != "" {
				return nil, nil, nil, fmt.Errorf("error %q: parameter %q of channel %q has no derivative", e.Name, e.Parameter, ch.Name)
			}
			c.Kind = robust.Line
			s = &slope{lane, feed{line: p.Slope, at: in.Profile.Start(d[lane].channel) - opening}}
		default:
			return nil, nil, nil, fmt.Errorf("error %q: kind %q is not known here", e.Name, e.Kind)
		}
		held, slopes = append(held, c), append(slopes, s)
	}
	if n := toggles(held); plain && n > dynamics.MaxToggles {
		return nil, nil, nil, fmt.Errorf("found %d errors that a search must follow at once; allowed: up to %d, any number of static ones counting as three", n, dynamics.MaxToggles)
	}
	return held, slopes, phantoms, nil
}

// searchNodes and claimNodes are how many frequencies stand for a noise: they reach to
// 2.8 times their number over the span.
const (
	searchNodes = 16
	claimNodes  = 64
)

// nodes gives the frequencies by which a noise is judged, with their weights.
func nodes(s *noise.Spectrum, span float64, n int) (list []robust.Node) {
	rule := s.Nodes(span, n)
	for i, w := range rule.Frequency {
		list = append(list, robust.Node{Frequency: w, Weight: rule.Weight[i]})
	}
	return list
}

// spread gives the sizes of an error over which the exact infidelity is to be low, with
// their weights: those of the brief, alike; or the worst of none and the error's size of
// either sign; or a normal distribution, by Gauss and Hermite.
func spread(e *brief.Error) (values, shares []float64) {
	switch {
	case e.Spread == "":
		return nil, nil
	case e.Values != nil:
		values = slices.Clone(e.Values)
	case e.Spread == brief.Corners:
		values = []float64{-e.Size, 0, e.Size}
	default:
		const points = 7
		x, w := make([]float64, points), make([]float64, points)
		quad.Hermite{}.FixedLocations(x, w, math.Inf(-1), math.Inf(1))
		for i := range x {
			values, shares = append(values, math.Sqrt2*e.Size*x[i]), append(shares, w[i]/math.Sqrt(math.Pi))
		}
		return values, shares
	}
	for range values {
		shares = append(shares, 1/float64(len(values)))
	}
	return values, shares
}

func scaleAll(list []float64, f float64) {
	for i := range list {
		list[i] *= f
	}
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

// on finds the channel of a name among those that drive; -1 for none.
func on(p *hardware.Profile, d []driven, name string) int {
	return slices.IndexFunc(d, func(x driven) bool { return p.Channels[x.channel].Name == name })
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
	if o.status == Found && o.loss != p.loss { // without a success there is no loss
		return o.loss < p.loss
	}
	return o.miss < p.miss
}

// find searches from many starts, refines the lowest-numbered successes and
// keeps the best of them.
func (q *problem) find(ctx context.Context, b *brief.Brief, progress func(Progress)) outcome {
	want, pool := 1, candidates
	refine := b.Refine && slices.ContainsFunc(q.spin.Held, func(c robust.Class) bool { return c.Values == nil && c.Noise == nil })
	if refine || q.spread() {
		pool = q.pool()
		refine = refine && pool > 0
	}
	if refine || q.spread() {
		want = max(1, pool)
	}
	workers := q.workers()
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
	won = won[:min(want, len(won))]
	refined := q.refine(ctx, won, refine, progress)
	best := refined[0]
	for _, c := range refined {
		out.evaluations += c.evaluations
		if c.c != nil && c.better(best) {
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

// mostMemory bounds what all searches at once hold, bytes, roughly.
const mostMemory = 4 << 30

// workers is how many searches run at once; what they find does not depend on it.
func (q *problem) workers() int {
	n := runtime.GOMAXPROCS(0)
	if l, ok := q.gate(false).(*robust.LevelsGate); ok {
		n = min(n, max(1, int(mostMemory/l.Bytes())))
	}
	return n
}

// expected is a rough upper bound of the time of one start: that of its
// evaluations, were they all used. It is shown, and nothing depends on it.
func (q *problem) expected() time.Duration {
	g := q.gate(false)
	p := q.residuals(g)
	if l, ok := g.(*robust.LevelsGate); ok {
		if _, gradient := l.Work(); gradient > 1e9 { // too long for a trial; some multiplications a nanosecond
			return time.Duration(4000 * gradient)
		}
	}
	c := q.start(0).c
	r := make([]float64, p.Rows)
	begun := time.Now()
	p.Residuals(c, r)
	if p.Jacobian == nil {
		p.Gradient(r, make([]float64, p.Dim))
		return 4000 * time.Since(begun)
	}
	p.Jacobian(make([]float64, p.Rows*p.Dim))
	return 300 * time.Since(begun)
}

// solve runs one start on the coarse grid. A start that ends at a small miss is a success like a zero where
// that meets what is required and there is no zero to find, as of a spread, or to find it would take hours.
func (q *problem) solve(ctx context.Context, number int) solve.Result {
	st := q.start(number)
	return q.descend(ctx, false, st.c, solve.Options{Kappa: st.kappa})
}

// What a quasi-Newton search has brought close, some steps of Gauss-Newton finish: they are dear, and see
// the narrow valleys in which the other creeps.
const (
	landing      = 0.1 // the miss under which they are worth it
	landingSteps = 150
)

// descend solves from c on the coarse or the fine grid, by what serves the number of residuals.
func (q *problem) descend(ctx context.Context, fine bool, c []float64, o solve.Options) solve.Result {
	g := q.gate(fine)
	p := q.residuals(g)
	if l, ok := g.(*robust.LevelsGate); ok && fine && l.Fits() { // near the end already
		p.Jacobian = g.Jacobian
	}
	r := solve.GaussNewton(ctx, p, q.set, c, o)
	if p.Jacobian == nil && r.Status != solve.Converged && r.Miss < landing && g.(*robust.LevelsGate).Fits() && ctx.Err() == nil {
		p.Jacobian = g.Jacobian
		o.Iterations = landingSteps
		next := solve.GaussNewton(ctx, p, q.set, r.C, o)
		next.Evaluations += r.Evaluations
		next.Iterations += r.Iterations
		if r.Evaluations = next.Evaluations; next.Miss <= r.Miss {
			r = next
		}
	}
	if r.Status == solve.Stalled || r.Status == solve.Exhausted {
		second := slices.ContainsFunc(q.spin.Held, func(c robust.Class) bool { return c.Order == 2 }) // of which nothing is required
		if (q.spread() || p.Gradient != nil && !second) && q.meets(fine, g, r.C) {
			r.Status = solve.Converged
		}
	}
	return r
}

// withinRequired is the share of what is required that a miss may use up before rounding.
const withinRequired = 0.5

// meets tells whether the samples of c reach what the brief requires of infidelity and
// susceptibilities, on the grid of g.
func (q *problem) meets(fine bool, g evaluator, c []float64) bool {
	a := &q.coarse
	if fine {
		a = &q.fine
	}
	u, v := q.controls(a, q.sampled(c))
	f := g.Figures(u, v)
	if !(f.Infidelity <= withinRequired*q.require.Infidelity) {
		return false
	}
	for i := range q.spin.Held {
		if c := &q.spin.Held[i]; c.Values == nil && c.Noise == nil && !(f.Susceptibility[i] <= withinRequired*q.require.Susceptibility) {
			return false
		}
	}
	return true
}

// spread tells whether the search has no zero to find: with an error that is held over a
// spread of its sizes, or that fluctuates.
func (q *problem) spread() bool {
	return slices.ContainsFunc(q.spin.Held, func(c robust.Class) bool { return c.Values != nil || c.Noise != nil })
}

// finishWork is how many multiplications the refinement of all candidates may take, roughly: some minutes.
const finishWork = 4e10

// pool is how many successes are refined: fewer of dear problems, and none where even one would take too long.
func (q *problem) pool() int {
	l, ok := q.finite(rounds[0][0]).(*robust.LevelsGate)
	if !ok {
		return candidates
	}
	iterations := 0
	for _, st := range rounds[0] {
		iterations += st.iterations
	}
	if l.Many() { // whose iterations gain too little to refine by
		return 0
	}
	jacobian, _ := l.Work()
	return int(math.Min(candidates, finishWork/(jacobian*float64(iterations))))
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
			if ctx.Err() != nil && i > 0 { // one of them is enough to save
				return
			}
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
	for _, s := range stages {
		r := solve.GaussNewton(ctx, q.residuals(q.finite(s)), q.set, c.wide,
			solve.Options{Kappa: refineKappa, Tolerance: -1, Iterations: s.iterations, Stalls: refineStalls})
		c.wide = r.C
		c.evaluations += r.Evaluations
	}
	if len(stages) > 0 {
		q.polish(ctx, c)
	}
	if slices.ContainsFunc(q.spin.Held, func(c robust.Class) bool { return c.Worst }) {
		q.even(ctx, c)
	}
}

// polish brings the first order back to zero on the fine grid. It is short, and
// ends what was begun even when interrupted.
func (q *problem) polish(ctx context.Context, c *candidate) {
	r := q.descend(context.WithoutCancel(ctx), true, c.wide, solve.Options{Iterations: 100})
	c.evaluations += r.Evaluations
	next := candidate{zero: r.Status == solve.Converged, loss: q.loss(r.C)}
	if c.c == nil || next.better(*c) {
		c.c, c.miss, c.zero, c.loss = r.C, r.Miss, next.zero, next.loss
	}
}

// even lowers the largest infidelity over the sizes of errors of which the worst counts:
// those that lose most weigh more the next time (Lawson 1961, thesis, University of
// California, Los Angeles; for least squares in the place of linear problems).
func (q *problem) even(ctx context.Context, c *candidate) {
	const tries = 10
	o := *q
	o.spin.Held = slices.Clone(q.spin.Held)
	x := c.c
	for range tries {
		u, v := q.controls(&q.fine, q.sampled(x))
		for i := range o.spin.Held {
			h := &o.spin.Held[i]
			if !h.Worst {
				continue
			}
			shares, sum := make([]float64, len(h.Values)), 0.0
			for k := range h.Values {
				one := *h
				one.Values, one.Shares = h.Values[k:k+1], []float64{1}
				held := slices.Clone(o.spin.Held)
				held[i] = one
				shares[k] = h.Shares[k] * math.Sqrt(q.evaluator(q.fine.Grid, robust.Response{}, held, 0).MeanInfidelity(u, v, i))
				sum += shares[k]
			}
			if !(sum > 0) {
				return
			}
			for k := range shares {
				shares[k] /= sum
			}
			h.Shares = shares
		}
		r := o.descend(ctx, true, x, solve.Options{Iterations: 60})
		c.evaluations += r.Evaluations
		x = r.C
		next := candidate{zero: r.Status == solve.Converged, loss: q.loss(x)}
		if next.better(*c) {
			c.c, c.miss, c.zero, c.loss = x, r.Miss, next.zero, next.loss
		}
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
	for _, x := range g.Figures(u, v).Noise {
		sum += x
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
