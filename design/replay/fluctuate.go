package replay

import (
	"context"
	"fmt"
	"math"
	"runtime"
	"slices"
	"sync"

	"holdfast/design/brief"
)

// What a record may hold of one error's spread and noise.
const (
	maxSpread = 64 // sizes
	maxNodes  = 64 // frequencies
)

// A Spread is some sizes of an error over which the infidelity itself is to be low, in the place of what first order leaves.
type Spread struct {
	Way            string    // "average", by Shares, or "worst"; empty where there is none
	Values, Shares []float64 // lambda, either sign; shares of sum 1
}

// A Noise lets an error fluctuate: the sum over nodes of Weights times the filter function
//
//	F(w) = ( |cut A_c|^2 + |cut A_s|^2 )/c,    A_c = int V_I cos(wt) dt,   A_s = int V_I sin(wt) dt,
//
// over the window, t from its start, is what it leaves of 1 - F_pro to first order in its spectrum (Green, Sastrawan, Uys, Biercuk 2013, New J. Phys. 15,
// 095004), the average gate infidelity c/(c+1) of that with c the size of the code space. Of k states it is the sum of the same of (1 - Q) A Q over k.
type Noise struct {
	Frequencies []float64 // rad/ns, above zero
	Weights     []float64 // in units of lambda squared
}

// spread gives the mean infidelity for the required ends over the sizes of a class's spread, or the worst.
func (e *engine) spread(ctx context.Context, c *Class, p *probe) (float64, error) {
	gates, found := make([]gate, len(c.Spread.Values)), make([]float64, len(c.Spread.Values))
	for i, x := range c.Spread.Values {
		gates[i] = gate{p, x}
	}
	if err := e.infidelities(ctx, gates, found); err != nil {
		return 0, err
	}
	if c.Spread.Way == "worst" {
		return slices.Max(found), nil
	}
	mean := 0.0
	for i, x := range found {
		mean += c.Spread.Shares[i] * x
	}
	return mean, nil
}

// noise gives the infidelity that a class's noise adds. Every component is an error of its own, V cos(wt) or V sin(wt), put into the
// model as a term that turns, or of an amplitude as two paths of the channel, of which central differences of exact gates give the first
// order. strength is that of V: how far lambda = 1 turns at most.
func (e *engine) noise(ctx context.Context, c *Class, strength float64) (float64, error) {
	if strength == 0 {
		return 0, nil
	}
	const steps = 2 // 1 and 1/2 of the angle, extrapolated once
	lambda := differenceAngle / strength
	n, cols := e.dim, e.columns
	var origin []complex128
	if err := e.run(ctx, []gate{{}}, func(l *labour, _ int, u []complex128) {
		origin = append([]complex128(nil), e.ended(l, u)...)
	}); err != nil {
		return 0, err
	}
	window := func(frequency, cosine, sine float64) ([]complex128, error) {
		m := e.m.waving(c, frequency, cosine, sine)
		o, err := newEngineTo(ctx, m, e.tolerance, math.Inf(1))
		if err != nil {
			return nil, err
		}
		var u []complex128
		err = o.run(ctx, []gate{{}}, func(_ *labour, _ int, w []complex128) { u = append([]complex128(nil), w...) })
		return u, err
	}
	nodes := len(c.Noise.Frequencies)
	gates := make([][]complex128, nodes*2*2*steps) // by node, phase, step and sign
	errs := make([]error, len(gates))
	var wg sync.WaitGroup
	workers := min(runtime.GOMAXPROCS(0), maxLabours)
	for first := range workers {
		wg.Go(func() {
			for i := first; i < len(gates); i += workers {
				size := lambda / float64(int(1)<<(i/2%steps))
				if i%2 == 1 {
					size = -size
				}
				cosine, sine := size, 0.0
				if i/(2*steps)%2 == 1 {
					cosine, sine = 0, size
				}
				gates[i], errs[i] = window(c.Noise.Frequencies[i/(4*steps)], cosine, sine)
			}
		})
	}
	wg.Wait()
	for _, err := range errs {
		if err != nil {
			return 0, err
		}
	}
	l := e.labours[0]
	sum := 0.0
	left := make([]complex128, n*cols)
	for wave := range 2 * nodes {
		var slopes [steps][]complex128
		for s := range steps {
			at := (wave*steps + s) * 2
			up := append([]complex128(nil), e.first(l, e.ended(l, gates[at]))...)
			down := e.first(l, e.ended(l, gates[at+1]))
			f := complex(float64(int(1)<<s)/(2*lambda), 0)
			for k := range up {
				up[k] = f * (up[k] - down[k])
			}
			slopes[s] = up
		}
		for k := range left {
			slopes[1][k] += (slopes[1][k] - slopes[0][k]) / 3
		}
		multiplyAdjoint(left, origin, slopes[1], n, n, cols)
		for k := range left {
			left[k] *= 1i
		}
		o := &probed{}
		e.read(o, left)
		f := frobenius(o.left)
		sum += c.Noise.Weights[wave/2] * f * f
	}
	if e.states > 0 {
		return sum / float64(e.states), nil
	}
	return sum / float64(len(e.m.CodeSpace)+1), nil
}

