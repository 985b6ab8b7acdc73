package replay

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
)

// What a model may hold; larger ones are refused before any work is done.
const (
	maxSamples  = 65536
	maxDim      = 64
	maxChannels = 16
	maxPoles    = 256 // entries of one line
	maxPower    = 32  // as in package filter, slopes included
	maxErrors   = 64
	maxKnees    = 256     // points of a compression table
	maxAnyDim   = 16      // levels of which all d^2-1 static errors are judged
	maxSites    = 6       // each of
	maxLevels   = 16      // levels at most
	maxRotating = 64      // terms
	maxPaths    = 16      // of one channel
	maxMembers  = 4096    // operators of one error
	maxEntries  = 4 << 20 // of the operators of all errors: 64 MiB
	maxTurn     = 1e5     // rad/ns, of a rotating term or path
)

// A Model is [model] of pulse.toml with the samples loaded: all that is needed to recompute the gate. Matrices are
// row-major. It is not changed by any method.
type Model struct {
	SamplePeriod float64 // ns
	Samples      int     // of the span, guards included
	Bits         int     // of the converters; x = code / 2^(Bits-1)
	Ends         string  // "settled" or "window"
	WindowStart  float64 // ns

	Dim       int
	Sites     []int        // levels of each site, the first slowest in the basis; nil for one site
	CodeSpace []int        // basis states
	Static    []complex128 // Dim x Dim, rad/ns, Hermitian
	Rotating  []Rotating   // what turns by itself beside it; frequencies ascending
	Dropped   []Rotating   // what the model leaves out, as fast enough to average out; Judge says what that costs

	// The target is a unitary on the code space, or, where Target is nil, the span of From taken to that of To: as many orthonormal vectors on
	// the code space each.
	Target   []complex128
	From, To [][]complex128

	FreeZBefore, FreeZAfter []float64 // rad, one for each site; empty when not free
	// LocalBefore and LocalAfter are the rotations of each site, 2 x 2, that a gate up to local rotations is given: M -> (x)after M (x)before.
	// Nil when not free.
	LocalBefore, LocalAfter [][]complex128

	Channels []Channel
	Errors   []Class
}

// A Rotating is a part of the Hamiltonian that turns by itself, t in ns from the window's start whatever the time:
//
//	H += cos(Frequency (t - WindowStart)) Cosine + sin(Frequency (t - WindowStart)) Sine
type Rotating struct {
	Frequency    float64      // rad/ns, above 0
	Cosine, Sine []complex128 // Dim x Dim, rad/ns, Hermitian
}

// A Path is what a channel drives where it is seen to turn, as a site of another frequency sees it: u e^(-i Frequency (t - WindowStart)),
// u in rad/ns as of Channel, drives Operators by its real and its imaginary part.
type Path struct {
	Frequency float64        // rad/ns, either sign
	Operators [][]complex128 // two; of a baseband channel one or two; Hermitian
}

// A Channel is one [[model.channel]] with its samples.
type Channel struct {
	Name      string
	Kind      string  // "quadrature" or "baseband"
	FullScale float64 // rad/ns
	Delay     float64 // ns, latency and line

	// The line: G(s) = e^(-s Delay) (Direct + sum Residues/(s - Poles)^Powers), 1/ns.
	Direct   complex128
	Poles    []complex128
	Powers   []int
	Residues []complex128

	Operators [][]complex128 // of u_I and u_Q, or of u alone; Hermitian
	Paths     []Path         // crosstalk that turns, beside them

	// MapPolynomial and MapLoop, of a baseband channel, turn what arrives, s in shares of full scale, into the rate that Operators[0]
	// multiplies: FullScale times the sum of MapPolynomial[k] s^(k+1), or what the flux does to the frequency of a loop of two junctions,
	//
	//	MapLoop[0] (g(MapLoop[1] + MapLoop[2] s) - g(MapLoop[1])),   g(f) = (cos²(pi f) + MapLoop[3]² sin²(pi f))^(1/4)
	//
	// of rad/ns, flux quanta, flux quanta and a share; both nil where the rate is FullScale s.
	MapPolynomial, MapLoop []float64

	// Compression says what share of the full-scale rate the converter's share reaches, before the line; nil where they are the
	// same. See Compressed.
	Compression []Knee
	// Shift is what the drive's power does to the device: H += Shift |u_I + i u_Q|^2 ShiftOperator, u in shares of full scale
	// as it arrives; rad/ns, either sign. The operator may be nil where Shift is 0.
	Shift         float64
	ShiftOperator []complex128

	// The limits, in shares of full scale; +Inf where the instrument has none. MaxShare, MaxSlew and the guards are of the samples as
	// the converter plays them, the others of what compression leaves.
	MaxShare, MaxSlew, RingOut float64
	GuardLead, GuardTrail      int

	// More limits, of which 0 means that there is none.
	Box         bool    // MaxShare bounds each quadrature, not |x|
	RMS         float64 // root of the sum of |y|^2 over max(the span, RMSSamples)
	RMSSamples  float64 // samples of a repetition period
	RingOutTail float64 // rules from RingOutFast on; before, and without it, RingOut does
	RingOutFast float64 // ns after the span
	OutOfBand   float64 // root of the mean square of y outside Band, over the span
	Band        float64 // GHz, either side of zero
	ZeroMean    bool    // the samples, compressed, add up to zero as nearly as codes can

	Samples []complex128 // x_I + i x_Q, or x, what the converters play
	Exact   []complex128 // the same before rounding, at the converter too; nil when there is none
	Codes   []int16      // interleaved as in the file; nil for a pulse that has no codes
}

