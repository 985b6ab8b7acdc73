package design

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/filter"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// finish rounds the samples to codes and writes the record of the codes.
func (q *problem) finish(in Inputs, out outcome) (*Pulse, error) {
	p := &Pulse{Status: out.status, inputs: in}
	exact := q.sampled(out.c)
	var rounded [][]complex128
	var headroom []Headroom
	for i, l := range q.lanes {
		ch := &in.Profile.Channels[l.channel]
		codes, err := in.Profile.Codes(l.channel, exact[i])
		if err != nil {
			return nil, err
		}
		x, err := in.Profile.Samples(l.channel, codes)
		if err != nil {
			return nil, err
		}
		readings, err := in.Profile.CheckCodes(l.channel, codes)
		if err != nil {
			return nil, err
		}
		for _, r := range readings {
			headroom = append(headroom, Headroom{
				Channel: ch.Name, Limit: string(r.Limit), Unit: r.Unit, Found: r.Found, Allowed: r.Allowed, Share: r.Headroom, Kept: r.OK,
			})
		}
		rounded = append(rounded, x)
		p.Channels = append(p.Channels, Waveform{Channel: l.channel, Exact: played(ch, exact[i]), Codes: codes})
	}
	d, err := drives(in)
	if err != nil {
		return nil, err
	}
	first := &q.lanes[0]
	ch := &in.Profile.Channels[first.channel]
	b := in.Brief
	n := first.basis.Count
	record := Record{
		Format: 1,
		Pulse: PulseFacts{
			Name: b.Name, Target: target(in),
			Span: quantity.Format(b.Span, quantity.Time), HeldByDefault: b.Defaulted, Status: string(out.status),
			Held: []string{},
		},
		Basis: BasisFacts{Family: first.basis.Family, PerQuad: n, I: out.c[:n], Q: []float64{}},
		Search: SearchFacts{
			Seed: b.Seed, Starts: b.Starts, Tried: out.tried, Successes: out.successes, Winner: out.winner,
			Evaluations: out.evaluations, Equations: q.gate(false).Rows(), Solver: q.solver(), Refined: out.refined, Miss: out.miss,
		},
		Require: RequireFacts{Infidelity: b.Require.Infidelity, Susceptibility: b.Require.Susceptibility},
		Provenance: ProvenanceFacts{
			Program: "holdfast", Version: in.Version, Instrument: in.Profile.Name, Device: in.Device.Name,
			Site: sites(in), Channel: ch.Name,
		},
	}
	if first.quadratures == 2 {
		record.Basis.Q = out.c[n : 2*n]
	}
	if !math.IsInf(ch.Band, 1) {
		record.Basis.Band = quantity.Format(ch.Band, quantity.Frequency)
	}
	if math.IsInf(out.miss, 0) {
		record.Search.Miss = 1e300 // nothing was evaluated
	}
	for i, l := range q.lanes {
		ch := &in.Profile.Channels[l.channel]
		if n := in.Profile.Shift(l.channel); n > 0 {
			record.Pulse.Delays = append(record.Pulse.Delays, DelayFacts{Channel: ch.Name, Samples: n})
		}
		if i > 0 {
			n := l.basis.Count
			more := MoreBasis{Channel: ch.Name, Family: l.basis.Family, I: out.c[l.first : l.first+n]}
			if l.quadratures == 2 {
				more.Q = out.c[l.first+n : l.first+2*n]
			}
			record.Basis.More = append(record.Basis.More, more)
		}
	}
	for _, e := range b.Errors {
		record.Pulse.Held = append(record.Pulse.Held, e.Name)
	}
	for _, m := range b.Require.Margins {
		f := MarginFacts{Error: m.Error}
		e := named(b, m.Error)
		switch e.Kind {
		case brief.Amplitude, brief.Line:
			f.Share = m.Size
		case brief.Skew:
			f.Angle = m.Size
		case brief.Offset: // a share of full scale at the converter, as the rate that it drives
			if i, ok := in.Profile.Channel(e.Channels[0]); ok {
				ch := &in.Profile.Channels[i]
				f.Rate = m.Size * math.Abs(atRest(in, ch)) * cmplx.Abs(ch.Line.DC())
			}
		default:
			f.Rate = m.Size
		}
		record.Require.Margins = append(record.Require.Margins, f)
	}
	for _, s := range in.Device.Sites {
		if s.T1 > 0 || s.T2 > 0 {
			record.Decoherence = append(record.Decoherence, DecayFacts{Site: s.Name, T1: s.T1, T2: s.T2})
		}
	}
	record.Headroom = headroom
	record.Model = q.model(in, d)
	if err := q.claim(&record, in, exact, rounded); err != nil {
		return nil, err
	}
	p.Record = record
	if b.PhaseBy == brief.BySamples {
		return p, q.turn(p, in, d, exact)
	}
	return p, nil
}

