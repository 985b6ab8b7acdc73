package replay

import (
	"fmt"
	"math"
	"math/cmplx"
)

// What a model may hold; larger ones are refused before any work is done.
const (
	maxSamples  = 65536
	maxDim      = 64
	maxChannels = 16
	maxPoles    = 64 // entries of one line
	maxPower    = 16
	maxErrors   = 64
	maxAnyDim   = 16 // levels of which all d^2-1 static errors are judged
)

// A Model is [model] of pulse.toml with the samples loaded: all that is needed to recompute the gate. Matrices are
// row-major. It is not changed by any method.
type Model struct {
	SamplePeriod float64 // ns
	Samples      int     // of the span, guards included
	Bits         int     // of the converters; x = code / 2^(Bits-1)
	Ends         string  // "settled" or "window"
	WindowStart  float64 // ns

	Dim                     int
	CodeSpace               []int        // basis states
	Static                  []complex128 // Dim x Dim, rad/ns, Hermitian
	Target                  []complex128 // unitary on the code space
	FreeZBefore, FreeZAfter []float64    // rad, one for each site; empty when not free

	Channels []Channel
	Errors   []Class
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

	// The limits, in shares of full scale; +Inf where the instrument has none.
	MaxShare, MaxSlew, RingOut float64
	GuardLead, GuardTrail      int

	Samples []complex128 // x_I + i x_Q, what the converters play
	Exact   []complex128 // the same before rounding; nil when there is none
	Codes   []int16      // interleaved as in the file; nil for a pulse that has no codes
}

// A Class is one [[model.error]]: what may go wrong, and what the record says of it.
type Class struct {
	Name           string
	Kind           string       // "static", "amplitude" or "any"
	Held           bool         // the pulse was designed to be held against it
	Operator       []complex128 // kind static: Dim x Dim, multiplied by lambda in rad/ns
	Channels       []string     // kind amplitude; empty means all
	Susceptibility float64      // that the record claims; 0 to 1
	claimed        bool
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
	if what := notHermitian(m.Static, m.Dim); what != "" {
		return bad("static_rad_per_ns", what, fmt.Sprintf("a Hermitian %d x %d matrix", m.Dim, m.Dim))
	}
	d := len(m.CodeSpace)
	if what := notUnitary(m.Target, d); what != "" {
		return bad("target", what, fmt.Sprintf("a unitary %d x %d matrix on the code space", d, d))
	}
	for _, z := range []struct {
		key    string
		angles []float64
	}{{"free_z_before", m.FreeZBefore}, {"free_z_after", m.FreeZAfter}} {
		if n := len(z.angles); n > 0 && (n > 6 || 1<<n != d) {
			return bad(z.key, fmt.Sprintf("%d angles", n), fmt.Sprintf("none, or one for each two-level site of a code space of %d", d))
		}
		for _, a := range z.angles {
			if !in(a, -1e6, 1e6) {
				return bad(z.key, a, "angles in rad")
			}
		}
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
	classes := map[string]bool{}
	for i := range m.Errors {
		e, key := &m.Errors[i], fmt.Sprintf("error[%d].", i)
		if classes[e.Name] {
			return bad(key+"name", fmt.Sprintf("%q again", e.Name), "a name of its own")
		}
		classes[e.Name] = true
		switch e.Kind {
		case "static":
			if what := notHermitian(e.Operator, m.Dim); what != "" {
				return bad(key+"operator", what, fmt.Sprintf("a Hermitian %d x %d matrix", m.Dim, m.Dim))
			}
			op := append([]complex128(nil), e.Operator...)
			dropTrace(op, m.Dim)
			if !(frobenius(op) > 1e-6) {
				return bad(key+"operator", "a multiple of the identity", "a Hermitian matrix of which something is left without its trace")
			}
		case "amplitude":
			for _, c := range e.Channels {
				if !names[c] {
					return bad(key+"channels", fmt.Sprintf("%q", c), "names of [[model.channel]]")
				}
			}
		case "any":
			if m.Dim > maxAnyDim {
				return bad(key+"kind", fmt.Sprintf("%q with %d levels", e.Kind, m.Dim), fmt.Sprintf("up to %d levels", maxAnyDim))
			}
		default:
			return bad(key+"kind", fmt.Sprintf("%q", e.Kind), `"static", "amplitude" or "any"`)
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
	if !(cmplx.Abs(c.Direct) <= 1e9) {
		return bad("direct", c.Direct, "a finite number")
	}
	n := len(c.Poles)
	if n > maxPoles {
		return bad("poles_per_ns", fmt.Sprintf("%d poles", n), fmt.Sprintf("up to %d", maxPoles))
	}
	if len(c.Powers) != n {
		return bad("powers", fmt.Sprintf("%d powers", len(c.Powers)), fmt.Sprintf("one for each of %d poles", n))
	}
	if len(c.Residues) != n {
		return bad("residues", fmt.Sprintf("%d residues", len(c.Residues)), fmt.Sprintf("one for each of %d poles", n))
	}
	for i, p := range c.Poles {
		if !(real(p) <= -1e-15) || !(cmplx.Abs(p) <= 1e6) {
			return bad(fmt.Sprintf("poles_per_ns[%d]", i), p, "poles with a negative real part, up to 1e6 per ns")
		}
		if c.Powers[i] < 1 || c.Powers[i] > maxPower {
			return bad(fmt.Sprintf("powers[%d]", i), c.Powers[i], fmt.Sprintf("1 to %d", maxPower))
		}
		if !(cmplx.Abs(c.Residues[i]) <= 1e30) {
			return bad(fmt.Sprintf("residues[%d]", i), c.Residues[i], "finite numbers")
		}
	}
	if len(c.Operators) != quadratures {
		return bad("operators", fmt.Sprintf("%d matrices", len(c.Operators)), fmt.Sprintf("%d for kind %q", quadratures, c.Kind))
	}
	for i, op := range c.Operators {
		if what := notHermitian(op, dim); what != "" {
			return bad(fmt.Sprintf("operators[%d]", i), what, fmt.Sprintf("a Hermitian %d x %d matrix", dim, dim))
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
