package filter

import (
	"math"
	"math/cmplx"
)

// lastIndex caps the sample index of a very late time; no slice is that long.
const lastIndex = math.MaxInt32

// place returns the sample in whose half-open interval [k h, (k+1) h) the time t
// lies and the time s >= 0 since that edge; k is -1 before the first edge.
func place(t, h float64) (k int, s float64) {
	if !(t >= 0) {
		return -1, 0
	}
	q := t / h
	if !(q < lastIndex) {
		return lastIndex, t - lastIndex*h
	}
	k = int(q)
	return k, max(t-float64(float64(k)*h), 0)
}

// edgeSlack is the share of a sample period by which a time may fall short of an
// edge and still count as on it, for the jump of the direct gain: k h and a time
// summed from many steps differ by roundings.
const edgeSlack = 1e-9

// played returns the sample that a direct gain passes on at time t.
func played(t, h float64) int {
	k, _ := place(t+edgeSlack*h, h)
	return k
}

// checkGrid panics on a grid that breaks the contract of the held response:
// a caller's bug, never a user's.
func checkGrid(h float64, times []float64) {
	if !(h > 0) {
		panic("filter: sample period not positive")
	}
	last := math.Inf(-1)
	for _, t := range times {
		if !(t >= last) {
			panic("filter: times not ascending")
		}
		last = t
	}
}

func reuse(dst []complex128, n int) []complex128 {
	if cap(dst) < n {
		return make([]complex128, n)
	}
	return dst[:n]
}

// Held stores in dst, and returns, the field that arrives at each of the
// ascending times (ns after arrival), when x[k] is held over [k h, (k+1) h) and
// the input is zero after the last sample:
//
//	u(t) = Direct x[floor(t/h)] + sum_p z_p(t)   (package comment).
//
// It is exact at any time; before arrival it is zero; on a sample edge, where a
// direct gain makes it jump, it is the value just after the edge. h is the
// sample period in ns. Work is O(len(x)+len(times)) for each term. dst is
// reused when its capacity suffices and may not overlap x; nothing is allocated
// then. Held panics when h is not positive or the times descend.
func (l Line) Held(x []complex128, h float64, times []float64, dst []complex128) []complex128 {
	checkGrid(h, times)
	dst = reuse(dst, len(times))
	for i, t := range times {
		dst[i] = 0
		if l.Direct != 0 {
			if k := played(t, h); k >= 0 && k < len(x) {
				dst[i] = l.Direct * x[k]
			}
		}
	}
	var c chain
	for i := range l.Terms {
		switch {
		case !c.load(l.Terms, i):
		case c.n == 1:
			heldPole(c.pole, c.out[0]*complex(c.rate, 0), x, h, times, dst)
		default:
			c.held(x, h, times, dst)
		}
	}
	return dst
}

// heldPole adds the response of the single term r/(s-p).
func heldPole(p, r complex128, x []complex128, h float64, times []float64, dst []complex128) {
	rp := r / p
	step, gain := decay(p, h), expm1(exponent(p, h))*rp
	var z complex128 // r times the state at edge k
	edge := 0
	for i, t := range times {
		k, s := place(t, h)
		if k < 0 {
			continue
		}
		if k > len(x) {
			k, s = len(x), t-float64(float64(len(x))*h)
		}
		for ; edge < k; edge++ {
			z = z*step + gain*x[edge]
		}
		if k < len(x) {
			dst[i] += z + expm1(exponent(p, s))*(z+rp*x[k])
		} else {
			dst[i] += z * decay(p, s)
		}
	}
}

// held adds the response of a pole with powers.
func (c *chain) held(x []complex128, h float64, times []float64, dst []complex128) {
	var z, now, gh, qh, gs, qs, none state
	c.growth(h, &gh)
	c.integrals(h, &qh)
	edge := 0
	for i, t := range times {
		k, s := place(t, h)
		if k < 0 {
			continue
		}
		if k > len(x) {
			k, s = len(x), t-float64(float64(len(x))*h)
		}
		for ; edge < k; edge++ {
			c.evolve(&z, &gh, &qh, x[edge])
		}
		c.growth(s, &gs)
		now = z
		if k < len(x) {
			c.integrals(s, &qs)
			c.evolve(&now, &gs, &qs, x[k])
		} else {
			c.evolve(&now, &gs, &none, 0)
		}
		dst[i] += c.apply(&c.out, &now)
	}
}