// solver names the method of the search.
func (q *problem) solver() string {
	if q.residuals(q.gate(false)).Jacobian == nil {
		return "quasi-Newton"
	}
	return "Gauss-Newton"
}

// target says in words what the pulse is to do.
func target(in Inputs) string {
	words := in.Brief.Target.Label + " on " + sites(in)
	if in.Brief.Target.Local {
		words += " up to local rotations"
	}
	return words
}

// sites names the sites of the target: of states all of the device.
func sites(in Inputs) string {
	names := in.Brief.Target.Sites
	if in.Brief.Target.From != nil {
		names = nil
		for _, s := range in.Device.Sites {
			names = append(names, s.Name)
		}
	}
	return strings.Join(names, ", ")
}

// turn adds the waveforms of the gate at the angles that the brief asks for. The
// search kept the limits of every one of them.
func (q *problem) turn(p *Pulse, in Inputs, d []driven, exact [][]complex128) error {
	for _, angle := range in.Brief.Phases {
		t := Turned{Angle: angle}
		facts := PhaseFacts{Angle: angle * 180 / math.Pi, Kept: true}
		var rounded [][]complex128
		for i, l := range q.lanes {
			ch := &in.Profile.Channels[l.channel]
			x := exact[i]
			if l.quadratures == 2 {
				x = make([]complex128, len(exact[i]))
				for k, v := range exact[i] {
					x[k] = v * cmplx.Rect(1, sense(d)*angle)
				}
			}
			codes, err := in.Profile.Codes(l.channel, x)
			if err != nil {
				return err
			}
			readings, err := in.Profile.CheckCodes(l.channel, codes)
			if err != nil {
				return err
			}
			facts.Kept = facts.Kept && hardware.Kept(readings)
			y, err := in.Profile.Samples(l.channel, codes)
			if err != nil {
				return err
			}
			rounded = append(rounded, y)
			t.Channels = append(t.Channels, Waveform{Channel: l.channel, Exact: played(ch, x), Codes: codes})
		}
		a, err := q.axis(claimShare, q.settled)
		if err != nil {
			return err
		}
		u, _ := q.controls(&a, rounded)
		facts.Infidelity = q.turned(angle).evaluator(a.Grid, robust.Response{}, nil, 0).Figures(u, nil).Infidelity
		p.Turned = append(p.Turned, t)
		p.Record.Pulse.Phases = append(p.Record.Pulse.Phases, facts)
	}
	return nil
}

// turned is the problem of the same gate with its axis turned about Z.
func (q *problem) turned(angle float64) *problem {
	o := *q
	z := dynamics.Turn(dynamics.Vec{0, 0, angle})
	o.spin.Target = z.Mul(q.spin.Target).Mul(z.Conj())
	if q.levels != nil { // D T D', D = exp(-i angle Z/2)
		l := *q.levels
		l.Target = append([]complex128(nil), l.Target...)
		l.Target[1] *= cmplx.Rect(1, -angle)
		l.Target[2] *= cmplx.Rect(1, angle)
		o.levels = &l
	}
	return &o
}

// named finds an error of the brief by its name, or makes one of those that are
// judged undeclared.
func named(b *brief.Brief, name string) brief.Error {
	for _, e := range b.Errors {
		if e.Name == name {
			return e
		}
	}
	if name == "amplitude" {
		return brief.Error{Name: name, Kind: brief.Amplitude}
	}
	return brief.Error{Name: name, Kind: brief.Static}
}

