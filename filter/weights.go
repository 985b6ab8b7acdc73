package filter

import "math"

// Weights stores in dst[k] the weight of sample k in the field at t ns after
// arrival, u(t) = sum_k dst[k] x[k], for len(dst) samples of h ns each. It panics
// when h is not positive.
func (l Line) Weights(t, h float64, dst []complex128) {
	checkGrid(h, nil)
	clear(dst)
	if k := played(t, h); k >= 0 && k < len(dst) {
		dst[k] = l.Direct
	}
	l.addWeights(t, h, 0, dst)
}

// SlowWeights is [Line.Weights] of only those poles whose time constant 1/|Re p|
// exceeds slower ns, without the direct gain: for t at or after the last sample,
// the amplitude that a slow tail still has.
func (l Line) SlowWeights(t, h, slower float64, dst []complex128) {
	checkGrid(h, nil)
	clear(dst)
	l.addWeights(t, h, slower, dst)
}

func (l Line) addWeights(t, h, slower float64, dst []complex128) {
	var c chain
	var f state
	for i := range l.Terms {
		if c.load(l.Terms, i) && 1/c.rate > slower {
			f = c.out
			c.sweep(&f, t, h, dst)
		}
	}
}

// negligible is the size under which a decaying row of weights is dropped: far
// below any sum it could enter, far above the slow subnormal numbers.
const negligible = 1e-290

// sweep adds to dst[k] the weight of sample k in the functional f of the state at
// time t. It uses f up.
func (c *chain) sweep(f *state, t, h float64, dst []complex128) {
	k, s := place(t, h)
	if k < 0 {
		return
	}
	var g, q state
	if k >= len(dst) {
		k, s = len(dst), t-float64(float64(len(dst))*h)
	} else {
		c.integrals(s, &q)
		dst[k] += c.apply(f, &q)
	}
	c.growth(s, &g)
	c.pull(f, &g)
	c.growth(h, &g)
	c.integrals(h, &q)
	for k--; k >= 0; k-- {
		dst[k] += c.apply(f, &q)
		c.pull(f, &g)
		size := 0.0
		for _, v := range f[:c.n] {
			size = max(size, math.Abs(real(v)), math.Abs(imag(v)))
		}
		if size < negligible {
			return
		}
	}
}

// Remaining returns the integral of the field from t ns after arrival to the end
// of time, in the unit of the samples times ns, the input being x held for h ns
// each and zero after. It is meant for t at or after the last sample, where a
// direct gain has no part; earlier, the rest of the input counts with its steady
// gain, which is exact too. It panics when h is not positive.
func (l Line) Remaining(x []complex128, h, t float64) complex128 {
	checkGrid(h, nil)
	edge, s := place(t, h)
	if edge > len(x) {
		edge, s = len(x), t-float64(float64(len(x))*h)
	}
	rest := complex128(0) // integral of the input from t on
	for k := max(edge, 0); k < len(x); k++ {
		rest += x[k] * complex(h, 0)
	}
	if edge >= 0 && edge < len(x) {
		rest -= x[edge] * complex(s, 0)
	}
	sum := complex128(0)
	if rest != 0 {
		sum = l.DC() * rest
	}
	if edge < 0 {
		return sum
	}
	var c chain
	for i := range l.Terms {
		if !c.load(l.Terms, i) {
			continue
		}
		var z, g, q, f state
		c.growth(h, &g)
		c.integrals(h, &q)
		for _, v := range x[:edge] {
			c.evolve(&z, &g, &q, v)
		}
		c.growth(s, &g)
		q = state{}
		last := complex128(0)
		if edge < len(x) {
			c.integrals(s, &q)
			last = x[edge]
		}
		c.evolve(&z, &g, &q, last)
		c.remaining(&f)
		sum += c.apply(&f, &z)
	}
	return sum
}

// RemainingWeights stores in dst[k] the weight of sample k in [Line.Remaining],
// in ns.
func (l Line) RemainingWeights(t, h float64, dst []complex128) {
	checkGrid(h, nil)
	clear(dst)
	edge, s := place(t, h)
	if edge < len(dst) {
		dc := l.DC()
		for k := max(edge, 0); k < len(dst); k++ {
			dst[k] = dc * complex(h, 0)
		}
		if edge >= 0 {
			dst[edge] = dc * complex(h-s, 0)
		}
	}
	var c chain
	var f state
	for i := range l.Terms {
		if c.load(l.Terms, i) {
			c.remaining(&f)
			c.sweep(&f, t, h, dst)
		}
	}
}
