package replay

import (
	"errors"
	"math"
)

// Steps and orders. Over one step of s ns, y = t/s in [0, 1],
//
//	H s = sum H_n y^n,   U = sum U_n y^n,   U_(n+1) = -i/(n+1) sum_(j<=n) H_j U_(n-j),   U_0 = 1.
//
// With h_n a bound of the norm of H_n, the numbers m_0 = 1, m_(n+1) = 1/(n+1) sum h_j m_(n-j) bound the norms of U_n
// (Cauchy's majorants: by induction, term by term), so that the series cut after order N is wrong by at most the sum of m_n for n > N.
// That sum is taken over seriesLength terms and closed as a geometric series. The order is the least for which it is under
// the tolerance; a step that would need more than goodOrder is shortened. The bound holds for every error up to the plan's
// reach, so the steps do not depend on which errors are simulated together.
const (
	seriesLength  = 42
	maxOrder      = 36
	goodOrder     = 24         // flat within 3 % from 20 to 32 on a low-pass of a fifth of the sample rate, a tenth slower at 16
	stepTolerance = 4e-16      // of the norm of U, per step: about 1e-13 over a gate of a hundred samples
	maxNumbers    = 60_000_000 // coefficients of one plan, about half a gigabyte

	// Errors of more than two levels are judged with less, at half the cost: about 1e-8 of the norm of U over a hundred samples at the worst, and so
	// 1e-10 of an infidelity of 1e-4.
	roughTolerance = 1e-10

	// The steps of one walk, so that absurd models end soon; real lines take one to five a sample.
	stridesBase      = 100_000
	stridesPerSample = 200

	settledAngle = 1e-12 // rad: what is still to come when a gate counts as settled
	nearlyAngle  = 1e-7  // the same where few digits are asked for
	settleBudget = stridesBase
)

var errTooFast = errors.New("the line's poles and residues are too fast or too large to integrate")
var errTooLong = errors.New("the line is so fast, or the static part so large, against the length of the pulse that replay would need hundreds of steps a sample")

// A reach says for how large an error a plan is good.
type reach struct {
	static    float64 // norm of lambda V, rad/ns
	amplitude float64 // largest |lambda| of an error of amplitude or skew
	line      float64 // largest |lambda| of an error of a line
}

// reaches are the plans that are made, each when it is first needed: about 8 MHz and 12.5 %, 32 MHz and 50 %, and
// beyond what is ever searched. Plans for an error of a line hold for it alone, up to the same shares.
var reaches = [...]reach{{0.026, 0.125, 0}, {0.104, 0.5, 0}, {0.416, 2, 0}, {6.7, 30, 0}}

// as gives a reach for plans of one kind.
func (r reach) as(line bool) reach {
	if line {
		return reach{line: r.amplitude}
	}
	return r
}

func (r reach) holds(need reach) bool {
	return need.static <= r.static && need.amplitude <= r.amplitude && need.line <= r.line
}

// A plan is a stretch of time as steps, each with the Taylor coefficients of every control, scaled to the step:
// coefficient j of control k of a step stands at numbers[at + k*order + j].
type plan struct {
	controls int
	least    float64 // a coefficient that is less, times the step, can be left out
	steps    []timeStep
	numbers  []float64
	length   float64 // ns
}

type timeStep struct {
	s     float64 // ns
	order int     // of U; the controls have as many coefficients
	at    int
}

func (p *plan) append(s float64, order int, ctl []float64) error {
	if len(p.numbers) > maxNumbers {
		return errTooLong
	}
	p.steps = append(p.steps, timeStep{s, order, len(p.numbers)})
	for k := range p.controls {
		p.numbers = append(p.numbers, ctl[k*seriesLength:k*seriesLength+order]...)
	}
	p.length += s
	return nil
}

// order gives the least order that is good for a step of s ns with the controls in w.ctl, or more than maxOrder.
func (w *walker) order(s float64, r reach) int {
	h, m := w.norms, w.maj
	clear(h)
	w.bound(h, r, s)
	h[0] += (w.e.staticNorm + r.static) * s
	// The last coefficients may all be too small to matter: leave them out of the sums.
	last := seriesLength - 1
	for last > 0 && h[last] < 1e-25 {
		last--
	}
	m[0] = 1
	for n := range seriesLength - 1 {
		sum := 0.0
		for j := 0; j <= min(n, last); j++ {
			sum += h[j] * m[n-j]
		}
		m[n+1] = sum / float64(n+1)
	}
	// Beyond the last term kept: a geometric series with twice the last ratio, to be safe.
	const end = seriesLength - 1
	rest := 0.0
	if m[end] > 0 {
		q := 2 * m[end] / m[end-1]
		if !(q < 1) {
			return maxOrder + 1
		}
		rest = m[end] * q / (1 - q)
	}
	for n := end; n > 0; n-- {
		rest += m[n]
		if !(rest <= w.tolerance) {
			return min(n, maxOrder+1)
		}
	}
	return 1
}

