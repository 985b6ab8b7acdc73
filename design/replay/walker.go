package replay

import (
	"context"
	"math"
	"math/cmplx"
	"slices"
)

// A chain is one entry r/(s-p)^m of a line:
//
//	z_1' = p z_1 + x,  z_k' = p z_k + z_(k-1),  u = r z_m
//
// A pole that is fast against the sample period would lose digits near its equilibrium z_k = x/(-p)^k, so its chain keeps the
// distance from there instead (settling), and the equilibrium goes into the input's direct share.
type chain struct {
	p, r     complex128
	settling bool
	z        []complex128
}

func (c *chain) equilibrium(k int) complex128 { // of z_(k+1) for x = 1
	e := complex(1, 0)
	for range k + 1 {
		e /= -c.p
	}
	return e
}

// input tells the chain that x has jumped.
func (c *chain) input(from, to complex128) {
	if !c.settling {
		return
	}
	e := (from - to) / -c.p
	for k := range c.z {
		c.z[k] += e
		e /= -c.p
	}
}

// series adds the first len(dst) Taylor coefficients of r z_m over a step of s ns to dst, scaled to the step: u(t0 + y s) is the
// sum of dst[n] y^n. cur is scratch for a chain.
func (c *chain) series(x complex128, s float64, dst, cur []complex128) {
	m := len(c.z)
	cur = cur[:m]
	copy(cur, c.z)
	ps := c.p * complex(s, 0)
	for n := range dst {
		v := c.r * cur[m-1]
		dst[n] += v
		if m == 1 && n > 0 && math.Abs(real(v))+math.Abs(imag(v)) < 1e-30 && cmplx.Abs(ps) < 20 {
			break // what follows may grow by e^20, 5e8, and still adds nothing
		}
		f := complex(1/float64(n+1), 0)
		for k := m - 1; k > 0; k-- {
			cur[k] = f * (ps*cur[k] + complex(s, 0)*cur[k-1])
		}
		cur[0] *= ps
		if n == 0 && !c.settling {
			cur[0] += complex(s, 0) * x
		}
		cur[0] *= f
	}
}

// advance moves the chain on by s ns, in steps of its own that are short against the pole, each a Taylor series
// to the end of double precision.
func (c *chain) advance(x complex128, s float64, cur, sum []complex128) {
	if c.settling {
		x = 0
	}
	m := len(c.z)
	cur, sum = cur[:m], sum[:m]
	steps := math.Ceil(cmplx.Abs(c.p) * s)
	if steps < 1 {
		steps = 1
	}
	h := s / steps
	ph, hc := c.p*complex(h, 0), complex(h, 0)
	// 1/24! is 1.6e-24, and a chain's terms die like those of its pole; a single state of a slow pole is done sooner.
	terms := 24
	if m == 1 {
		terms = 1
		for size := 1.0; size > 1e-19; terms++ { // |ph|^(n-1)/n!
			size *= cmplx.Abs(ph) / float64(terms+1)
		}
	}
	for range int(steps) {
		if x == 0 && c.peak() < 1e-40 { // under anything that adds up, and a longer step may follow than its series could take
			clear(c.z)
			return
		}
		copy(cur, c.z)
		copy(sum, c.z)
		for n := range terms {
			f := complex(1/float64(n+1), 0)
			for k := m - 1; k > 0; k-- {
				cur[k] = f * (ph*cur[k] + hc*cur[k-1])
				sum[k] += cur[k]
			}
			cur[0] *= ph
			if n == 0 {
				cur[0] += hc * x
			}
			cur[0] *= f
			sum[0] += cur[0]
		}
		copy(c.z, sum)
	}
}

// left bounds the integral of |r z_m| over all times to come when the input is zero.
func (c *chain) left() float64 {
	s, a := 0.0, 1.0
	for k := len(c.z) - 1; k >= 0; k-- {
		a /= -real(c.p)
		s += cmplx.Abs(c.z[k]) * a
	}
	return s * cmplx.Abs(c.r)
}

