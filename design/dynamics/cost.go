package dynamics

import (
	"fmt"
	"math"
)

// A Cost is one number to be made small over the controls of a piecewise-constant
// drive, and its exact gradient. With dt = Step,
//
//	H_n = Static + sum_k u[n K + k] Controls[k],   U_n = exp(-i dt H_n) U_{n-1},   U_0 = 1,   n = 1..N,   T = N dt,
//	F   = 1 - |Tr(Target' U_N)|²/d² + sum_j Weights[j] ||A_j||_F²/d,   A_j = (1/T) int_0^T U' V_j U dt - Tr(V_j)/d,
//
// the integral over each step by Simpson's rule: three frames, two of them new. Its
// error is below (dt w)⁴/2880 of ||V||, w being the largest difference of eigenvalues
// of H.
//
// The time per evaluation is linear in the steps. Beyond products of d x d matrices
// (about 9 a step) each step costs 6 d² multiply-adds for every entry of V that occurs
// in the class, whatever the number of errors; d = 2 runs in quaternions. The memory
// is 64 d² bytes a step (d = 2: 104).
//
// The gradient sums, over each step, int Tr(K H_k) dt of the Hermitian cotangent
// K = (U Y' - Y U')/2i, which turns by K' = -i [H, K], Y being the derivative of F
// by U; the integral follows from K at the step's ends by the Euler-Maclaurin
// formula, to 1e-9 of it for dt w up to 2, worse beyond 3. Nothing is allocated
// by Value. A Cost serves one goroutine.
type Cost struct {
	Dim      int            // d, 2 to 64
	Static   []complex128   // d x d, Hermitian, rad per unit time
	Controls [][]complex128 // H_k, as Static, per unit of control
	Target   []complex128   // W, unitary
	Errors   [][]complex128 // V_j, Hermitian
	Weights  []float64      // of each error
	Step     float64        // dt
	Steps    int            // N

	k      *kit
	spin   *spinCost // d = 2
	static *sparse   // traceless, like ctrl: a trace changes nothing but a phase
	ctrl   []*sparse
	shape  *sparse // of H; nil when it is mostly full
	gram   *gram
	pow    *powers

	h, half  []complex128   // H_n and exp(-i dt H_n/2), by step
	norm     []float64      // a bound of the spectral norm of H_n
	frame    []complex128   // U at the ends and middles of steps
	a        [][]complex128 // A_j, then its cotangent
	c, s     []complex128
	y, p     []complex128
	k0, k1   []complex128
	sum, old []complex128
}

// Reset takes the exported fields over and sizes the working memory. The error
// says which of them is out of range or not Hermitian.
func (c *Cost) Reset() error {
	d := c.Dim
	if d < 2 || d > MaxDim {
		return fmt.Errorf("dynamics: found dimension %d; allowed: 2 to %d", d, MaxDim)
	}
	if c.Steps < 1 || !(c.Step > 0) || math.IsInf(c.Step, 1) {
		return fmt.Errorf("dynamics: found %d steps of %v; allowed: 1 or more of a positive length", c.Steps, c.Step)
	}
	if len(c.Weights) != len(c.Errors) {
		return fmt.Errorf("dynamics: found %d weights for %d errors", len(c.Weights), len(c.Errors))
	}
	if len(c.Target) != d*d {
		return fmt.Errorf("dynamics: the target has %d entries; allowed: %d", len(c.Target), d*d)
	}
	if err := hermitian("the static part", c.Static, d); err != nil {
		return err
	}
	for k, h := range c.Controls {
		if err := hermitian(fmt.Sprintf("control %d", k), h, d); err != nil {
			return err
		}
	}
	for j, v := range c.Errors {
		if err := hermitian(fmt.Sprintf("error %d", j), v, d); err != nil {
			return err
		}
	}
	if d == 2 {
		c.spin = newSpinCost(c)
		return nil
	}
	c.k = newKit(d)
	c.pow = newPowers(c.k)
	traceless := func(a []complex128) *sparse {
		b := append([]complex128(nil), a...)
		center(b, d)
		return newSparse(b, d)
	}
	full := make([]complex128, d*d) // nonzero where some H may be
	note := func(s *sparse) *sparse {
		for i := range d {
			for at := s.start[i]; at < s.start[i+1]; at++ {
				full[i*d+s.col[at]] = 1
			}
		}
		return s
	}
	c.static = note(traceless(c.Static))
	c.ctrl = nil
	for _, h := range c.Controls {
		c.ctrl = append(c.ctrl, note(traceless(h)))
	}
	c.shape = nil
	if s := newSparse(full, d); d > 4 && 3*len(s.col) < 2*d*d {
		c.shape = s
	}
	// A multiple of the identity in V leaves A alone: take the last diagonal entry out,
	// and with it a block. Above, that would spoil the sharing of blocks.
	errors := c.Errors
	if d <= 4 {
		errors = nil
		for _, v := range c.Errors {
			b := append([]complex128(nil), v...)
			for i := range d {
				b[i*d+i] -= v[d*d-1]
			}
			errors = append(errors, b)
		}
	}
	c.gram = newGram(c.k, errors)
	n := c.Steps
	dd := d * d
	c.h = make([]complex128, n*dd)
	c.half = make([]complex128, n*dd)
	c.norm = make([]float64, n)
	c.frame = make([]complex128, (2*n+1)*dd)
	c.a = nil
	for range c.Errors {
		c.a = append(c.a, make([]complex128, dd))
	}
	for _, m := range []*[]complex128{&c.c, &c.s, &c.y, &c.p, &c.k0, &c.k1, &c.sum, &c.old} {
		*m = make([]complex128, dd)
	}
	return nil
}

