package design

import (
	"context"
	"fmt"
	"math"
	"math/big"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/design/solve"
	"holdfast/filter"
	"holdfast/hardware"
)

// Every point that the solver evaluates, and the codes it rounds to, must keep
// every limit of the profile. The judge below reads the profile and the poles of
// its line and nothing else: no row of hardware, no response of filter.

// shareTolerance is how far samples may exceed a limit, in shares of full scale:
// the rounding of the sums that make them. Codes may not at all.
const shareTolerance = 1e-12

// A judge checks waveforms of one length on the first channel of a profile.
type judge struct {
	profile *hardware.Profile
	channel *hardware.Channel
	n       int
	states  []state // of the line, one for each pole and power that occurs
	times   []float64
	rho     [][]complex128 // by time: what each state at the span's end gives there
	// of codes, as integers
	largest   int
	amplitude int64 // I² + Q² at most
	slew      int64
	reserved  bool // rounding leaves the ring-out limit kept

	seen     int
	worst    map[string]float64 // headroom by limit, least
	problems []string
}

// A state is z(t) = ∫ x(s) (t-s)^{m-1}/(m-1)! e^{p(t-s)} ds of one pole p and a
// power m: what arrives is the sum of residue times state.
type state struct {
	pole    complex128
	power   int
	residue complex128
	weights []complex128 // of each sample in the state at the span's end
}

func newJudge(p *hardware.Profile, n int, reserved bool) *judge {
	c := &p.Channels[0]
	j := &judge{profile: p, channel: c, n: n, reserved: reserved, worst: map[string]float64{}}
	scale := math.Ldexp(1, p.Bits-1)
	j.largest = int(scale) - 1
	// (A 2^(B-1))² and S 2^(B-1), rounded down in exact arithmetic
	a := new(big.Rat).Mul(new(big.Rat).SetFloat64(c.AmplitudeLimit), new(big.Rat).SetFloat64(scale))
	a.Mul(a, a)
	j.amplitude = new(big.Int).Quo(a.Num(), a.Denom()).Int64()
	j.slew = math.MaxInt64
	if !math.IsInf(c.SlewLimit, 1) {
		s := new(big.Rat).Mul(new(big.Rat).SetFloat64(c.SlewLimit), new(big.Rat).SetFloat64(scale))
		j.slew = new(big.Int).Quo(s.Num(), s.Denom()).Int64()
	}
	if math.IsInf(c.RingOut.Limit, 1) {
		return j
	}
	for _, t := range c.Line.Terms {
		for m := 1; m <= t.Power; m++ { // lower powers feed the higher ones after the span
			s := state{pole: t.Pole, power: m, weights: make([]complex128, n)}
			for k := range n {
				s.weights[k] = held(t.Pole, m, float64(n-1-k)*p.SamplePeriod, p.SamplePeriod)
			}
			if m == t.Power {
				s.residue = t.Residue
			}
			j.states = append(j.states, s)
		}
	}
	// instants after the span: a twentieth of the fastest pole that still lives apart
	for t := 0.0; ; {
		fastest := 0.0
		for _, s := range j.states {
			if real(s.pole)*t > -40 {
				fastest = math.Max(fastest, cmplx.Abs(s.pole))
			}
		}
		j.times = append(j.times, t)
		if fastest == 0 {
			break
		}
		t += 0.05 / fastest
	}
	for _, t := range j.times {
		j.rho = append(j.rho, j.after(t))
	}
	return j
}

// held is ∫ s^{m-1}/(m-1)! e^{ps} ds from a to a+h, by the five-point Gauss rule on
// pieces so short that it is exact.
func held(p complex128, m int, a, h float64) (sum complex128) {
	nodes := []float64{0, 0.5384693101056831, -0.5384693101056831, 0.9061798459386640, -0.9061798459386640}
	weights := []float64{128. / 225, 0.4786286704993665, 0.4786286704993665, 0.2369268850561891, 0.2369268850561891}
	pieces := 1 + int(4*h*cmplx.Abs(p))
	d := h / float64(pieces)
	for i := range pieces {
		for k, x := range nodes {
			s := a + d*(float64(i)+(1+x)/2)
			v := complex(weights[k]*d/2, 0) * cmplx.Exp(p*complex(s, 0))
			for q := 1; q < m; q++ {
				v *= complex(s/float64(q), 0)
			}
			sum += v
		}
	}
	return sum
}