// A Knee is one point of a compression table.
type Knee struct {
	Share   float64 // at the converter
	Reached float64 // of the full-scale rate
}

// Compressed gives what enters the line when the converter plays x: x/|x| f(|x|), f straight between the points of the table and
// beyond its last one as between the last two. A baseband channel's is odd by the same formula.
func (c *Channel) Compressed(x complex128) complex128 {
	if len(c.Compression) < 2 || x == 0 {
		return x
	}
	a := cmplx.Abs(x)
	i := 1
	for i < len(c.Compression)-1 && a > c.Compression[i].Share {
		i++
	}
	p, q := c.Compression[i-1], c.Compression[i]
	f := p.Reached + (q.Reached-p.Reached)*((a-p.Share)/(q.Share-p.Share))
	return x * complex(f/a, 0)
}

// A Class is one [[model.error]]: what may go wrong, and what the record says of it. Its size lambda is in rad/ns for kind static and
// any, in rad for kind skew, and a share for the others.
type Class struct {
	Name string
	// Kind is one of
	//
	//	"static"     H += lambda Operator
	//	"any"        H += lambda sum v_i Weights[i] Operators[i], |v| = 1; without a list the same of every traceless operator
	//	"amplitude"  u of the channels times 1 + lambda, or u_I or u_Q alone where Quadrature says so
	//	"skew"       u_I += -lambda u_Q of the channels: the angle between the quadratures
	//	"line"       u += lambda FullScale times what arrives through the line below: lambda relative change of a parameter
	//	"crosstalk"  H += lambda (u_I Operators[0] + u_Q Operators[1]) of the channel: a share of it reaches something else
	//
	// All act in the window only. A drive-induced shift follows the u that the error leaves, and so does what a channel drives by its paths.
	Kind       string
	Held       bool         // the pulse was designed to be held against it
	Operator   []complex128 // kind static: Dim x Dim
	Channels   []string     // kinds amplitude and skew, where empty means all that have what is asked for; kinds line and crosstalk: one
	Quadrature string       // kind amplitude: "I", "Q" or "" for both

	// Of kind any the operators of the class, Dim x Dim, Hermitian, rad/ns for lambda in rad/ns, each with a name and with a weight above 0 of
	// root mean square 1; all nil for all traceless ones. Of kind crosstalk what the channel's quadratures drive, without names or weights.
	Operators [][]complex128
	Names     []string
	Weights   []float64
	// Leak is of kind any: the class is of what couples the code space to the other levels, and that is what must not survive.
	Leak bool

	// Kind line: the line's slope, with the channel's delay.
	Direct   complex128
	Poles    []complex128
	Powers   []int
	Residues []complex128

	// Of kinds of one error (not any): sizes over which the infidelity is to be low, and, of kinds static and amplitude (of both quadratures), how it
	// fluctuates; empty where it does not.
	Spread Spread
	Noise  Noise

	// What the record claims.
	Susceptibility                    float64
	LeakSusceptibility                float64
	SpreadInfidelity, NoiseInfidelity float64
	claimed, claimedLeak              bool
	claimedSpread, claimedNoise       bool
}

// WithSamples gives a model of another pulse on the same lines, operators, limits and errors: one slice for each
// channel, in shares of full scale (I + i Q), played in a window of so many samples; a shorter slice is followed by zeros, a
// missing one is silence. More slices than channels, or more samples than the span holds, are a caller's bug and panic. The
// new model has no codes.
func (m *Model) WithSamples(samples int, x ...[]complex128) *Model {
	if samples < 1 || samples > maxSamples || len(x) > len(m.Channels) {
		panic(fmt.Sprintf("replay: %d samples for %d of %d channels", samples, len(x), len(m.Channels)))
	}
	other := *m
	other.Samples = samples
	other.Channels = append([]Channel(nil), m.Channels...)
	for c := range other.Channels {
		ch := &other.Channels[c]
		ch.Samples, ch.Exact, ch.Codes = make([]complex128, samples), nil, nil
		if c < len(x) {
			if len(x[c]) > samples {
				panic(fmt.Sprintf("replay: %d samples in a span of %d", len(x[c]), samples))
			}
			copy(ch.Samples, x[c])
		}
	}
	return &other
}