// model writes down what an outsider needs.
func (q *problem) model(in Inputs, d []driven) Model {
	m := Model{
		SamplePeriod: in.Profile.SamplePeriod, Samples: q.samples, Bits: in.Profile.Bits, Ends: in.Brief.Ends,
		WindowStart: opening(in.Profile, d), Dim: in.Device.Dim(), CodeSpace: in.Device.CodeSpace(),
		Static: rowsOf(in.Device.Static()), FreeZBefore: []float64{}, FreeZAfter: []float64{},
		Rotating: turning(in.Device.Rotating()), Dropped: turning(in.Device.Dropped()),
	}
	if len(in.Device.Sites) > 1 {
		m.Sites = in.Device.Levels()
	}
	if t := &in.Brief.Target; t.From == nil {
		m.Target = rowsOf(t.Whole)
	} else {
		m.From, m.To = vectors(t.From), vectors(t.To)
	}
	stems := map[string]bool{}
	for i, l := range q.lanes {
		ch := &in.Profile.Channels[l.channel]
		stem := fileStem(ch.Name)
		for n := 2; stems[stem]; n++ { // two names may leave the same letters
			stem = fmt.Sprintf("%s-%d", fileStem(ch.Name), n)
		}
		stems[stem] = true
		mc := ModelChannel{
			Name: ch.Name, Kind: ch.Kind, Codes: stem + ".npy", Exact: stem + "-exact.npy",
			FullScale: ch.FullScale, Delay: in.Profile.Start(l.channel), LineModel: lineOf(ch.Line),
			MaxShare: ch.AmplitudeLimit, MaxSlew: finite(ch.SlewLimit), RingOut: finite(ch.RingOut.Limit),
			GuardLead: ch.GuardLead, GuardTrail: ch.GuardTrail,
		}
		if ch.Envelope == hardware.Box {
			mc.Envelope = ch.Envelope
		}
		if ch.RMSLimit > 0 {
			n := q.samples
			if ch.RMSPeriod > 0 {
				n = max(n, int(math.Floor(ch.RMSPeriod/in.Profile.SamplePeriod+1e-9)))
			}
			mc.RMS, mc.RMSSamples = &ch.RMSLimit, n
		}
		if tail := ch.RingOut.Tail; tail > 0 && tail != ch.RingOut.Limit {
			mc.RingOutTail, mc.RingOutFast = &tail, &ch.RingOut.Fast
		}
		if ch.OutOfBand > 0 {
			mc.OutOfBand, mc.Band = &ch.OutOfBand, &ch.Band
		}
		mc.ZeroMean = ch.ZeroMean
		for _, pt := range ch.Compression {
			mc.Compression = append(mc.Compression, [2]float64{pt.Converter, pt.Reached})
		}
		if ch.Shift != 0 {
			mc.Shift, mc.ShiftOperator = &ch.Shift, rowsOf(in.Device.ShiftOperator(ch.Name))
		}
		if b := in.Device.Map(ch.Name); b != nil {
			mc.MapPolynomial = b.Polynomial
			if l := b.Loop; l != nil {
				mc.MapLoop = []float64{l.Highest, l.Bias, l.FullScale, l.Asymmetry}
			}
		}
		for _, p := range d[i].paths {
			mp := ModelPath{Frequency: p.frequency}
			for _, op := range p.operators {
				mp.Operators = append(mp.Operators, rowsOf(op))
			}
			mc.Paths = append(mc.Paths, mp)
		}
		for _, op := range d[i].operators {
			mc.Operators = append(mc.Operators, rowsOf(op))
		}
		m.Channels = append(m.Channels, mc)
	}
	known := map[string]bool{}
	for i, e := range in.Brief.Errors {
		known[e.Name] = true
		r := ModelError{Name: e.Name, Held: true, Kind: e.Kind, Channels: e.Channels, Quadrature: e.Quadrature}
		switch e.Kind {
		case brief.Static:
			r.Operator = rowsOf(e.Members[0].Operator)
		case brief.Any:
			if q.levels == nil {
				break
			}
			r.Leaks = e.Leak
			for _, m := range e.Members {
				r.Operators, r.Names, r.Weights = append(r.Operators, rowsOf(m.Operator)), append(r.Names, m.Name), append(r.Weights, m.Weight)
			}
		case brief.Crosstalk:
			r.Channels, r.Channel = nil, e.Channels[0]
			for _, op := range e.Reach {
				r.Operators = append(r.Operators, rowsOf(op))
			}
		case brief.Offset: // a static error along what the quadrature drives
			r.Kind, r.Channels, r.Quadrature = brief.Static, nil, ""
			for k, x := range d {
				if in.Profile.Channels[x.channel].Name == e.Channels[0] {
					op := 0
					if e.Quadrature == "Q" {
						op = 1
					}
					r.Operator = rowsOf(d[k].operators[op])
				}
			}
		case brief.Line:
			r.Channels, r.Channel = nil, e.Channels[0]
			l := lineOf(q.slopes[i].feed.line)
			r.LineModel = &l
		}
		if e.Order == 2 {
			r.Order = 2
		}
		if e.Spread != "" {
			r.Spread = e.Spread
			r.SpreadValues, r.SpreadShares = spread(&e)
			if e.Kind == brief.Offset {
				ch := &in.Profile.Channels[d[on(in.Profile, d, e.Channels[0])].channel]
				scaleAll(r.SpreadValues, atRest(in, ch)*cmplx.Abs(ch.Line.DC()))
			}
		}
		if e.Noise != nil {
			for _, n := range nodes(e.Noise, in.Brief.Span, claimNodes) {
				r.NoiseFrequencies, r.NoiseWeights = append(r.NoiseFrequencies, n.Frequency), append(r.NoiseWeights, n.Weight)
			}
		}
		m.Errors = append(m.Errors, r)
	}
	for _, name := range []string{"detuning", "amplitude", "X", "Y", "Z"} {
		if known[name] || in.Device.Dim() > 2 || q.levels != nil || name == "amplitude" && curves(d) != nil { // of one spin all of these are judged
			continue
		}
		r := ModelError{Name: name, Kind: brief.Static}
		switch name {
		case "amplitude":
			r.Kind = brief.Amplitude
		case "detuning":
			r.Operator = rowsOf(half("Z"))
		default:
			r.Operator = rowsOf(half(name))
		}
		m.Errors = append(m.Errors, r)
	}
	return m
}

