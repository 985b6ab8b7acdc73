package design

import (
	"fmt"
	"math"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// finish rounds the samples to codes and writes the record of the codes.
func (q *problem) finish(in Inputs, out outcome) (*Pulse, error) {
	exact := q.sampled(out.c)
	codes, err := hardware.QuantiseAll(exact, in.Profile.Bits)
	if err != nil {
		return nil, err
	}
	rounded, err := hardware.SamplesOf(codes, in.Profile.Bits)
	if err != nil {
		return nil, err
	}
	readings, err := in.Profile.CheckCodes(q.channel, codes)
	if err != nil {
		return nil, err
	}
	ch := &in.Profile.Channels[q.channel]
	_, operators, err := drive(in)
	if err != nil {
		return nil, err
	}
	b := in.Brief
	n := q.basis.Count
	record := Record{
		Format: 1,
		Pulse: PulseFacts{
			Name: b.Name, Target: b.Target.Label + " on " + b.Target.Site,
			Span: quantity.Format(b.Span, quantity.Time), HeldByDefault: b.Defaulted, Status: string(out.status),
			Held: []string{},
		},
		Basis: BasisFacts{Family: q.basis.Family, PerQuad: n, I: out.c[:n], Q: out.c[n:]},
		Search: SearchFacts{
			Seed: b.Seed, Starts: b.Starts, Tried: out.tried, Successes: out.successes, Winner: out.winner,
			Evaluations: out.evaluations, Equations: q.gate(false).Rows(), Refined: out.refined, Miss: out.miss,
		},
		Require: RequireFacts{Infidelity: b.Require.Infidelity, Susceptibility: b.Require.Susceptibility},
		Provenance: ProvenanceFacts{
			Program: "holdfast", Version: in.Version, Instrument: in.Profile.Name, Device: in.Device.Name,
			Site: b.Target.Site, Channel: ch.Name,
		},
	}
	if !math.IsInf(ch.Band, 1) {
		record.Basis.Band = quantity.Format(ch.Band, quantity.Frequency)
	}
	if math.IsInf(out.miss, 0) {
		record.Search.Miss = 1e300 // nothing was evaluated
	}
	for _, e := range b.Errors {
		record.Pulse.Held = append(record.Pulse.Held, e.Name)
	}
	for _, m := range b.Require.Margins {
		f := MarginFacts{Error: m.Error}
		if q.isAmplitude(b, m.Error) {
			f.Share = m.Size
		} else {
			f.Rate = m.Size
		}
		record.Require.Margins = append(record.Require.Margins, f)
	}
	for _, s := range in.Device.Sites {
		if s.Name == b.Target.Site && (s.T1 > 0 || s.T2 > 0) {
			record.Decoherence = &DecayFacts{T1: s.T1, T2: s.T2}
		}
	}
	for _, r := range readings {
		record.Headroom = append(record.Headroom, Headroom{
			Channel: ch.Name, Limit: string(r.Limit), Unit: r.Unit, Found: r.Found, Allowed: r.Allowed, Share: r.Headroom, Kept: r.OK,
		})
	}
	record.Model = q.model(in, operators)
	q.claim(&record, in, exact, rounded)
	return &Pulse{Status: out.status, Record: record, Exact: exact, Codes: codes, Channel: q.channel, inputs: in}, nil
}

func (q *problem) isAmplitude(b *brief.Brief, name string) bool {
	for _, e := range b.Errors {
		if e.Name == name {
			return e.Kind == brief.Amplitude
		}
	}
	return name == "amplitude"
}

// model writes down what an outsider needs.
func (q *problem) model(in Inputs, operators [2]device.Matrix) Model {
	ch := &in.Profile.Channels[q.channel]
	stem := fileStem(ch.Name)
	mc := ModelChannel{
		Name: ch.Name, Kind: ch.Kind, Codes: stem + ".npy", Exact: stem + "-exact.npy",
		FullScale: ch.FullScale, Delay: in.Profile.Start(q.channel), Direct: pair(ch.Line.Direct),
		Poles: []Complex{}, Powers: []int{}, Residues: []Complex{},
		MaxShare: ch.AmplitudeLimit, MaxSlew: finite(ch.SlewLimit), RingOut: finite(ch.RingOut.Limit),
		GuardLead: ch.GuardLead, GuardTrail: ch.GuardTrail,
	}
	for _, t := range ch.Line.Terms {
		mc.Poles = append(mc.Poles, pair(t.Pole))
		mc.Powers = append(mc.Powers, t.Power)
		mc.Residues = append(mc.Residues, pair(t.Residue))
	}
	for _, op := range operators {
		mc.Operators = append(mc.Operators, rowsOf(op))
	}
	m := Model{
		SamplePeriod: in.Profile.SamplePeriod, Samples: q.samples, Bits: in.Profile.Bits, Ends: in.Brief.Ends,
		WindowStart: in.Profile.Start(q.channel), Dim: in.Device.Dim(), CodeSpace: []int{0, 1},
		Static: rowsOf(in.Device.Static()), Target: rowsOf(in.Brief.Target.Matrix),
		FreeZBefore: []float64{}, FreeZAfter: []float64{}, Channels: []ModelChannel{mc},
	}
	known := map[string]bool{}
	for _, e := range in.Brief.Errors {
		known[e.Name] = true
		r := ModelError{Name: e.Name, Held: true, Kind: e.Kind, Channels: e.Channels}
		if e.Kind == brief.Static {
			r.Operator = rowsOf(e.Operator)
		}
		m.Errors = append(m.Errors, r)
	}
	for _, name := range []string{"detuning", "amplitude", "X", "Y", "Z"} {
		if known[name] {
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
func (q *problem) claim(r *Record, in Inputs, exact, rounded []complex128) {
	s := q.spin
	s.Held = nil
	for _, e := range r.Model.Errors {
		c := robust.Class{Name: e.Name, Weight: 1}
		switch e.Kind {
		case brief.Static:
			c.Vector = pauli(matrixOf(e.Operator))
		case brief.Amplitude:
			c.Kind = robust.Amplitude
		case brief.Any:
			c.Kind = robust.Any
		}
		s.Held = append(s.Held, c)
	}
	figures := func(a axis, x []complex128) robust.Figures {
		t := s
		t.Grid = a.Grid
		return robust.NewGate(t, robust.Response{}, 0).Figures(a.controls(q, x))
	}
	ch := &in.Profile.Channels[q.channel]
	full := math.Max(length(s.Axes[0]), length(s.Axes[1]))
	static := length(s.Static)
	axes := map[string]axis{}
	for _, ends := range []string{brief.Settled, brief.Window} {
		axes[ends] = newAxis(ch.Line, q.samples, in.Profile.SamplePeriod, claimShare, ends == brief.Settled, full, static, q.after())
	}
	other := brief.Window
	if in.Brief.Ends == brief.Window {
		other = brief.Settled
	}
	f := figures(axes[in.Brief.Ends], rounded)
	r.Claim.Infidelity = f.Infidelity
	r.Claim.InfidelityOtherEnds = figures(axes[other], rounded).Infidelity
	r.Search.Before = figures(axes[in.Brief.Ends], exact).Infidelity
	for i := range r.Model.Errors {
		r.Model.Errors[i].Susceptibility = f.Susceptibility[i]
	}
	gate := func(ends string) dynamics.Quat {
		t := q.spin
		t.Held = nil
		a := axes[ends]
		t.Grid = a.Grid
		return robust.NewGate(t, robust.Response{}, 0).Unitary(a.controls(q, rounded))
	}
	tail := gate(brief.Settled).Mul(gate(brief.Window).Conj())
	r.Claim.TailAngle = 2 * math.Atan2(math.Sqrt(tail[1]*tail[1]+tail[2]*tail[2]+tail[3]*tail[3]), math.Abs(tail[0]))
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
		return fmt.Sprintf("found: %d of %d starts ended at a zero; start %d was kept", s.Successes, s.Tried, s.Winner)
	case Interrupted:
		return fmt.Sprintf("interrupted after %d starts; the best so far misses by %.3g", s.Tried, math.Sqrt(s.Miss))
	}
	return fmt.Sprintf("not found: %d starts, the best of them misses by %.3g (root of the sum of squared residuals)", s.Tried, math.Sqrt(s.Miss))
}