// WithLine gives a model of the same pulse through another line of one channel, as when lines are drawn from a spread: its delay in ns, latency
// included, and G(s) as in Channel, 1/ns. Window, operators, limits and errors stay as they are, an error of kind line with the slope of
// the line that was. A channel that does not exist, or lists of unlike lengths, are a caller's bug and panic; numbers that make no sense
// are for Validate to find.
func (m *Model) WithLine(channel int, delay float64, direct complex128, poles []complex128, powers []int, residues []complex128) *Model {
	if channel < 0 || channel >= len(m.Channels) || len(powers) != len(poles) || len(residues) != len(poles) {
		panic(fmt.Sprintf("replay: a line of %d poles, %d powers, %d residues for channel %d of %d", len(poles), len(powers), len(residues), channel, len(m.Channels)))
	}
	other := *m
	other.Channels = append([]Channel(nil), m.Channels...)
	c := &other.Channels[channel]
	c.Delay, c.Direct = delay, direct
	c.Poles, c.Powers, c.Residues = append([]complex128(nil), poles...), append([]int(nil), powers...), append([]complex128(nil), residues...)
	return &other
}

// BeforeRounding gives a model of the same pulse with its samples as they were before rounding to codes, or nil when a
// channel has none.
func (m *Model) BeforeRounding() *Model {
	x := make([][]complex128, len(m.Channels))
	for c, ch := range m.Channels {
		if ch.Exact == nil {
			return nil
		}
		x[c] = ch.Exact
	}
	return m.WithSamples(m.Samples, x...)
}

// channel finds a channel by its name; the name is known to exist.
func (m *Model) channel(name string) *Channel {
	i := slices.IndexFunc(m.Channels, func(c Channel) bool { return c.Name == name })
	return &m.Channels[i]
}

// Span is the length of the window in ns.
func (m *Model) Span() float64 { return float64(m.Samples) * m.SamplePeriod }

// A fault is what is wrong with one key of a model.
type fault struct{ key, found, allowed string }

func (f *fault) Error() string {
	return fmt.Sprintf("%s: found %s; allowed: %s", f.key, f.found, f.allowed)
}

// Validate reports the first number of the model that makes no sense, with its key in [model]. Open calls it; a Model
// made by hand should pass it before it is used.
func (m *Model) Validate() error {
	if f := m.validate(); f != nil {
		return f
	}
	return nil
}