// peak bounds |r z_m| at all times to come when the input is zero.
func (c *chain) peak() float64 {
	// |t^j/j! e^(pt)| is largest at t = j/|Re p|: (j/e|Re p|)^j / j!
	s, top := 0.0, 1.0
	for j := range len(c.z) {
		if j > 0 {
			top = math.Pow(float64(j)/(math.E*-real(c.p)), float64(j)) / math.Gamma(float64(j+1))
		}
		s += cmplx.Abs(c.z[len(c.z)-1-j]) * top
	}
	return s * cmplx.Abs(c.r)
}

// A lineState is one channel's line, or the slope of it, while it is played.
type lineState struct {
	channel int
	chains  []chain
	x       complex128   // the sample that is held now
	next    int          // index of the next sample to arrive
	static  complex128   // direct share of u per x, with the equilibria of settling chains
	buf     []complex128 // Taylor coefficients of what arrives, in shares of full scale
}

func newLineState(channel int, period float64, direct complex128, poles []complex128, powers []int, residues []complex128) lineState {
	l := lineState{channel: channel, static: direct, buf: make([]complex128, seriesLength)}
	for i, p := range poles {
		c := chain{p: p, r: residues[i], z: make([]complex128, powers[i])}
		c.settling = cmplx.Abs(p)*period > 1
		if c.settling {
			l.static += c.r * c.equilibrium(powers[i]-1)
		}
		l.chains = append(l.chains, c)
	}
	return l
}

// A walker carries the lines of all channels through a sequence of pulses and writes plans of what arrives: steps in
// time with the Taylor coefficients of every control. The sequence is the model's pulse, once for each element of turns, its samples
// times that element.
type walker struct {
	e        *engine
	probe    *probe    // nil, or an error of which the controls are wanted too
	controls []control // those of the plans
	t        float64   // ns
	turns    []complex128
	lines    []lineState // of every channel, then of the probe's slope
	step     float64     // ns, that fitted last
	count    int         // of steps so far

	tolerance float64 // of the norm of U, per step

	ctl        []float64 // Taylor coefficients of every control, seriesLength each
	cos, sin   []float64 // those of what turns
	cur, sum   []complex128
	norms, maj []float64
	bend       []float64 // scratch of a map
}

func (e *engine) newWalker(pr *probe, turns ...complex128) *walker {
	w := &walker{
		e: e, probe: pr, controls: e.controls, turns: turns, t: e.start, step: e.m.SamplePeriod, tolerance: e.tolerance,
		cur: make([]complex128, maxPower), sum: make([]complex128, maxPower),
		norms: make([]float64, seriesLength), maj: make([]float64, seriesLength),
		cos: make([]float64, seriesLength), sin: make([]float64, seriesLength), bend: make([]float64, 4*seriesLength),
	}
	for c := range e.m.Channels {
		ch := &e.m.Channels[c]
		w.t = math.Min(w.t, ch.Delay)
		w.lines = append(w.lines, newLineState(c, e.m.SamplePeriod, ch.Direct, ch.Poles, ch.Powers, ch.Residues))
	}
	if pr != nil && pr.slope != nil {
		s := pr.slope
		w.lines = append(w.lines, newLineState(pr.channel(), e.m.SamplePeriod, s.Direct, s.Poles, s.Powers, s.Residues))
		w.controls = slices.Concat(e.controls, pr.extra)
	}
	w.ctl = make([]float64, seriesLength*len(w.controls))
	return w
}

// newPlan gives an empty plan for the walker's steps.
func (w *walker) newPlan() *plan {
	return &plan{controls: len(w.controls), least: w.tolerance / 4000}
}

// fork gives an independent walker at the same instant, of which the sequence ends after the first n pulses.
func (w *walker) fork(n int) *walker {
	o := w.e.newWalker(w.probe, w.turns[:n]...)
	o.t, o.step = w.t, w.step
	for c := range w.lines {
		o.lines[c].x, o.lines[c].next = w.lines[c].x, w.lines[c].next
		for i := range w.lines[c].chains {
			copy(o.lines[c].chains[i].z, w.lines[c].chains[i].z)
		}
	}
	return o
}