// after gives what each state at the span's end adds t ns later: the states of
// one term decay, and each feeds those of higher power.
func (j *judge) after(t float64) []complex128 {
	rho := make([]complex128, len(j.states))
	for i := range j.states {
		// the term's own power stands at the end of its run of states
		last := i
		for last+1 < len(j.states) && j.states[last+1].power > j.states[last].power {
			last++
		}
		v := j.states[last].residue * cmplx.Exp(j.states[i].pole*complex(t, 0))
		for q := range j.states[last].power - j.states[i].power {
			v *= complex(t/float64(q+1), 0)
		}
		rho[i] = v
	}
	return rho
}

func dotted(a, b []complex128) (sum complex128) {
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

// ringOut is the largest quadrature of what arrives after the span.
func (j *judge) ringOut(x []complex128) float64 {
	z := make([]complex128, len(j.states))
	for i := range j.states {
		z[i] = dotted(j.states[i].weights, x)
	}
	v := make([]complex128, len(j.rho))
	for i, rho := range j.rho {
		v[i] = dotted(rho, z)
	}
	most := 0.0
	for _, part := range []func(complex128) float64{func(v complex128) float64 { return real(v) }, func(v complex128) float64 { return imag(v) }} {
		peak := 0.0
		for _, u := range v {
			peak = math.Max(peak, math.Abs(part(u)))
		}
		for i := range v { // between the instants beside a high one it may be higher
			here := math.Abs(part(v[i]))
			if here < 0.99*peak || i == 0 || i+1 == len(v) || math.Abs(part(v[i-1])) > here || math.Abs(part(v[i+1])) > here {
				continue
			}
			lo, hi := j.times[i-1], j.times[i+1]
			at := func(t float64) float64 { return math.Abs(part(dotted(j.after(t), z))) }
			for range 40 {
				a, b := lo+(hi-lo)*0.38, lo+(hi-lo)*0.62
				if at(a) > at(b) {
					hi = b
				} else {
					lo = a
				}
			}
			most = math.Max(most, at((lo+hi)/2))
		}
		most = math.Max(most, peak)
	}
	return most
}

// note records how much of a limit was used; tol in the limit's own unit.
func (j *judge) note(limit string, found, allowed, tol float64) {
	if !(found <= allowed+tol) && len(j.problems) < 5 {
		j.problems = append(j.problems, fmt.Sprintf("%s: %v of %v", limit, found, allowed))
	}
	room := 1.0
	if allowed > 0 {
		room = 1 - found/allowed
	}
	if least, ok := j.worst[limit]; !ok || room < least {
		j.worst[limit] = room
	}
}

// samples judges a waveform before rounding; ring-out by stretch times its limit.
func (j *judge) samples(x []complex128) {
	c := j.channel
	var guards, amplitude, slew float64
	for k, v := range x {
		if k < c.GuardLead || k >= j.n-c.GuardTrail {
			guards = math.Max(guards, cmplx.Abs(v))
		}
		amplitude = math.Max(amplitude, cmplx.Abs(v))
	}
	padded := append(append([]complex128{0}, x...), 0)
	for k := 1; k < len(padded); k++ {
		d := padded[k] - padded[k-1]
		slew = math.Max(slew, math.Max(math.Abs(real(d)), math.Abs(imag(d))))
	}
	j.note("guards", guards, 0, 0)
	j.note("amplitude", amplitude, c.AmplitudeLimit, shareTolerance)
	if !math.IsInf(c.SlewLimit, 1) {
		j.note("slew", slew, c.SlewLimit, shareTolerance)
	}
	if !math.IsInf(c.RingOut.Limit, 1) {
		j.note("ring-out", j.ringOut(x), c.RingOut.Limit, shareTolerance)
	}
}

// codes judges the codes of a waveform, in integers.
func (j *judge) codes(codes []int16) {
	c := j.channel
	if len(codes) != 2*j.n {
		j.problems = append(j.problems, fmt.Sprintf("%d codes for %d samples", len(codes), j.n))
		return
	}
	x := make([]complex128, j.n)
	var last [2]int64
	var guards, largest, amplitude, slew int64
	for k := 0; k <= j.n; k++ {
		var v [2]int64
		if k < j.n {
			v = [2]int64{int64(codes[2*k]), int64(codes[2*k+1])}
			x[k] = complex(math.Ldexp(float64(v[0]), 1-j.profile.Bits), math.Ldexp(float64(v[1]), 1-j.profile.Bits))
		}
		for i := range 2 {
			largest = max(largest, v[i], -v[i]-1)
			slew = max(slew, v[i]-last[i], last[i]-v[i])
			if k < c.GuardLead || k >= j.n-c.GuardTrail {
				guards = max(guards, v[i], -v[i])
			}
		}
		amplitude = max(amplitude, v[0]*v[0]+v[1]*v[1])
		last = v
	}
	j.note("guards (codes)", float64(guards), 0, 0)
	j.note("largest code", float64(largest), float64(j.largest), 0)
	j.note("amplitude (codes, squared)", float64(amplitude), float64(j.amplitude), 0)
	if j.slew < math.MaxInt64 {
		j.note("slew (codes)", float64(slew), float64(j.slew), 0)
	}
	if !math.IsInf(c.RingOut.Limit, 1) && j.reserved {
		j.note("ring-out (codes)", j.ringOut(x), c.RingOut.Limit, shareTolerance)
	}
}

// visit judges one point of the solver: its samples, summed here from the basis,
// and the codes they round to.
func (j *judge) visit(q *problem, c []float64) {
	j.seen++
	basis := q.lanes[0].basis
	n := basis.Count
	x := make([]complex128, j.n)
	for k := range x {
		for i := range n {
			b := basis.Columns[i*j.n+k]
			x[k] += complex(b*c[i], b*c[n+i])
		}
	}
	j.samples(x)
	codes, err := hardware.QuantiseAll(x, j.profile.Bits)
	if err != nil {
		j.problems = append(j.problems, err.Error())
		return
	}
	j.codes(codes)
}

// A trial is a random profile with a random brief for it.
type trial struct {
	words   string
	first   int // of the starts
	profile *hardware.Profile
	n       int
	family  string
	spin    robust.Spin
	target  dynamics.Vec
	settled bool
}

func drawTrial(t *testing.T, rng *rand.Rand) trial {
	t.Helper()
	p := &hardware.Profile{Name: "random", SamplePeriod: 0.3 + 1.7*rng.Float64(), Bits: 6 + rng.IntN(11), Block: 1 << rng.IntN(4)}
	p.Shortest, p.Longest = p.Block, 64
	n := p.Block * (1 + rng.IntN(64/p.Block))
	if n < 10 {
		n = 16
	}
	c := hardware.Channel{
		Name: "a", Kind: hardware.Quadrature, FullScale: 2 * math.Pi * 0.04 / p.SamplePeriod * (0.5 + rng.Float64()),
		AmplitudeLimit: 0.3 + 0.7*rng.Float64(), SlewLimit: math.Inf(1), Band: math.Inf(1), Latency: 5 * rng.Float64(),
		RingOut: hardware.RingOut{Limit: math.Inf(1)},
	}
	if rng.IntN(3) == 0 {
		c.AmplitudeLimit = 1 // then the largest code is the limit
	}
	words := fmt.Sprintf("%d samples of %.3g ns, %d bit", n, p.SamplePeriod, p.Bits)
	if rng.IntN(3) > 0 {
		c.GuardLead, c.GuardTrail = rng.IntN(4), rng.IntN(8)
		words += fmt.Sprintf(", guards %d %d", c.GuardLead, c.GuardTrail)
	}
	if rng.IntN(3) > 0 {
		c.SlewLimit = 0.02 * math.Pow(50, rng.Float64())
		words += fmt.Sprintf(", slew %.3g", c.SlewLimit)
	}
	if rng.IntN(3) > 0 {
		c.Band = (0.1 + 0.4*rng.Float64()) / p.SamplePeriod
		words += fmt.Sprintf(", band %.3g GHz", c.Band)
	}
	if rng.IntN(4) > 0 {
		c.RingOut = hardware.RingOut{Limit: 3e-4 * math.Pow(100, rng.Float64()), Fast: 12 * rng.Float64()}
		words += fmt.Sprintf(", ring-out %.3g", c.RingOut.Limit)
	}
	for tries := 0; ; tries++ { // sections whose poles filter cannot join are drawn again
		line, what, err := drawLine(rng, p.SamplePeriod)
		if err == nil {
			c.Line = line
			words += ", " + what
			break
		}
		if tries == 20 {
			t.Fatal(err)
		}
	}
	p.Channels = []hardware.Channel{c}

	tr := trial{first: rng.IntN(60), profile: p, n: n, family: []string{brief.Slepian, brief.Samples}[rng.IntN(2)], settled: rng.IntN(3) > 0}
	full := c.FullScale
	sign := float64(1 - 2*rng.IntN(2))
	tr.spin.Axes = []dynamics.Vec{{full, 0, 0}, {0, sign * full, 0}}
	if rng.IntN(4) == 0 {
		tr.spin.Static = dynamics.Vec{0, 0, 0.02 * rng.NormFloat64()}
	}
	axis := dynamics.Vec{rng.NormFloat64(), rng.NormFloat64(), 0.5 * rng.NormFloat64()}
	tr.target = scale(axis, (0.2+2.9*rng.Float64())/length(axis))
	tr.spin.Target = dynamics.Turn(tr.target)
	words += ", held against"
	for _, class := range []robust.Class{
		{Name: "detuning", Kind: robust.Static, Vector: dynamics.Vec{0, 0, 1}, Weight: 1, Size: 0.01},
		{Name: "amplitude", Kind: robust.Amplitude, Weight: 1, Size: 0.03},
		{Name: "any", Kind: robust.Any, Weight: 0.5 + rng.Float64(), Size: 0.005},
		{Name: "a vector", Kind: robust.Static, Vector: dynamics.Vec{rng.NormFloat64(), rng.NormFloat64(), 1}, Weight: 1, Size: 0.01},
	} {
		if rng.IntN(3) == 0 {
			tr.spin.Held = append(tr.spin.Held, class)
			words += " " + class.Name
		}
	}
	if len(tr.spin.Held) == 0 {
		words += " nothing"
	}
	tr.words = fmt.Sprintf("%s; %s, target %.3g, settled %v", words, tr.family, tr.target, tr.settled)
	return tr
}

// drawLine joins up to three sections: low-passes, twice the same one, tails of
// both signs, or nothing at all.
func drawLine(rng *rand.Rand, h float64) (filter.Line, string, error) {
	sections := []filter.Line{}
	words := "straight through"
	add := func(l filter.Line, err error, format string, args ...any) error {
		if err == nil {
			sections = append(sections, l)
			if len(sections) == 1 {
				words = ""
			} else {
				words += " and "
			}
			words += fmt.Sprintf(format, args...)
		}
		return err
	}
	lowpass := func() error {
		corner := 0.08 / h * math.Pow(10, rng.Float64())
		if rng.IntN(2) == 0 {
			l, err := filter.SinglePole(1 / (2 * math.Pi * corner))
			return add(l, err, "single pole at %.3g GHz", corner)
		}
		order := 1 + rng.IntN(5)
		l, err := filter.Bessel(order, corner)
		return add(l, err, "Bessel %d at %.3g GHz", order, corner)
	}
	kind := rng.IntN(7)
	if kind == 1 || kind >= 3 {
		if err := lowpass(); err != nil {
			return filter.Line{}, "", err
		}
	}
	if kind == 5 {
		if err := lowpass(); err != nil {
			return filter.Line{}, "", err
		}
	}
	if kind == 6 {
		if err := add(sections[0], nil, "the same again"); err != nil {
			return filter.Line{}, "", err
		}
	}
	if kind == 2 || kind == 4 || kind == 5 {
		var tails []filter.Tail
		for range 1 + rng.IntN(2) {
			tails = append(tails, filter.Tail{Amplitude: 0.1*rng.Float64() - 0.05, Time: h * 3 * math.Pow(15, rng.Float64())})
		}
		l, err := filter.Tails(tails)
		if err := add(l, err, "tails %.3g", tails); err != nil {
			return filter.Line{}, "", err
		}
	}
	l, err := filter.Cascade(sections...)
	if rng.IntN(5) == 0 { // a line that is not the same on both sides of the carrier: I turns into Q
		shift := complex(0, 0.3*rng.NormFloat64()/h)
		for i := range l.Terms {
			l.Terms[i].Pole += shift
			l.Terms[i].Residue *= cmplx.Exp(shift)
		}
		words += fmt.Sprintf(", poles shifted by %.3g", shift)
	}
	return l, words, err
}

// judged runs starts of the trial as the search, the refinement and the polish
// do, each with the given budget of iterations, and judges every point. It
// returns nil and Playable's error when the profile can play nothing.
func (tr trial) judged(t *testing.T, starts, iterations int) (*judge, error) {
	t.Helper()
	set, err := tr.profile.Playable(0, tr.n)
	if err != nil {
		return nil, err
	}
	q, err := newProblem(tr.profile, wish{channels: []int{0}, samples: tr.n, family: tr.family, spin: tr.spin, target: tr.target, settled: tr.settled})
	if err != nil {
		t.Fatalf("%s: %v", tr.words, err)
	}
	q.seed = uint64(tr.n)
	j := newJudge(tr.profile, tr.n, set.Reserved)
	q.visit = func(c []float64) { j.visit(q, c) }
	ctx := context.Background()
	o := solve.Options{Iterations: iterations}
	for i := range starts {
		number := tr.first + i
		st := q.start(number)
		o.Kappa = st.kappa
		r := solve.GaussNewton(ctx, q.residuals(q.gate(false)), q.set, st.c, o)
		if i == 0 && len(tr.spin.Held) > 0 {
			r = solve.GaussNewton(ctx, q.residuals(q.finite(rounds[0][0])), q.set, r.C, solve.Options{Kappa: refineKappa, Tolerance: -1, Iterations: iterations})
		}
		r = solve.GaussNewton(ctx, q.residuals(q.gate(true)), q.set, r.C, o)
		// what would be written: the samples by design's own sum
		x := q.sampled(r.C)[0]
		j.samples(x)
		codes, err := hardware.QuantiseAll(x, tr.profile.Bits)
		if err != nil {
			t.Errorf("%s: %v", tr.words, err)
			continue
		}
		j.codes(codes)
	}
	return j, nil
}

func TestNoIterateBreaksALimit(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 1))
	const trials = 40
	empty, seen := 0, 0
	used := map[string]int{}
	for range trials {
		tr := drawTrial(t, rng)
		j, err := tr.judged(t, 3, 40)
		if err != nil {
			if !slices.ContainsFunc([]string{"guard:", "amplitude_limit:", "slew_limit:", "ring_out:"}, func(limit string) bool {
				return strings.Contains(err.Error(), limit)
			}) {
				t.Errorf("%s: %v names no limit", tr.words, err)
			}
			empty++
			continue
		}
		for _, p := range j.problems {
			t.Errorf("%s: %s", tr.words, p)
		}
		for limit, room := range j.worst {
			if room < 0.3 {
				used[limit]++
			}
		}
		seen += j.seen
	}
	if empty >= trials/2 {
		t.Errorf("%d of %d profiles can play nothing: too many to test anything", empty, trials)
	}
	if seen < 2000 {
		t.Errorf("%d points judged: too few", seen)
	}
	for _, limit := range []string{"amplitude", "slew", "ring-out"} { // else the limits were not in the way
		if used[limit] < 5 {
			t.Errorf("%s came within 30 %% in %d profiles: too few to test anything", limit, used[limit])
		}
	}
	t.Logf("%d points of %d profiles; %d more can play nothing; limits met: %v", seen, trials-empty, empty, used)
}