// MaxDim is the largest dimension served.
const MaxDim = 64

// hermitian reports a matrix of the wrong size, or that is not Hermitian to 1e-12 of
// its largest entry.
func hermitian(name string, a []complex128, d int) error {
	if len(a) != d*d {
		return fmt.Errorf("dynamics: %s has %d entries; allowed: %d", name, len(a), d*d)
	}
	most := 0.0
	for _, x := range a {
		most = max(most, math.Abs(real(x)), math.Abs(imag(x)))
	}
	for i := range d {
		for j := i; j < d; j++ {
			e := a[i*d+j] - conj(a[j*d+i])
			if !(math.Abs(real(e))+math.Abs(imag(e)) <= 1e-12*most) {
				return fmt.Errorf("dynamics: %s is not Hermitian at row %d, column %d", name, i, j)
			}
		}
	}
	return nil
}

// Value returns F of the controls u, time-major: u[n K + k] drives step n+1. When
// grad is not nil, it has the length of u and is filled with the derivatives of F.
// Another length is a caller's mistake and panics.
func (c *Cost) Value(u, grad []float64) float64 {
	n, nk := c.Steps, len(c.Controls)
	if len(u) != n*nk || grad != nil && len(grad) != len(u) {
		panic("dynamics: Cost.Value: controls or gradient of the wrong length")
	}
	if c.Dim == 2 {
		return c.spin.value(u, grad)
	}
	d, dd := c.Dim, c.k.dd
	g := c.gram
	g.clear()
	identity(c.frame[:dd], d)
	g.add(1, c.frame[:dd], 0, nil)
	for i := range n {
		h := c.h[i*dd : i*dd+dd]
		clear(h)
		c.static.add(h, 1)
		for k, s := range c.ctrl {
			s.add(h, u[i*nk+k])
		}
		if c.shape != nil {
			c.shape.load(h)
		}
		e := c.half[i*dd : i*dd+dd]
		c.pow.raise(c.k, h, c.shape, c.Step/2)
		c.norm[i] = c.pow.norm
		c.pow.wave(c.k, c.c, c.s, c.Step/2, c.shape)
		unitary(e, c.c, c.s)
		before, mid, end := c.at(2*i), c.at(2*i+1), c.at(2*i+2)
		c.k.mul(mid, e, before)
		c.k.mul(end, e, mid)
		last := 2.0
		if i == n-1 {
			last = 1
		}
		g.add(4, mid, last, end)
	}
	// Simpson's weights are dt/6 (1, 4, 1), over T = N dt
	w := 1 / float64(6*n)
	var tau complex128
	for i, x := range c.Target {
		tau += conj(x) * c.at(2 * n)[i]
	}
	f := 1 - (real(tau)*real(tau)+imag(tau)*imag(tau))/float64(dd)
	for j, a := range c.a {
		g.integral(a, j, w)
		center(a, d)
		sq := 0.0
		for _, x := range a {
			sq += real(x)*real(x) + imag(x)*imag(x)
		}
		f += c.Weights[j] * sq / float64(d)
		z := 2 * c.Weights[j] / float64(d)
		for i, x := range a {
			a[i] = times(x, z)
		}
	}
	if grad != nil {
		c.back(grad, tau, w)
	}
	return f
}

func (c *Cost) at(i int) []complex128 { return c.frame[i*c.k.dd : (i+1)*c.k.dd] }

