package replay

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"
)

// How far a verdict may lie from the record's claim, both on the rounded codes.
const (
	infidelityAgreement     = 1e-9
	fluctuationAgreement    = 1e-4 // of the figure itself, beside
	susceptibilityAgreement = 1e-5
	tailAgreement           = 1e-4 // rad
)

// Figures recomputes the gate itself: its figures for settled and for window ends, and the angle in rad that the ring-out turns
// after the window.
func (m *Model) Figures(ctx context.Context) (settled, window Figures, tail float64, err error) {
	e, err := newEngine(ctx, m)
	if err != nil {
		return Figures{}, Figures{}, 0, err
	}
	return e.both(ctx)
}

func (e *engine) both(ctx context.Context) (settled, window Figures, tail float64, err error) {
	err = e.run(ctx, []gate{{}}, func(l *labour, _ int, u []complex128) {
		window = e.figuresOf(l, u)
		settled = e.figuresOf(l, e.settle(l, u))
	})
	return settled, window, angle(e.post, e.dim), err
}

// Pair plays the pulse twice without a gap, always settled at the end. Where no rotation of the frame turns the drive's phase (a
// static part along X, say) only one phase is judged, and Judge says so in a warning. Where free Z angles are no such rotation, where local
// rotations are free, for a target of states and where the Hamiltonian turns by itself there is an error.
func (m *Model) Pair(ctx context.Context) (Pair, error) {
	e, err := newEngine(ctx, m)
	if err != nil {
		return Pair{}, err
	}
	p, err := e.pair(ctx)
	if err == errNoTurn {
		err = nil
	}
	return p, err
}

// notJudged says whether an error of pair is one for which there is no pair, and not a failure.
func notJudged(err error) bool {
	return err == errNoFrame || err == errNoSquare || err == errNoFollow || err == errTurning
}

// Curves judges the model's error classes as Judge does, margins against the given infidelity, and draws the curve of each over
// the same values as the error of that name in like; so a rival's curves overlay those of a verdict. A nil like lets each
// curve choose its own range.
func (m *Model) Curves(ctx context.Context, infidelity float64, like []Error) ([]Error, error) {
	e, err := newEngine(ctx, m)
	if err != nil {
		return nil, err
	}
	return e.errors(ctx, infidelity, like)
}

// Judge recomputes everything that the verdict tells. The only errors are those of the context and of lines that cannot be integrated; what
// is wrong with the pulse stands in the verdict.
func Judge(ctx context.Context, f *Folder) (*Verdict, error) {
	v, err := f.Model.judge(ctx, f.Require.Infidelity, f.Require.Margins)
	if err != nil {
		return nil, err
	}
	v.Name = f.Name
	v.Decoherence = f.Decoherence()
	v.agree(f)
	if v.Inputs, err = f.differences(); err != nil {
		return nil, err
	}
	v.require(f.Require)
	return v, nil
}

// Judge recomputes what can be told of a model alone: no agreement, inputs, requirements or decoherence. Margins are
// against the given infidelity.
func (m *Model) Judge(ctx context.Context, infidelity float64) (*Verdict, error) {
	return m.judge(ctx, infidelity, nil)
}

func (m *Model) judge(ctx context.Context, infidelity float64, required []Margin) (*Verdict, error) {
	e, err := newEngine(ctx, m)
	if err != nil {
		return nil, err
	}
	e.farthest = m.farthest(required)
	v := &Verdict{Ends: m.Ends, Measure: m.measure()}
	if v.Settled, v.Window, v.TailAngle, err = e.both(ctx); err != nil {
		return nil, err
	}
	if e.left > settledAngle {
		v.Warnings = append(v.Warnings, fmt.Sprintf("The lines had not settled when the integration was ended: up to %.2g rad were still to come.", e.left))
	}
	if v.Pair, err = e.pair(ctx); err == errNoTurn || notJudged(err) {
		v.Warnings = append(v.Warnings, sentence(err))
		if err != errNoTurn {
			v.Pair = Pair{math.NaN(), math.NaN()}
		}
	} else if err != nil {
		return nil, err
	}
	if err := v.putBack(ctx, m, infidelity); err != nil {
		return nil, err
	}
	if v.Limits, err = m.Limits(ctx); err != nil {
		return nil, err
	}
	if v.Errors, err = e.errors(ctx, infidelity, nil); err != nil {
		return nil, err
	}
	if v.BringUp, err = e.bringUp(ctx); err != nil {
		return nil, err
	}
	worst := 0.0
	if err := e.run(ctx, []gate{{}}, func(_ *labour, _ int, u []complex128) { worst = defect(u, e.dim) }); err != nil {
		return nil, err
	}
	if !(worst <= 1e-11) {
		v.Warnings = append(v.Warnings, fmt.Sprintf("The integration has lost unitarity by %.2g.", worst))
	}
	return v, nil
}