func (m *Model) validate() *fault {
	bad := func(key string, found any, allowed string) *fault {
		return &fault{key, fmt.Sprint(found), allowed}
	}
	in := func(v, lo, hi float64) bool { return v >= lo && v <= hi }
	if !in(m.SamplePeriod, 1e-6, 1e6) {
		return bad("sample_period_ns", m.SamplePeriod, "1e-6 to 1e6")
	}
	if m.Samples < 1 || m.Samples > maxSamples {
		return bad("samples", m.Samples, fmt.Sprintf("1 to %d", maxSamples))
	}
	if m.Bits < 2 || m.Bits > 16 {
		return bad("bits", m.Bits, "2 to 16")
	}
	if m.Ends != "settled" && m.Ends != "window" {
		return bad("ends", fmt.Sprintf("%q", m.Ends), `"settled" or "window"`)
	}
	if !in(m.WindowStart, -1e9, 1e9) {
		return bad("window_start_ns", m.WindowStart, "-1e9 to 1e9")
	}
	if m.Dim < 2 || m.Dim > maxDim {
		return bad("dim", m.Dim, fmt.Sprintf("2 to %d", maxDim))
	}
	if n := len(m.CodeSpace); n < 2 || n > m.Dim {
		return bad("code_space", fmt.Sprintf("%d states", n), fmt.Sprintf("2 to %d different states", m.Dim))
	}
	seen := make([]bool, m.Dim)
	for _, s := range m.CodeSpace {
		if s < 0 || s >= m.Dim || seen[s] {
			return bad("code_space", m.CodeSpace, fmt.Sprintf("different states, 0 to %d", m.Dim-1))
		}
		seen[s] = true
	}
	if len(m.Sites) > 0 {
		product := 1
		for _, levels := range m.Sites {
			if levels < 2 || levels > maxLevels {
				return bad("sites", fmt.Sprintf("a site of %d levels", levels), fmt.Sprintf("2 to %d levels a site", maxLevels))
			}
			product *= levels
		}
		if n := len(m.Sites); n < 2 || n > maxSites {
			return bad("sites", fmt.Sprintf("%d sites", n), fmt.Sprintf("2 to %d, and no list for one", maxSites))
		}
		if product != m.Dim {
			return bad("sites", fmt.Sprintf("%d basis states in all", product), fmt.Sprintf("%d, the dimension", m.Dim))
		}
	}
	if what := notHermitian(m.Static, m.Dim); what != "" {
		return bad("static_rad_per_ns", what, fmt.Sprintf("a Hermitian %d x %d matrix", m.Dim, m.Dim))
	}
	for _, r := range []struct {
		key   string
		terms []Rotating
	}{{"rotating", m.Rotating}, {"dropped", m.Dropped}} {
		if f := validRotating(r.key, r.terms, m.Dim); f != nil {
			return f
		}
	}
	if f := m.validTarget(); f != nil {
		return f
	}
	if n := len(m.Channels); n < 1 || n > maxChannels {
		return bad("channel", fmt.Sprintf("%d channels", n), fmt.Sprintf("1 to %d", maxChannels))
	}
	names := map[string]bool{}
	for i := range m.Channels {
		key := fmt.Sprintf("channel[%d].", i)
		if f := m.Channels[i].validate(m.Dim, m.Samples, key); f != nil {
			return f
		}
		if names[m.Channels[i].Name] {
			return bad(key+"name", fmt.Sprintf("%q again", m.Channels[i].Name), "a name of its own")
		}
		names[m.Channels[i].Name] = true
	}
	if n := len(m.Errors); n > maxErrors {
		return bad("error", fmt.Sprintf("%d errors", n), fmt.Sprintf("up to %d", maxErrors))
	}
	classes, entries := map[string]bool{}, 0
	for i := range m.Errors {
		e, key := &m.Errors[i], fmt.Sprintf("error[%d].", i)
		if classes[e.Name] {
			return bad(key+"name", fmt.Sprintf("%q again", e.Name), "a name of its own")
		}
		classes[e.Name] = true
		if f := m.validClass(e, key, names); f != nil {
			return f
		}
		for _, op := range e.Operators {
			entries += len(op)
		}
		if entries > maxEntries {
			return bad(key+"operators", fmt.Sprintf("%d matrix elements up to here", entries), fmt.Sprintf("up to %d in the operators of all errors", maxEntries))
		}
	}
	return nil
}