// bound adds to h, coefficient by coefficient, s times the sum over channels of a bound of what the channel adds to H, whichever
// error up to r there is. Channels are not added up before, for an error may be of one of two that cancel. With N_n the norm of
// u_I O_I + u_Q O_Q in coefficient n, an error of amplitude or skew adds lambda times
//
//	u_I O_I + u_Q O_Q, u_I O_I, u_Q O_Q or u_Q O_I
//
// and a shift by |u|^2 K, whose coefficients are sums of products of those of u and so complete to the order of u, becomes at most
// the shift for (1 + lambda)^2 as much of any of u_I^2, u_Q^2 and u_I u_Q. A line's error adds lambda N of v and the beat and square of v.
// An error of crosstalk adds lambda times what the channel's u drives elsewhere. Of a path the four controls are added up, each with the larger of its
// operators, which covers every error of u; what turns by itself, cos(wt) C + sin(wt) S, has coefficients of at most |(C, S)| (ws)^n/n!.
func (w *walker) bound(h []float64, r reach, s float64) {
	for c := range w.e.drives {
		d := &w.e.drives[c]
		i, q := d.ops[0], d.ops[1]
		w.boundOf(h, s, r.amplitude, i, q, i, q)
		if d.bent > 0 {
			for _, k := range d.ops {
				for n := range h {
					if k >= 0 {
						h[n] += s * r.amplitude * d.bent * math.Abs(w.coefficients(k)[n])
					}
				}
			}
		}
		for _, p := range d.paths {
			w.boundPath(h, s*(1+r.amplitude), p)
		}
		if d.shift == nil {
			continue
		}
		f, g := s*d.norm, s*d.norm*r.amplitude*(2+r.amplitude)
		a := w.coefficients(d.squares[0])
		if d.squares[1] < 0 {
			for n := range h {
				h[n] += (f + g) * math.Abs(a[n])
			}
			continue
		}
		b, ab := w.coefficients(d.squares[1]), w.coefficients(d.squares[2])
		for n := range h {
			h[n] += f * math.Abs(a[n]+b[n])
			h[n] += g * math.Max(math.Abs(a[n])+math.Abs(b[n]), math.Abs(ab[n]))
		}
	}
	for k := range w.e.controls {
		if c := &w.e.controls[k]; c.part == cosTerm {
			norm := math.Hypot(c.norm, w.e.controls[k+1].norm)
			a, b := w.coefficients(k), w.coefficients(k+1)
			for n := range h {
				h[n] += s * norm * math.Hypot(a[n], b[n])
			}
		}
	}
	if w.probe == nil || w.probe.slope == nil {
		return
	}
	d := &w.e.drives[w.probe.channel()]
	at := len(w.e.controls)
	q := -1
	if d.ops[1] >= 0 {
		q = at + 1
	}
	w.boundOf(h, s*r.line, 0, at, q, d.ops[0], d.ops[1])
	for _, p := range w.probe.paths {
		w.boundPath(h, s*r.line, p)
	}
	if d.shift != nil {
		at++
		if q >= 0 {
			at++
		}
		twice, square := w.coefficients(at), w.coefficients(at+1)
		f := s * d.norm * r.line
		for n := range h {
			h[n] += f * (2*math.Abs(twice[n]) + r.line*math.Abs(square[n]))
		}
	}
}

// boundPath adds f times a bound of the four controls of a path.
func (w *walker) boundPath(h []float64, f float64, path [4]int) {
	for _, k := range path {
		if k < 0 {
			continue
		}
		norm := w.controls[k].norm
		for n, v := range w.coefficients(k) {
			h[n] += f * norm * math.Abs(v)
		}
	}
}

// boundOf adds f times the norm of one field, controls i and q with the operators of controls opI and opQ, and f a times
// whatever an error of its amplitude or skew can add to it. q is negative where there is one quadrature.
func (w *walker) boundOf(h []float64, f, a float64, i, q, opI, opQ int) {
	e := w.e
	u, one := w.coefficients(i), e.controls[opI].norm
	if q < 0 {
		for n := range h {
			h[n] += f * (1 + a) * one * math.Abs(u[n])
		}
		return
	}
	v, two := w.coefficients(q), e.controls[opQ].norm
	for n := range h {
		norm := one*math.Abs(u[n]) + two*math.Abs(v[n])
		if e.dim == 2 { // the norm itself: half the length of the field
			p, o := &e.axes[opI], &e.axes[opQ]
			cr, ci, z := u[n]*p.cr+v[n]*o.cr, u[n]*p.ci+v[n]*o.ci, u[n]*p.z+v[n]*o.z
			norm = math.Sqrt(cr*cr + ci*ci + z*z)
		}
		h[n] += f * norm
		if a > 0 {
			h[n] += f * a * math.Max(norm, math.Max(one*math.Abs(u[n]), math.Max(one, two)*math.Abs(v[n])))
		}
	}
}

// coefficients gives the Taylor coefficients of one control.
func (w *walker) coefficients(k int) []float64 { return w.ctl[k*seriesLength : (k+1)*seriesLength] }