// arrival is when sample k of the sequence arrives on channel c, ns.
func (w *walker) arrival(c, k int) float64 {
	return w.e.m.Channels[c].Delay + float64(k)*w.e.m.SamplePeriod
}

// sample is what is held from the arrival of sample k on channel c; zero after the sequence.
func (w *walker) sample(c, k int) complex128 {
	n := w.e.m.Samples
	if k/n >= len(w.turns) {
		return 0
	}
	d := &w.e.drives[c]
	x := d.samples[k%n]
	if d.turned {
		x *= w.turns[k/n]
	}
	return x
}

// take loads every sample that has arrived.
func (w *walker) take() {
	slack := 1e-9 * w.e.m.SamplePeriod // edges of two channels this close are one
	for i := range w.lines {
		l := &w.lines[i]
		for l.next <= len(w.turns)*w.e.m.Samples && w.arrival(l.channel, l.next) <= w.t+slack {
			x := w.sample(l.channel, l.next)
			for i := range l.chains {
				l.chains[i].input(l.x, x)
			}
			l.x = x
			l.next++
		}
	}
}

// edge is the next arrival of a sample, or +Inf; the end of the sequence counts as one of zero.
func (w *walker) edge() float64 {
	t := math.Inf(1)
	for i := range w.lines {
		if k := w.lines[i].next; k <= len(w.turns)*w.e.m.Samples {
			t = math.Min(t, w.arrival(w.lines[i].channel, k))
		}
	}
	return t
}

// to walks on to time t, ns, and appends the steps to p, good for errors up to reach. What arrives at t itself is not
// taken yet.
func (w *walker) to(ctx context.Context, t float64, r reach, p *plan) error {
	slack := 1e-9 * w.e.m.SamplePeriod
	for w.t < t-slack {
		w.take()
		end := math.Min(t, w.edge())
		if end > t-slack {
			end = t
		}
		for w.t < end {
			if err := ctx.Err(); err != nil {
				return err
			}
			parts := math.Ceil((end-w.t)/w.step - 1e-6)
			if parts < 1 {
				parts = 1
			}
			if err := w.stride((end-w.t)/parts, r, p); err != nil {
				return err
			}
			if end-w.t < slack {
				w.t = end
			}
		}
		w.t = end
	}
	w.t = t
	return nil
}

// settle walks on until no more than the engine's angle is still to come, or the budget of steps is spent, and says how much is left, in rad.
func (w *walker) settle(ctx context.Context, p *plan) (left float64, err error) {
	for {
		w.take()
		edge := w.edge()
		if math.IsInf(edge, 1) {
			break
		}
		if err := w.to(ctx, edge, reach{}, p); err != nil {
			return 0, err
		}
	}
	for w.count = 0; ; {
		left = w.left()
		if left <= w.e.still || w.count >= settleBudget {
			return left, nil
		}
		if err := ctx.Err(); err != nil {
			return 0, err
		}
		if err := w.stride(w.step, reach{}, p); err != nil {
			return 0, err
		}
	}
}

// left bounds the angle in rad by which what is stored in the lines can still turn the device: the widest spread of
// eigenvalues times the integral of |u|, and for a shift the largest |u| times the same.
func (w *walker) left() float64 {
	a := 0.0
	for c := range w.e.drives {
		d := &w.e.drives[c]
		u, peak := 0.0, 0.0
		for i := range w.lines[c].chains {
			u += w.lines[c].chains[i].left()
			peak += w.lines[c].chains[i].peak()
		}
		norm := 0.0
		for _, k := range d.ops {
			if k >= 0 {
				norm = math.Max(norm, w.e.controls[k].norm)
			}
		}
		for _, p := range d.paths {
			norm += w.e.controls[p[0]].norm
		}
		a += 2*norm*u*d.fullScale*w.e.m.Channels[c].steepest() + 2*d.norm*peak*u
	}
	return a
}