// waving gives the model with the error's V times cosine cos(wt) + sine sin(wt), t from the window's start.
func (m *Model) waving(c *Class, frequency, cosine, sine float64) *Model {
	o := *m
	if c.Kind == "static" {
		o.Rotating = append(slices.Clone(m.Rotating), Rotating{Frequency: frequency, Cosine: scaled(c.Operator, cosine), Sine: scaled(c.Operator, sine)})
		return &o
	}
	// u cos(wt) is half of u e^{-iwt} and u e^{iwt}; u sin(wt) half of i u e^{-iwt} and -i u e^{iwt}, and i u drives -O_I by u_Q and O_Q by u_I
	o.Channels = slices.Clone(m.Channels)
	for i := range o.Channels {
		ch := &o.Channels[i]
		if len(c.Channels) > 0 && !slices.Contains(c.Channels, ch.Name) {
			continue
		}
		ways := append([]Path{{Operators: ch.Operators}}, m.Channels[i].Paths...)
		ch.Paths = slices.Clone(m.Channels[i].Paths)
		for _, way := range ways {
			if len(way.Operators) == 1 { // u is real: what of the path is u sin goes to -Operators[1]
				ch.Paths = append(ch.Paths, Path{Frequency: frequency, Operators: [][]complex128{scaled(way.Operators[0], cosine), scaled(way.Operators[0], -sine)}})
				continue
			}
			for _, sign := range []float64{1, -1} {
				ch.Paths = append(ch.Paths, Path{Frequency: way.Frequency + sign*frequency, Operators: waved(way.Operators, cosine/2, sign*sine/2)})
			}
		}
	}
	return &o
}

// waved gives the two operators that (a + i b) u drives: a u_I - b u_Q what u_I did, and a u_Q + b u_I what u_Q did.
func waved(ops [][]complex128, a, b float64) [][]complex128 {
	one, two := scaled(ops[0], a), scaled(ops[1], a)
	for k := range one {
		one[k] += complex(b, 0) * ops[1][k]
		two[k] -= complex(b, 0) * ops[0][k]
	}
	return [][]complex128{one, two}
}