func (c *Channel) validate(dim, samples int, key string) *fault {
	bad := func(k string, found any, allowed string) *fault {
		return &fault{key + k, fmt.Sprint(found), allowed}
	}
	quadratures := 2
	switch c.Kind {
	case "quadrature":
	case "baseband":
		quadratures = 1
	default:
		return bad("kind", fmt.Sprintf("%q", c.Kind), `"quadrature" or "baseband"`)
	}
	if !(c.FullScale > 0 && c.FullScale <= 1e4) {
		return bad("full_scale_rad_per_ns", c.FullScale, "above 0, to 1e4")
	}
	if !(math.Abs(c.Delay) <= 1e9) {
		return bad("delay_ns", c.Delay, "-1e9 to 1e9")
	}
	if f := validLine(key, c.Direct, c.Poles, c.Powers, c.Residues); f != nil {
		return f
	}
	if f := c.validCurve(key); f != nil {
		return f
	}
	if len(c.Operators) != quadratures {
		return bad("operators", fmt.Sprintf("%d matrices", len(c.Operators)), fmt.Sprintf("%d for kind %q", quadratures, c.Kind))
	}
	for i, op := range c.Operators {
		if what := notHermitian(op, dim); what != "" {
			return bad(fmt.Sprintf("operators[%d]", i), what, fmt.Sprintf("a Hermitian %d x %d matrix", dim, dim))
		}
	}
	if n := len(c.Paths); n > maxPaths {
		return bad("path", fmt.Sprintf("%d paths", n), fmt.Sprintf("up to %d", maxPaths))
	}
	for i, p := range c.Paths {
		at := func(k string) string { return fmt.Sprintf("path[%d].%s", i, k) }
		if w := math.Abs(p.Frequency); !(w > 0 && w <= maxTurn) {
			return bad(at("frequency_rad_per_ns"), p.Frequency, fmt.Sprintf("-%g to %g and not 0, of which the channel's own operators are", maxTurn, maxTurn))
		}
		if n := len(p.Operators); n != 2 && (n != 1 || quadratures != 1) {
			return bad(at("operators"), fmt.Sprintf("%d matrices", n), "2, or 1 of a channel with one quadrature")
		}
		for j, op := range p.Operators {
			if what := notHermitian(op, dim); what != "" {
				return bad(fmt.Sprintf("path[%d].operators[%d]", i, j), what, fmt.Sprintf("a Hermitian %d x %d matrix", dim, dim))
			}
		}
	}
	for _, l := range []struct {
		key string
		v   float64
	}{{"max_share", c.MaxShare}, {"max_slew_per_sample", c.MaxSlew}, {"ring_out_share", c.RingOut}} {
		if !(l.v > 0) {
			return bad(l.key, l.v, "a positive share of full scale")
		}
	}
	for _, l := range []struct {
		key string
		v   float64
	}{{"rms_share", c.RMS}, {"rms_samples", c.RMSSamples}, {"ring_out_tail_share", c.RingOutTail}, {"ring_out_fast_ns", c.RingOutFast},
		{"out_of_band_share", c.OutOfBand}, {"band_ghz", c.Band}} {
		if !(l.v >= 0) || math.IsInf(l.v, 1) {
			return bad(l.key, l.v, "a positive number, or none")
		}
	}
	if c.RMSSamples > 0 && c.RMS == 0 {
		return bad("rms_samples", c.RMSSamples, "none without rms_share")
	}
	if c.RingOutFast > 0 && c.RingOutTail == 0 {
		return bad("ring_out_fast_ns", c.RingOutFast, "none without a limit of ring-out")
	}
	if c.OutOfBand > 0 && c.Band == 0 {
		return bad("out_of_band_share", c.OutOfBand, "none without band_ghz")
	}
	if c.Box && c.Kind != "quadrature" {
		return bad("envelope", `"box"`, "none for one quadrature")
	}
	if n := len(c.Compression); n == 1 || n > maxKnees {
		return bad("compression", fmt.Sprintf("%d points", n), fmt.Sprintf("none, or 2 to %d", maxKnees))
	}
	for i, k := range c.Compression {
		last := Knee{}
		if i > 0 {
			last = c.Compression[i-1]
		}
		switch {
		case i == 0 && k != last:
			return bad("compression[0]", fmt.Sprintf("[%g, %g]", k.Share, k.Reached), "[0, 0]")
		case i > 0 && !(k.Share > last.Share && k.Share <= 1e3 && k.Reached > last.Reached && k.Reached <= 1e3):
			return bad(fmt.Sprintf("compression[%d]", i), fmt.Sprintf("[%g, %g]", k.Share, k.Reached), "points that rise in both numbers")
		}
	}
	if !(math.Abs(c.Shift) <= 1e4) {
		return bad("shift_rad_per_ns", c.Shift, "-1e4 to 1e4")
	}
	if c.Shift != 0 || c.ShiftOperator != nil {
		if what := notHermitian(c.ShiftOperator, dim); what != "" {
			return bad("shift_operator", what, fmt.Sprintf("a Hermitian %d x %d matrix", dim, dim))
		}
	}
	if c.GuardLead < 0 || c.GuardTrail < 0 || c.GuardLead+c.GuardTrail > samples {
		return bad("guard_lead", fmt.Sprintf("guards of %d and %d samples", c.GuardLead, c.GuardTrail), fmt.Sprintf("guards within the %d samples", samples))
	}
	if len(c.Samples) != samples {
		return bad("codes", fmt.Sprintf("%d samples", len(c.Samples)), fmt.Sprintf("%d", samples))
	}
	for k, x := range c.Samples {
		if cmplx.IsNaN(x) || !(cmplx.Abs(x) <= 1e6) {
			return bad(fmt.Sprintf("codes[%d]", k), x, "finite samples")
		}
	}
	return nil
}

// validRotating judges the terms that turn by themselves.
func validRotating(key string, terms []Rotating, dim int) *fault {
	if n := len(terms); n > maxRotating {
		return &fault{key, fmt.Sprintf("%d terms", n), fmt.Sprintf("up to %d", maxRotating)}
	}
	last := 0.0
	for i, r := range terms {
		at := func(k string) string { return fmt.Sprintf("%s[%d].%s", key, i, k) }
		if !(r.Frequency > last && r.Frequency <= maxTurn) {
			return &fault{at("frequency_rad_per_ns"), fmt.Sprint(r.Frequency), fmt.Sprintf("above 0 and above that of the term before, to %g", maxTurn)}
		}
		last = r.Frequency
		for _, m := range []struct {
			key string
			op  []complex128
		}{{"cosine", r.Cosine}, {"sine", r.Sine}} {
			if what := notHermitian(m.op, dim); what != "" {
				return &fault{at(m.key), what, fmt.Sprintf("a Hermitian %d x %d matrix", dim, dim)}
			}
		}
	}
	return nil
}