// measure says what the infidelity of a model means.
func (m *Model) measure() string {
	switch len(m.From) {
	case 0:
		return "gate"
	case 1:
		return "state"
	}
	return "subspace"
}

// putBack judges the model with the terms that it leaves out.
func (v *Verdict) putBack(ctx context.Context, m *Model, infidelity float64) error {
	if len(m.Dropped) == 0 {
		return nil
	}
	// These turn fast, and what they cost is compared with nothing that has many digits.
	var settled, window Figures
	e, err := newEngineTo(ctx, m.WithDropped(), roughTolerance, nearlyAngle)
	if err == nil {
		settled, window, _, err = e.both(ctx)
	}
	if err == errTooFast || err == errTooLong {
		v.Warnings = append(v.Warnings, "The rotating terms that the model leaves out turn too fast to be put back: what they cost is not judged.")
		return nil
	}
	if err != nil {
		return err
	}
	v.Dropped = &settled
	if m.Ends == "window" {
		v.Dropped = &window
	}
	if !(v.Dropped.Infidelity <= infidelity) && v.Required().Infidelity <= infidelity {
		v.Warnings = append(v.Warnings, fmt.Sprintf("With the rotating terms that the model leaves out put back the infidelity is %.3g, more than what is required.", v.Dropped.Infidelity))
	}
	return nil
}

// WithDropped gives the model with the rotating terms that it leaves out put back.
func (m *Model) WithDropped() *Model {
	other := *m
	other.Rotating, other.Dropped = slices.Concat(m.Rotating, m.Dropped), nil
	slices.SortStableFunc(other.Rotating, func(a, b Rotating) int { return cmp.Compare(a.Frequency, b.Frequency) })
	return &other
}

// sentence makes a warning of an error.
func sentence(err error) string {
	s := err.Error()
	return string(s[0]-'a'+'A') + s[1:] + "."
}

// Decoherence is what relaxation adds to every coherent infidelity of a spin to first order, T/6 (1/T1 + 2/T2) = T/(3 T1) +
// T/(3 T_phi) (common practice; exact for an idle spin to first order), for a span T and times in ns. Where only T1 is stated, T2 is taken as
// 2 T1, the longest that it can be; where only T2 is, T1 as endless. Without either it is zero.
func Decoherence(span, t1, t2 float64) float64 {
	sum := 0.0
	if t1 > 0 {
		sum += 1 / t1
		if t2 <= 0 {
			t2 = 2 * t1
		}
	}
	if t2 > 0 {
		sum += 2 / t2
	}
	return span / 6 * sum
}

// Decoherence is what relaxation of the sites adds to every coherent infidelity to first order, for a code space of d states
//
//	d/(d+1) sum over sites ( T/(2 T1) + T/(2 T_phi) ),   1/T_phi = 1/T2 - 1/(2 T1)
//
// (from the average over states of what idle spins lose, each by itself): of one spin it is the function of that name, whose conventions about
// times that are not stated hold for every site.
func (f *Folder) Decoherence() float64 {
	sum := 0.0
	for _, s := range f.Decay {
		sum += Decoherence(f.Model.Span(), s.T1, s.T2)
	}
	d := float64(len(f.Model.CodeSpace))
	return 1.5 * d / (d + 1) * sum
}