func lineOf(l filter.Line) LineModel {
	m := LineModel{Direct: pair(l.Direct), Poles: []Complex{}, Powers: []int{}, Residues: []Complex{}}
	for _, t := range l.Terms {
		m.Poles = append(m.Poles, pair(t.Pole))
		m.Powers = append(m.Powers, t.Power)
		m.Residues = append(m.Residues, pair(t.Residue))
	}
	return m
}

// turning writes down terms that rotate.
func turning(list []device.Rotating) (m []ModelRotating) {
	for _, r := range list {
		m = append(m, ModelRotating{r.Frequency, rowsOf(r.Cosine), rowsOf(r.Sine)})
	}
	return m
}

func vectors(list [][]complex128) (m [][]Complex) {
	for _, v := range list {
		row := make([]Complex, len(v))
		for i, z := range v {
			row[i] = pair(z)
		}
		m = append(m, row)
	}
	return m
}

func half(name string) device.Matrix {
	op, _ := device.Operator(name)
	return op.Scale(0.5)
}

// pair writes a complex number down; adding zero turns minus zero into zero.
func pair(z complex128) Complex { return Complex{real(z) + 0, imag(z) + 0} }

func rowsOf(m device.Matrix) [][]Complex {
	rows := make([][]Complex, m.N)
	for i := range rows {
		for j := range m.N {
			rows[i] = append(rows[i], pair(m.At(i, j)))
		}
	}
	return rows
}