// HeldTranspose stores in dst, and returns, the adjoint of [Line.Held] for n
// samples applied to y, one number for each of the ascending times:
//
//	<Held x, y> = <x, HeldTranspose y>,   <a, b> = sum conj(a) b,
//
// which is the gradient, in the samples, of any function whose gradient in the
// field at those times is y. Cost, reuse of dst, and panics are those of Held;
// it panics too when y and times differ in length.
func (l Line) HeldTranspose(y []complex128, h float64, times []float64, n int, dst []complex128) []complex128 {
	checkGrid(h, times)
	if len(y) != len(times) {
		panic("filter: as many values as times are needed")
	}
	dst = reuse(dst, n)
	clear(dst)
	if l.Direct != 0 {
		g := cmplx.Conj(l.Direct)
		for i, t := range times {
			if k := played(t, h); k >= 0 && k < n {
				dst[k] += g * y[i]
			}
		}
	}
	var c chain
	for i := range l.Terms {
		switch {
		case !c.load(l.Terms, i):
		case c.n == 1:
			transposePole(c.pole, c.out[0]*complex(c.rate, 0), y, h, times, dst)
		default:
			c.transpose(y, h, times, dst)
		}
	}
	return dst
}

// transposePole adds the adjoint of heldPole. Everything is conjugated once at
// the start: the adjoint of the pole p is a backward recurrence with conj(p).
func transposePole(p, r complex128, y []complex128, h float64, times []float64, dst []complex128) {
	p, r = cmplx.Conj(p), cmplx.Conj(r)
	rp := r / p
	step, gain := decay(p, h), expm1(exponent(p, h))*rp
	var back complex128 // adjoint state at the leading edge of sample edge
	edge := len(dst)
	for i := len(times) - 1; i >= 0; i-- {
		k, s := place(times[i], h)
		if k < 0 {
			break // the earlier ones lie before arrival too
		}
		if k > len(dst) {
			k, s = len(dst), times[i]-float64(float64(len(dst))*h)
		}
		for edge > k {
			edge--
			dst[edge] += gain * back
			back *= step
		}
		if k < len(dst) {
			em := expm1(exponent(p, s))
			dst[k] += rp * em * y[i]
			back += (1 + em) * y[i]
		} else {
			back += decay(p, s) * y[i]
		}
	}
	for edge > 0 {
		edge--
		dst[edge] += gain * back
		back *= step
	}
}

// transpose adds the adjoint of chain.held, on conjugated data like transposePole.
func (c *chain) transpose(y []complex128, h float64, times []float64, dst []complex128) {
	conj := *c
	conj.pole = cmplx.Conj(c.pole)
	for m := range conj.n {
		conj.out[m] = cmplx.Conj(c.out[m])
	}
	var back, f, gh, qh, gs, qs state
	conj.growth(h, &gh)
	conj.integrals(h, &qh)
	edge := len(dst)
	for i := len(times) - 1; i >= 0; i-- {
		k, s := place(times[i], h)
		if k < 0 {
			break
		}
		if k > len(dst) {
			k, s = len(dst), times[i]-float64(float64(len(dst))*h)
		}
		for edge > k {
			edge--
			dst[edge] += conj.apply(&back, &qh)
			conj.pull(&back, &gh)
		}
		if k < len(dst) {
			conj.integrals(s, &qs)
			dst[k] += conj.apply(&conj.out, &qs) * y[i]
		}
		conj.growth(s, &gs)
		f = conj.out
		conj.pull(&f, &gs)
		for m := range conj.n {
			back[m] += f[m] * y[i]
		}
	}
	for edge > 0 {
		edge--
		dst[edge] += conj.apply(&back, &qh)
		conj.pull(&back, &gh)
	}
}