// validTarget judges what the pulse is to do, and the frames that are free.
func (m *Model) validTarget() *fault {
	c := len(m.CodeSpace)
	states := len(m.From) > 0 || len(m.To) > 0
	switch {
	case states && m.Target != nil:
		return &fault{"target", "a matrix beside from and to", "a matrix, or vectors from and to"}
	case states:
		if n := len(m.From); n < 1 || n > c {
			return &fault{"from", fmt.Sprintf("%d vectors", n), fmt.Sprintf("1 to %d", c)}
		}
		if n := len(m.To); n != len(m.From) {
			return &fault{"to", fmt.Sprintf("%d vectors", n), fmt.Sprintf("as many as from has, %d", len(m.From))}
		}
		for _, v := range []struct {
			key  string
			list [][]complex128
		}{{"from", m.From}, {"to", m.To}} {
			if what := notOrthonormal(v.list, c); what != "" {
				return &fault{v.key, what, fmt.Sprintf("orthonormal vectors on the code space, %d entries each", c)}
			}
		}
	default:
		if what := notUnitary(m.Target, c); what != "" {
			return &fault{"target", what, fmt.Sprintf("a unitary %d x %d matrix on the code space", c, c)}
		}
	}
	for _, z := range []struct {
		key    string
		angles []float64
	}{{"free_z_before", m.FreeZBefore}, {"free_z_after", m.FreeZAfter}} {
		n := len(z.angles)
		if n > 0 && (n > maxSites || 1<<n != c) {
			return &fault{z.key, fmt.Sprintf("%d angles", n), fmt.Sprintf("none, or one for each two-level site of a code space of %d", c)}
		}
		if n > 0 && states {
			return &fault{z.key, fmt.Sprintf("%d angles", n), "none beside from and to"}
		}
		for _, a := range z.angles {
			if !(math.Abs(a) <= 1e6) {
				return &fault{z.key, fmt.Sprint(a), "angles in rad"}
			}
		}
	}
	before, after := len(m.LocalBefore), len(m.LocalAfter)
	if before == 0 && after == 0 {
		return nil
	}
	for _, l := range []struct {
		key  string
		list [][]complex128
	}{{"local_before", m.LocalBefore}, {"local_after", m.LocalAfter}} {
		n := len(l.list)
		if n > maxSites || 1<<n != c {
			return &fault{l.key, fmt.Sprintf("%d matrices", n), fmt.Sprintf("one for each two-level site of a code space of %d, before and after", c)}
		}
		if states || len(m.FreeZBefore) > 0 || len(m.FreeZAfter) > 0 {
			return &fault{l.key, fmt.Sprintf("%d matrices", n), "none beside free_z_before and free_z_after, or from and to"}
		}
		for i, u := range l.list {
			if what := notUnitary(u, 2); what != "" {
				return &fault{fmt.Sprintf("%s[%d]", l.key, i), what, "unitary 2 x 2 matrices"}
			}
		}
	}
	return nil
}