// TestJudgeOfLimits shows that the judge sees: each waveform breaks one limit by
// little, or keeps all.
func TestJudgeOfLimits(t *testing.T) {
	line, err := filter.SinglePole(2)
	if err != nil {
		t.Fatal(err)
	}
	p := &hardware.Profile{Name: "plain", SamplePeriod: 1, Bits: 10, Block: 1, Shortest: 1, Longest: 64, Channels: []hardware.Channel{{
		Name: "a", AmplitudeLimit: 0.9, SlewLimit: 0.5, GuardLead: 1, GuardTrail: 2, Band: math.Inf(1), Line: line,
		// a sample of 0.4 that ended d ns before the span's end leaves 0.4 (1-e^{-1/2}) e^{-d/2}
		RingOut: hardware.RingOut{Limit: 0.4 * (1 - math.Exp(-0.5)) * (math.Exp(-1) + math.Exp(-3)), Fast: 1},
	}}}
	quiet := []complex128{0, 0.4, 0, 0, 0, 0.4, 0, 0}
	for _, c := range []struct {
		limit string
		at    int
		v     complex128
	}{
		{"", 0, 0},
		{"guards", 0, 1e-15},
		{"guards", 7, 1e-15},
		{"amplitude", 1, complex(0.4, 0.9)},
		{"slew", 1, complex(0.4, 0.5+1e-11)},
		{"slew", 5, complex(0.4, -0.5-1e-11)},
		{"ring-out", 5, 0.4 + 1e-10},
		{"", 5, complex(0, -0.4*(1+math.Exp(-2))+1e-10)},
		{"ring-out", 5, complex(0, -0.4*(1+math.Exp(-2))-1e-10)},
	} {
		j := newJudge(p, len(quiet), false)
		x := append([]complex128(nil), quiet...)
		x[c.at] = c.v
		j.samples(x)
		found := strings.Join(j.problems, "; ")
		if c.limit == "" && found != "" || !strings.Contains(found, c.limit) {
			t.Errorf("sample %d = %v: found %q, want %q", c.at, c.v, found, c.limit)
		}
	}
	clean := []int16{0, 0, 256, 200, 256, 300, 0, 200, 200, 0, 0, 0, 0, 0, 0, 0}
	for _, c := range []struct {
		limit string
		at    int
		v     int16
	}{
		{"", 0, 0},
		{"guards", 1, -1},
		{"guards", 15, 1},
		{"slew", 2, 257}, // 0.5 of 512 is 256
		{"slew", 8, -257},
		{"", 5, 383}, // (0.9 512)² = 212336.64 lies between 256² + 383² and 256² + 384²
		{"amplitude", 5, 384},
		{"largest", 4, -513},
	} {
		j := newJudge(p, 8, false)
		codes := append([]int16(nil), clean...)
		codes[c.at] = c.v
		j.codes(codes)
		found := strings.Join(j.problems, "; ")
		if c.limit == "" && found != "" || !strings.Contains(found, c.limit) {
			t.Errorf("code %d = %v: found %q, want %q", c.at, c.v, found, c.limit)
		}
	}
}