// series fills ctl with the Taylor coefficients of every control over a step of s ns from now, scaled to the step.
func (w *walker) series(s float64) {
	for i := range w.lines {
		l := &w.lines[i]
		clear(l.buf)
		l.buf[0] = l.static * l.x
		for k := range l.chains {
			l.chains[k].series(l.x, s, l.buf, w.cur)
		}
		if w.e.drives[l.channel].ops[1] < 0 { // one quadrature: Re u
			for n, v := range l.buf {
				l.buf[n] = complex(real(v), 0)
			}
		}
		if ch := &w.e.m.Channels[l.channel]; ch.mapped() { // of which there are no errors of the line
			ch.curve(l.buf, w.bend)
		}
	}
	slope := w.lines[len(w.lines)-1].buf // when there is one
	for k := range w.controls {
		c := &w.controls[k]
		if c.channel < 0 {
			w.turn(c.frequency, s)
			if c.part == cosTerm {
				copy(w.coefficients(k), w.cos)
			} else {
				copy(w.coefficients(k), w.sin)
			}
			continue
		}
		u, f, dst := w.lines[c.channel].buf, w.e.drives[c.channel].fullScale, w.coefficients(k)
		switch c.part {
		case inPhase, quadrature, slopeI, slopeQ:
			if c.part >= slopeI {
				u = slope
			}
			for n, v := range u {
				if c.part == inPhase || c.part == slopeI {
					dst[n] = f * real(v)
				} else {
					dst[n] = f * imag(v)
				}
			}
		case cosI, sinI, cosQ, sinQ:
			w.turn(c.frequency, s)
			turned := w.cos
			if c.part == sinI || c.part == sinQ {
				turned = w.sin
			}
			if c.slope {
				u = slope
			}
			for n := range dst {
				sum := 0.0
				for j := 0; j <= n; j++ {
					v := real(u[j])
					if c.part >= cosQ {
						v = imag(u[j])
					}
					sum += v * turned[n-j]
				}
				dst[n] = f * sum
			}
		default: // products, in shares of full scale
			for n := range dst {
				sum := 0.0
				for j := 0; j <= n; j++ {
					a, b := u[j], u[n-j]
					switch c.part {
					case squareI:
						sum += real(a) * real(b)
					case squareQ:
						sum += imag(a) * imag(b)
					case cross:
						sum += real(a) * imag(b)
					case beat:
						sum += real(a)*real(slope[n-j]) + imag(a)*imag(slope[n-j])
					case slopes:
						sum += real(slope[j])*real(slope[n-j]) + imag(slope[j])*imag(slope[n-j])
					}
				}
				dst[n] = sum
			}
		}
	}
}

// turn fills cos and sin with the Taylor coefficients of cos(w t) and sin(w t), t from the window's start, over a step of s ns from now:
// real and imaginary part of e^(iwt) (iws)^n/n!.
func (w *walker) turn(frequency, s float64) {
	z := cmplx.Rect(1, frequency*(w.t-w.e.start))
	for n := range w.cos {
		w.cos[n], w.sin[n] = real(z), imag(z)
		z *= complex(0, frequency*s/float64(n+1))
	}
}

// stride finds a step of at most s ns that the bound of the remainder allows, appends it to p and moves the lines on.
func (w *walker) stride(s float64, r reach, p *plan) error {
	w.series(s)
	order := w.order(s, r)
	for order > goodOrder {
		if order <= maxOrder {
			s *= 0.8
		} else {
			s *= 0.5
		}
		if !(s > 1e-12*w.e.m.SamplePeriod) {
			return errTooFast
		}
		w.step = s
		w.series(s)
		order = w.order(s, r)
	}
	if w.count++; w.count > stridesBase+stridesPerSample*w.e.m.Samples*len(w.turns) {
		return errTooLong
	}
	if err := p.append(s, order, w.ctl); err != nil {
		return err
	}
	for c := range w.lines {
		l := &w.lines[c]
		for i := range l.chains {
			l.chains[i].advance(l.x, s, w.cur, w.sum)
		}
	}
	w.t += s
	if order < goodOrder/2 && s >= w.step { // cut at an edge, a step says nothing about longer ones
		w.step = 1.25 * s
	}
	return nil
}