// validClass judges one error; channels are the names of those that there are.
func (m *Model) validClass(e *Class, key string, channels map[string]bool) *fault {
	bad := func(k string, found any, allowed string) *fault {
		return &fault{key + k, fmt.Sprint(found), allowed}
	}
	hermitian := func(k string, op []complex128) *fault {
		if what := notHermitian(op, m.Dim); what != "" {
			return bad(k, what, fmt.Sprintf("a Hermitian %d x %d matrix", m.Dim, m.Dim))
		}
		return nil
	}
	empty := func(op []complex128) bool {
		op = append([]complex128(nil), op...)
		dropTrace(op, m.Dim)
		return !(frobenius(op) > 1e-6)
	}
	operator := func(k string, op []complex128) *fault {
		f := hermitian(k, op)
		if f == nil && empty(op) {
			f = bad(k, "a multiple of the identity", "a Hermitian matrix of which something is left without its trace")
		}
		return f
	}
	levels := m.Dim > len(m.CodeSpace) // there are some outside the code space
	if e.Leak && (e.Kind != "any" || e.Operators == nil || !levels) {
		return bad("leak", true, `none but of kind "any" with operators, where levels lie outside the code space`)
	}
	if e.claimedLeak && !levels {
		return bad("leak_susceptibility", e.LeakSusceptibility, "none without levels outside the code space")
	}
	if n := len(e.Operators); n > maxMembers {
		return bad("operators", fmt.Sprintf("%d matrices", n), fmt.Sprintf("up to %d", maxMembers))
	}
	if f := e.validFluctuations(key); f != nil {
		return f
	}
	if e.Kind == "amplitude" && len(e.Noise.Frequencies) > 0 && slices.ContainsFunc(m.Channels, func(c Channel) bool {
		return (c.Shift != 0 || c.mapped()) && (len(e.Channels) == 0 || slices.Contains(e.Channels, c.Name))
	}) {
		return bad("noise_frequencies_rad_per_ns", "noise of the amplitude of a channel with a shift or a map", "noise of channels without either")
	}
	switch e.Kind {
	case "static":
		return operator("operator", e.Operator)
	case "amplitude", "skew":
		if q := e.Quadrature; q != "" && (e.Kind != "amplitude" || q != "I" && q != "Q") {
			return bad("quadrature", fmt.Sprintf("%q", q), `"I" or "Q", of kind "amplitude"`)
		}
		both := e.Kind == "skew" || e.Quadrature != "" // of channels that have two quadratures
		for _, c := range e.Channels {
			if !channels[c] {
				return bad("channels", fmt.Sprintf("%q", c), "names of [[model.channel]]")
			}
			if m.channel(c).mapped() {
				return bad("channels", fmt.Sprintf("%q, which has a map", c), "channels without a map")
			}
			if both && m.channel(c).Kind != "quadrature" {
				return bad("channels", fmt.Sprintf("%q, which has one quadrature", c), `channels of kind "quadrature"`)
			}
		}
		if both && !slices.ContainsFunc(m.Channels, func(c Channel) bool { return c.Kind == "quadrature" }) {
			return bad("kind", fmt.Sprintf("%q of channels with one quadrature", e.Kind), `a model with a channel of kind "quadrature"`)
		}
	case "line", "crosstalk":
		if len(e.Channels) != 1 || !channels[e.Channels[0]] {
			return bad("channel", fmt.Sprintf("%q", e.Channels), "the name of a [[model.channel]]")
		}
		if m.channel(e.Channels[0]).mapped() {
			return bad("channel", fmt.Sprintf("%q, which has a map", e.Channels[0]), "a channel without a map")
		}
		if e.Kind == "line" {
			return validLine(key, e.Direct, e.Poles, e.Powers, e.Residues)
		}
		if n, want := len(e.Operators), len(m.channel(e.Channels[0]).Operators); n != want {
			return bad("operators", fmt.Sprintf("%d matrices", n), fmt.Sprintf("%d, one for each quadrature of %q", want, e.Channels[0]))
		}
		for i, op := range e.Operators {
			if f := hermitian(fmt.Sprintf("operators[%d]", i), op); f != nil {
				return f
			}
		}
		if !slices.ContainsFunc(e.Operators, func(op []complex128) bool { return !empty(op) }) {
			return bad("operators", "multiples of the identity", "Hermitian matrices of which something is left without the trace")
		}
	case "any":
		if e.Operators == nil && e.Names == nil && e.Weights == nil {
			if m.Dim > maxAnyDim {
				return bad("kind", fmt.Sprintf("%q with %d levels", e.Kind, m.Dim), fmt.Sprintf("up to %d levels, or a list of operators", maxAnyDim))
			}
			return nil
		}
		n := len(e.Operators)
		if n == 0 || len(e.Names) != n || len(e.Weights) != n {
			return bad("operators", fmt.Sprintf("%d matrices, %d names and %d weights", n, len(e.Names), len(e.Weights)), "as many of each, or none of them")
		}
		seen, sum := map[string]bool{}, 0.0
		for i, op := range e.Operators {
			if f := operator(fmt.Sprintf("operators[%d]", i), op); f != nil {
				return f
			}
			if name := e.Names[i]; name == "" || seen[name] {
				return bad("names", fmt.Sprintf("%q as name %d", name, i), "a name of its own for each operator")
			}
			seen[e.Names[i]] = true
			if w := e.Weights[i]; !(w > 0 && w <= 1e6) {
				return bad("weights", w, "numbers above 0")
			}
			sum += e.Weights[i] * e.Weights[i]
		}
		if rms := math.Sqrt(sum / float64(n)); !(math.Abs(rms-1) <= 1e-6) {
			return bad("weights", fmt.Sprintf("a root mean square of %.9g", rms), "weights of root mean square 1")
		}
		if e.Leak {
			for i, op := range e.Operators {
				if !(frobenius(m.leaking(op)) > 1e-6) {
					return bad(fmt.Sprintf("operators[%d]", i), "nothing between the code space and the other levels", "operators that couple them, of a class of leakage")
				}
			}
		}
	default:
		return bad("kind", fmt.Sprintf("%q", e.Kind), `"static", "amplitude", "any", "skew", "line" or "crosstalk"`)
	}
	return nil
}