// claim fills in what the record says of the rounded codes.
func (q *problem) claim(r *Record, in Inputs, exact, rounded [][]complex128) error {
	s := q.spin
	s.Held = nil
	var slopes []*slope
	declared := len(in.Brief.Errors)
	for i, e := range r.Model.Errors {
		if i < declared {
			c := q.spin.Held[i]
			c.Weight = 1
			if b := &in.Brief.Errors[i]; b.Noise != nil {
				c.Noise = nodes(b.Noise, in.Brief.Span, claimNodes)
			}
			s.Held, slopes = append(s.Held, c), append(slopes, q.slopes[i])
			continue
		}
		c := robust.Class{Name: e.Name, Weight: 1}
		if e.Kind == brief.Amplitude {
			c.Kind = robust.Amplitude
		} else {
			c.Vector = pauli(matrixOf(e.Operator))
		}
		s.Held, slopes = append(s.Held, c), append(slopes, nil)
	}
	all := *q
	all.slopes = slopes
	axes := map[string]axis{}
	for _, ends := range []string{brief.Settled, brief.Window} {
		a, err := q.axis(claimShare, ends == brief.Settled)
		if err != nil {
			return err
		}
		axes[ends] = a
	}
	on := func(ends string, x [][]complex128) (evaluator, []float64, [][]float64) {
		a := axes[ends]
		u, v := all.controls(&a, x)
		return q.evaluator(a.Grid, robust.Response{}, s.Held, 0), u, v
	}
	figures := func(ends string, x [][]complex128) robust.Figures {
		g, u, v := on(ends, x)
		return g.Figures(u, v)
	}
	other := brief.Window
	if in.Brief.Ends == brief.Window {
		other = brief.Settled
	}
	g, u, v := on(in.Brief.Ends, rounded)
	f := g.Figures(u, v)
	for i := range in.Brief.Errors {
		e, c := &r.Model.Errors[i], &s.Held[i]
		if c.Noise != nil {
			e.NoiseInfidelity = &f.Noise[i]
		}
		if c.Values == nil {
			continue
		}
		loss := g.MeanInfidelity(u, v, i)
		e.SpreadInfidelity = &loss
	}
	r.Claim.Infidelity, r.Claim.Leakage = f.Infidelity, f.Leakage
	r.Search.Before = figures(in.Brief.Ends, exact).Infidelity
	for i := range r.Model.Errors {
		r.Model.Errors[i].Susceptibility = f.Susceptibility[i]
	}
	if q.levels != nil { // whose ring-out turns by no single angle
		if q.levels.Local {
			r.Model.LocalBefore, r.Model.LocalAfter = locals(f.Rotations.Before), locals(f.Rotations.After)
		} else {
			r.Model.FreeZBefore = append(r.Model.FreeZBefore, robust.Angles(f.Rotations.Before)...)
			r.Model.FreeZAfter = append(r.Model.FreeZAfter, robust.Angles(f.Rotations.After)...)
		}
		if len(in.Device.CodeSpace()) < in.Device.Dim() {
			for i := range r.Model.Errors {
				if !r.Model.Errors[i].Leaks { // of which it is the susceptibility itself
					r.Model.Errors[i].Leak = &f.Leak[i]
				}
			}
		}
		// the free rotations are those of the stated ends, whatever the ends
		g, u, _ = on(other, rounded)
		r.Claim.InfidelityOtherEnds = g.(*robust.LevelsGate).InfidelityAt(u, f.Rotations)
		return nil
	}
	if s.FreeBefore {
		r.Model.FreeZBefore = []float64{f.Before}
	}
	if s.FreeAfter {
		r.Model.FreeZAfter = []float64{f.After}
	}
	spin := func(ends string) (*robust.Gate, []float64) {
		a, t := axes[ends], s
		t.Grid, t.Held = a.Grid, nil
		u, _ := q.controls(&a, rounded)
		return robust.NewGate(t, robust.Response{}, 0), u
	}
	// the free angles are those of the stated ends, whatever the ends
	elsewhere, arrives := spin(other)
	r.Claim.InfidelityOtherEnds = elsewhere.InfidelityAt(arrives, f.Before, f.After)
	gate := func(ends string) dynamics.Quat {
		g, u := spin(ends)
		// What arrives before the window, of channels that are early, is no ring-out.
		a := axes[ends]
		for c := 0; c < len(u); c += a.nodes() {
			clear(u[c : c+len(dynamics.GaussNodes)*a.First])
		}
		return g.Unitary(u)
	}
	tail := gate(brief.Settled).Mul(gate(brief.Window).Conj())
	angle := 2 * math.Atan2(math.Sqrt(tail[1]*tail[1]+tail[2]*tail[2]+tail[3]*tail[3]), math.Abs(tail[0]))
	r.Claim.TailAngle = &angle
	return nil
}

// locals writes down rotations of the sites.
func locals(list [][4]complex128) (m [][][]Complex) {
	for _, r := range list {
		m = append(m, [][]Complex{{pair(r[0]), pair(r[1])}, {pair(r[2]), pair(r[3])}})
	}
	return m
}

func matrixOf(rows [][]Complex) device.Matrix {
	m := device.Zero(len(rows))
	for i, row := range rows {
		for j, z := range row {
			m.Data[i*m.N+j] = complex(z[0], z[1])
		}
	}
	return m
}

// Summary says in a sentence how the search went.
func (p *Pulse) Summary() string {
	s := p.Record.Search
	switch p.Status {
	case Found:
		if s.Miss > 1e-12 { // of a spread or a noise, or of very many residuals
			return fmt.Sprintf("found: %d of %d starts ended where the requirements are met; start %d was kept, at a miss of %.3g", s.Successes, s.Tried, s.Winner, math.Sqrt(s.Miss))
		}
		return fmt.Sprintf("found: %d of %d starts ended at a zero; start %d was kept", s.Successes, s.Tried, s.Winner)
	case Interrupted:
		return fmt.Sprintf("interrupted after %d starts; the best so far misses by %.3g", s.Tried, math.Sqrt(s.Miss))
	}
	return fmt.Sprintf("not found: %d starts, the best of them misses by %.3g (root of the sum of squared residuals)", s.Tried, math.Sqrt(s.Miss))
}

// played gives what the converter has to put out for the drive to reach y.
func played(ch *hardware.Channel, y []complex128) []complex128 {
	x := make([]complex128, len(y))
	for k, v := range y {
		x[k] = ch.Compression.Converter(v)
	}
	return x
}