// TestJudgeOfRingOut compares what the judge lets arrive with filter's own
// response, repeated and shifted poles included.
func TestJudgeOfRingOut(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 3))
	repeated := 0
	for range 60 {
		tr := drawTrial(t, rng)
		p := tr.profile
		p.Channels[0].RingOut.Limit = 1
		j := newJudge(p, tr.n, false)
		x := make([]complex128, tr.n)
		for k := range x {
			x[k] = complex(2*rng.Float64()-1, 2*rng.Float64()-1)
		}
		for _, term := range p.Channels[0].Line.Terms {
			repeated = max(repeated, term.Power)
		}
		z := make([]complex128, len(j.states))
		for i := range z {
			z[i] = dotted(j.states[i].weights, x)
		}
		times := make([]float64, len(j.times))
		for i, after := range j.times {
			times[i] = float64(tr.n)*p.SamplePeriod + after
		}
		most := 0.0
		for i, want := range p.Channels[0].Line.Held(x, p.SamplePeriod, times, nil) {
			if i == 0 && p.Channels[0].Line.Direct != 0 {
				want = p.Channels[0].Line.Held(x, p.SamplePeriod, []float64{times[0] * (1 + 1e-15)}, nil)[0]
			}
			if got := dotted(j.rho[i], z); !(cmplx.Abs(got-want) <= 1e-10) {
				t.Errorf("%s: %v after the span %v arrives, want %v", tr.words, j.times[i], got, want)
				break
			}
			most = math.Max(most, math.Max(math.Abs(real(want)), math.Abs(imag(want))))
		}
		if got := j.ringOut(x); !(got >= most-1e-10 && got <= 1.001*most+1e-10) {
			t.Errorf("%s: ring-out %v, at the instants %v", tr.words, got, most)
		}
	}
	if repeated < 2 {
		t.Errorf("no repeated pole was drawn")
	}
}