// leaking gives the part of an operator that leads from the code space out of it: a row for each level outside.
func (m *Model) leaking(op []complex128) []complex128 {
	var part []complex128
	for a := range m.Dim {
		if slices.Contains(m.CodeSpace, a) {
			continue
		}
		for _, b := range m.CodeSpace {
			part = append(part, op[a*m.Dim+b])
		}
	}
	return part
}

// validLine judges the numbers of a line, or of a line's slope.
func validLine(key string, direct complex128, poles []complex128, powers []int, residues []complex128) *fault {
	bad := func(k string, found any, allowed string) *fault {
		return &fault{key + k, fmt.Sprint(found), allowed}
	}
	if !(cmplx.Abs(direct) <= 1e9) {
		return bad("direct", direct, "a finite number")
	}
	n := len(poles)
	if n > maxPoles {
		return bad("poles_per_ns", fmt.Sprintf("%d poles", n), fmt.Sprintf("up to %d", maxPoles))
	}
	if len(powers) != n {
		return bad("powers", fmt.Sprintf("%d powers", len(powers)), fmt.Sprintf("one for each of %d poles", n))
	}
	if len(residues) != n {
		return bad("residues", fmt.Sprintf("%d residues", len(residues)), fmt.Sprintf("one for each of %d poles", n))
	}
	for i, p := range poles {
		if !(real(p) <= -1e-15) || !(cmplx.Abs(p) <= 1e6) {
			return bad(fmt.Sprintf("poles_per_ns[%d]", i), p, "poles with a negative real part, up to 1e6 per ns")
		}
		if powers[i] < 1 || powers[i] > maxPower {
			return bad(fmt.Sprintf("powers[%d]", i), powers[i], fmt.Sprintf("1 to %d", maxPower))
		}
		if !(cmplx.Abs(residues[i]) <= 1e200) {
			return bad(fmt.Sprintf("residues[%d]", i), residues[i], "finite numbers")
		}
	}
	return nil
}

// Recorded matrices carry 17 digits, but a stranger may have typed fewer.
const matrixTolerance = 1e-9

// notHermitian says what keeps m from being a Hermitian n x n matrix, or nothing.
func notHermitian(m []complex128, n int) string {
	if len(m) != n*n {
		return fmt.Sprintf("%d elements", len(m))
	}
	scale := 1.0
	for _, v := range m {
		if !(cmplx.Abs(v) <= 1e6) {
			return fmt.Sprintf("element %v", v)
		}
		scale = math.Max(scale, cmplx.Abs(v))
	}
	for i := range n {
		for j := range n {
			if !(cmplx.Abs(m[i*n+j]-cmplx.Conj(m[j*n+i])) <= matrixTolerance*scale) {
				return fmt.Sprintf("elements (%d, %d) and (%d, %d) that are not conjugates", i, j, j, i)
			}
		}
	}
	return ""
}

// notOrthonormal says what keeps vectors of n entries from being orthonormal, or nothing.
func notOrthonormal(list [][]complex128, n int) string {
	for i, v := range list {
		if len(v) != n {
			return fmt.Sprintf("%d entries in vector %d", len(v), i)
		}
		for _, z := range v {
			if !(cmplx.Abs(z) <= 2) {
				return fmt.Sprintf("entry %v in vector %d", z, i)
			}
		}
		for j := 0; j <= i; j++ {
			var sum complex128
			for k, z := range v {
				sum += cmplx.Conj(list[j][k]) * z
			}
			want := complex128(0)
			if i == j {
				want = 1
			}
			if !(cmplx.Abs(sum-want) <= matrixTolerance) {
				return fmt.Sprintf("vectors %d and %d whose product is %.6g", j, i, sum)
			}
		}
	}
	return ""
}

// notUnitary says what keeps m from being a unitary n x n matrix, or nothing.
func notUnitary(m []complex128, n int) string {
	if len(m) != n*n {
		return fmt.Sprintf("%d elements", len(m))
	}
	for _, v := range m {
		if !(cmplx.Abs(v) <= 2) {
			return fmt.Sprintf("element %v", v)
		}
	}
	g := make([]complex128, n*n)
	mulAdjointLeft(g, m, m, n)
	for i := range n {
		for j := range n {
			want := complex128(0)
			if i == j {
				want = 1
			}
			if !(cmplx.Abs(g[i*n+j]-want) <= matrixTolerance) {
				return fmt.Sprintf("columns %d and %d whose product is %.6g", i, j, g[i*n+j])
			}
		}
	}
	return ""
}