// agree compares the verdict with the record's claim.
func (v *Verdict) agree(f *Folder) {
	a := &v.Agreement
	most := math.Inf(-1)
	apart := func(worst *float64, figure string, found, claimed, allowed float64) {
		if math.IsNaN(claimed) {
			return
		}
		off := math.Abs(found - claimed)
		*worst = math.Max(*worst, off)
		if math.IsNaN(off) { // nothing is worse
			off = math.Inf(1)
		}
		if off/allowed > most {
			most = off / allowed
			a.Worst = Disagreement{figure, found, claimed, allowed}
		}
	}
	stated, other, ends := v.Settled, v.Window, [2]string{"settled", "in the window"}
	if v.Ends == "window" {
		stated, other, ends = other, stated, [2]string{ends[1], ends[0]}
	}
	apart(&a.Infidelity, "infidelity, "+ends[0], stated.Infidelity, f.Claim.Infidelity, infidelityAgreement)
	apart(&a.Infidelity, "infidelity, "+ends[1], other.Infidelity, f.Claim.InfidelityOtherEnds, infidelityAgreement)
	apart(&a.Infidelity, "leakage, "+ends[0], stated.Leakage, f.Claim.Leakage, infidelityAgreement)
	apart(&a.TailAngle, "tail angle in rad", v.TailAngle, f.Claim.TailAngle, tailAgreement)
	for _, c := range f.Model.Errors {
		for _, e := range v.Errors {
			if c.claimed && e.Name == c.Name {
				apart(&a.Susceptibility, "susceptibility to "+e.Name, e.Susceptibility, c.Susceptibility, susceptibilityAgreement)
			}
			if c.claimedLeak && e.Name == c.Name && e.LeakSusceptibility != nil {
				apart(&a.Susceptibility, "leak susceptibility to "+e.Name, *e.LeakSusceptibility, c.LeakSusceptibility, susceptibilityAgreement)
			}
		}
	}
	fluctuations := true
	for _, c := range f.Model.Errors {
		for _, e := range v.Errors {
			for _, x := range []struct {
				figure  string
				found   *float64
				claimed float64
				is      bool
			}{{"infidelity over the spread of ", e.SpreadInfidelity, c.SpreadInfidelity, c.claimedSpread}, {"infidelity by the noise of ", e.NoiseInfidelity, c.NoiseInfidelity, c.claimedNoise}} {
				if e.Name != c.Name || !x.is || x.found == nil {
					continue
				}
				// these are sums of figures that may be large: what is asked of infidelities, or of their digits
				allowed, off := infidelityAgreement+fluctuationAgreement*x.claimed, 0.0
				apart(&off, x.figure+e.Name, *x.found, x.claimed, allowed)
				fluctuations = fluctuations && off <= allowed
			}
		}
	}
	a.OK = fluctuations && a.Infidelity <= infidelityAgreement && a.Susceptibility <= susceptibilityAgreement && a.TailAngle <= tailAgreement
}

// require judges the brief's requirements as the record has them.
func (v *Verdict) require(r Require) {
	below := func(name string, found, allowed float64) {
		v.Requirements = append(v.Requirements, Requirement{Name: name, Found: found, Allowed: allowed, Met: found <= allowed})
	}
	below("infidelity", v.Required().Infidelity, r.Infidelity)
	for _, e := range v.Errors {
		if e.Held && e.Spread == "" && e.NoiseInfidelity == nil { // the others are held to no order
			below("susceptibility to "+e.Name, e.Susceptibility, r.Susceptibility)
		}
	}
	for _, m := range r.Margins {
		q := Requirement{Name: "margin against " + m.Error, Unit: "MHz", Margin: true, Allowed: m.Size / perMHz}
		switch {
		case m.Share:
			q.Unit, q.Allowed = "%", m.Size/perPercent
		case m.Angle:
			q.Unit, q.Allowed = "deg", m.Size/perDegree
		}
		known := false
		for _, e := range v.Errors {
			if e.Name == m.Error && e.Unit == q.Unit {
				known = true
				q.Found = math.Min(-e.Low, e.High)
			}
		}
		if !known {
			v.Warnings = append(v.Warnings, fmt.Sprintf("A margin is required against %q, and no such error was judged.", m.Error))
		}
		if q.Allowed > searchEnd {
			v.Warnings = append(v.Warnings, fmt.Sprintf("A margin of %.6g %s is required against %s; margins are searched up to %g %s.", q.Allowed, q.Unit, m.Error, searchEnd, q.Unit))
		}
		// A margin is found by a root search good to 1e-9.
		q.Met = q.Found >= q.Allowed*(1-1e-8)
		v.Requirements = append(v.Requirements, q)
	}
}