// back fills the gradient after the forward sweep; c.a holds the cotangents of the
// averages.
func (c *Cost) back(grad []float64, tau complex128, w float64) {
	n, nk, dd := c.Steps, len(c.Controls), c.k.dd
	k := c.k
	c.gram.pull(c.a)
	// of the gate: Y = -(2/d²) tau W
	for i, x := range c.Target {
		c.y[i] = times(tau*x, -2/float64(dd))
	}
	k.mulRight(c.k1, c.at(2*n), c.y)
	k.turn(c.k1, c.k1)
	half(c.k1)
	c.source(c.k1, 2*n, w)
	for i := n - 1; i >= 0; i-- {
		e := c.half[i*dd : i*dd+dd]
		h := c.h[i*dd : i*dd+dd]
		// two half steps; sum gathers K at both ends of each, old their differences
		c.turnBack(e)
		between(c.sum, c.old, c.k1, c.k0)
		c.k0, c.k1 = c.k1, c.k0
		c.source(c.k1, 2*i+1, 4*w)
		c.turnBack(e)
		gather(c.sum, c.old, c.k1, c.k0)
		c.k0, c.k1 = c.k1, c.k0
		if c.shape != nil {
			c.shape.load(h)
		}
		c.integrate(h, c.Step/2, c.norm[i])
		for q, s := range c.ctrl {
			grad[i*nk+q] = s.trace(c.sum)
		}
		if i > 0 {
			c.source(c.k1, 2*i, 2*w)
		}
	}
}

// turnBack stores e' K e of K = k1 in k0.
func (c *Cost) turnBack(e []complex128) {
	c.k.mul(c.p, c.k1, e)
	c.k.hermLeft(c.k0, e, c.p)
}

// source adds the cotangent of frame i, of weight w in the averages, to kk.
func (c *Cost) source(kk []complex128, i int, w float64) {
	x := c.at(i)
	c.gram.back(c.y, x, w) // twice this is the adjoint of the frame's cotangent
	c.k.mul(c.p, x, c.y)
	c.k.turn(c.p, c.p)
	p := c.p[:len(kk)]
	for i := range kk {
		kk[i] += p[i]
	}
}

// between sets the sum a + b and the difference a - b.
func between(sum, diff, a, b []complex128) {
	diff, a, b = diff[:len(sum)], a[:len(sum)], b[:len(sum)]
	for i := range sum {
		x, y := a[i], b[i]
		sum[i], diff[i] = x+y, x-y
	}
}

// gather adds them.
func gather(sum, diff, a, b []complex128) {
	diff, a, b = diff[:len(sum)], a[:len(sum)], b[:len(sum)]
	for i := range sum {
		x, y := a[i], b[i]
		sum[i] += x + y
		diff[i] += x - y
	}
}

func half(a []complex128) {
	for i, x := range a {
		a[i] = times(x, 0.5)
	}
}

// euler are the coefficients B_{2k}/(2k)! of the Euler-Maclaurin formula, k >= 1
// (Abramowitz and Stegun 1964, 23.1.30).
var euler = [...]float64{
	1. / 12, -1. / 720, 1. / 30240, -1. / 1209600, 1. / 47900160,
	-691. / 1307674368000, 1. / 74724249600, -3617. / 10670622842880000,
}

// eulerError is what may be left out of the integral of K over a step, as a share.
const eulerError = 1e-9

// integrate turns sum, that of K at both ends, into the integral of K over the
// intervals of length t: with D = K(t) - K(0) in old and L X = -i [H, X],
//
//	int_0^t K = t (K(0) + K(t))/2 - t²/12 L D + t⁴/720 L³ D - ...
func (c *Cost) integrate(h []complex128, t, norm float64) {
	for i, x := range c.sum {
		c.sum[i] = times(x, t/2)
	}
	a := 2 * t * norm // bounds t times the differences of eigenvalues
	x, y := c.old, c.p
	tt := t
	power := a * a
	for m, b := range euler {
		if m > 0 {
			c.bracket(y, h, x)
			x, y = y, x
		}
		c.bracket(y, h, x)
		x, y = y, x
		tt *= t
		addReal(c.sum, x, -b*tt)
		tt *= t
		power *= a * a
		if m+1 < len(euler) && math.Abs(euler[m+1])*power < eulerError {
			break
		}
	}
}

// bracket stores -i [h, x] in y.
func (c *Cost) bracket(y, h, x []complex128) {
	if c.shape != nil {
		c.shape.mul(y, x)
	} else {
		c.k.mul(y, h, x)
	}
	c.k.turn(y, y)
}