// fluctuations compares a recorded spread and noise with the brief's.
func (c *comparison) fluctuations(key string, r *Class, e *brief.Error, span, scale float64) {
	c.text(key+"spread", r.Spread.Way, e.Spread)
	switch {
	case e.Spread == "" || r.Spread.Way != e.Spread:
	case e.Values == nil && e.Spread == "average": // a normal distribution, by whatever quadrature
		second := 0.0
		for i, x := range r.Spread.Values {
			second += r.Spread.Shares[i] * x * x
		}
		c.number(key+"spread_values", math.Sqrt(second), scale*e.Size)
	default:
		values := e.Values
		if values == nil {
			values = []float64{-e.Size, 0, e.Size}
		}
		if len(values) != len(r.Spread.Values) {
			c.differ(key+"spread_values", fmt.Sprintf("%d sizes", len(r.Spread.Values)), fmt.Sprintf("%d sizes", len(values)))
			break
		}
		for i, x := range values {
			c.number(fmt.Sprintf("%sspread_values[%d]", key, i), r.Spread.Values[i], scale*x)
		}
	}
	nodes := len(r.Noise.Frequencies)
	if e.Noise == nil || nodes == 0 {
		if (e.Noise == nil) != (nodes == 0) {
			c.differ(key+"noise_frequencies_rad_per_ns", fmt.Sprintf("%d frequencies", nodes), map[bool]string{true: "none", false: "those of the brief's noise"}[e.Noise == nil])
		}
		return
	}
	rule := e.Noise.Nodes(span, maxNodes)
	if len(rule.Frequency) != nodes {
		c.differ(key+"noise_frequencies_rad_per_ns", fmt.Sprintf("%d frequencies", nodes), fmt.Sprintf("%d frequencies", len(rule.Frequency)))
		return
	}
	for i := range nodes {
		c.number(fmt.Sprintf("%snoise_frequencies_rad_per_ns[%d]", key, i), r.Noise.Frequencies[i], rule.Frequency[i])
		c.number(fmt.Sprintf("%snoise_weights[%d]", key, i), r.Noise.Weights[i], rule.Weight[i])
	}
}

// validFluctuations checks a class's spread and noise.
func (c *Class) validFluctuations(key string) *fault {
	bad := func(k string, found any, allowed string) *fault {
		return &fault{key + k, fmt.Sprint(found), allowed}
	}
	s, n := &c.Spread, &c.Noise
	if s.Way != "" && s.Way != "average" && s.Way != "worst" {
		return bad("spread", fmt.Sprintf("%q", s.Way), `"average" or "worst"`)
	}
	if (s.Way == "") != (len(s.Values) == 0) || len(s.Values) != len(s.Shares) || len(s.Values) > maxSpread {
		return bad("spread_values", fmt.Sprintf("%d values and %d shares", len(s.Values), len(s.Shares)), fmt.Sprintf("as many of either, up to %d, with spread, and none without", maxSpread))
	}
	sum := 0.0
	for i, x := range s.Values {
		if !(math.Abs(x) <= 1e4) {
			return bad("spread_values", x, "-1e4 to 1e4")
		}
		if sum += s.Shares[i]; !(s.Shares[i] >= 0) {
			return bad("spread_shares", s.Shares[i], "0 to 1")
		}
	}
	if len(s.Values) > 0 && !(math.Abs(sum-1) <= 1e-9) {
		return bad("spread_shares", fmt.Sprintf("a sum of %v", sum), "shares of sum 1")
	}
	if s.Way != "" && c.Kind == "any" {
		return bad("spread", "one of kind any", "one of a single error")
	}
	if len(n.Frequencies) != len(n.Weights) || len(n.Frequencies) > maxNodes {
		return bad("noise_frequencies_rad_per_ns", fmt.Sprintf("%d frequencies and %d weights", len(n.Frequencies), len(n.Weights)), fmt.Sprintf("as many of either, up to %d", maxNodes))
	}
	for i, w := range n.Frequencies {
		if !(w > 0 && w <= maxTurn) {
			return bad("noise_frequencies_rad_per_ns", w, fmt.Sprintf("above 0, to %g", float64(maxTurn)))
		}
		if !(n.Weights[i] >= 0 && n.Weights[i] <= 1e8) {
			return bad("noise_weights", n.Weights[i], "0 to 1e8")
		}
	}
	if len(n.Frequencies) > 0 && c.Kind != "static" && (c.Kind != "amplitude" || c.Quadrature != "") {
		return bad("noise_frequencies_rad_per_ns", fmt.Sprintf("noise of kind %q", c.Kind), `noise of kind "static", or "amplitude" of both quadratures`)
	}
	return nil
}
