package filter

import (
	"math"
	"math/cmplx"
)

// A state holds one number for each element of a chain.
type state [MaxPower]complex128

// A chain is one pole with all its powers, scaled by rate = -Re pole:
// z_m' = pole z_m + rate z_{m-1}, z_0 = x. Element m-1 of a state is z_m, and
// the output is sum out[m-1] z_m with out[m-1] = r_m/rate^m. As
// rate^m Q_m(inf) is at most one in size, so is every z_m for |x| <= 1.
type chain struct {
	pole complex128
	rate float64
	n    int // highest power
	out  state
}

// load gathers into c every term with the pole of terms[i]. It returns false,
// and leaves c alone, when an earlier term has the same pole and has thus been
// gathered already.
func (c *chain) load(terms []Term, i int) bool {
	p := terms[i].Pole
	for _, t := range terms[:i] {
		if t.Pole == p {
			return false
		}
	}
	c.pole, c.rate, c.n = p, -real(p), 0
	for _, t := range terms[i:] {
		if t.Pole != p {
			continue
		}
		for c.n < t.Power {
			c.out[c.n] = 0
			c.n++
		}
		r := t.Residue
		for range t.Power {
			r /= complex(c.rate, 0)
		}
		c.out[t.Power-1] += r
	}
	return true
}

// apply returns sum f_m z_m.
func (c *chain) apply(f, z *state) complex128 {
	sum := complex128(0)
	for m := 0; m < c.n; m++ {
		sum += f[m] * z[m]
	}
	return sum
}

// deadExponent is the exponent under which e^x is zero in float64.
const deadExponent = -746

// growth stores g_j = e^{p s} (rate s)^j/j!, the free evolution over s >= 0:
// z_m(s) = sum_j g_j z_{m-j}(0).
func (c *chain) growth(s float64, g *state) {
	e := decay(c.pole, s)
	a := c.rate * s
	for j := 0; j < c.n; j++ {
		g[j] = e
		if e != 0 {
			e *= complex(a/float64(j+1), 0)
		}
	}
}

// integrals stores q_m = rate^m Q_m(s), the state after a unit input has been
// held for s >= 0 from rest. With w = -p s (Re w >= 0):
//
//	rate^m Q_m = (rate s)^m e^{-w} phi_m(w),  phi_m(w) = sum_k w^k/(m+k)!   for |w| <= m+1,
//	           = (-rate/p)^m [ 1 - e^{-w} sum_{j<m} w^j/j! ]                beyond.
//
// In the first range every term of m! phi_m is at most one in size and the first
// is one; in the second the last term of the bracket dominates or e^{-w} is
// small. Neither loses digits against the size of the result.
func (c *chain) integrals(s float64, q *state) {
	if c.n == 1 {
		q[0] = expm1(exponent(c.pole, s)) * (complex(c.rate, 0) / c.pole)
		return
	}
	w := exponent(-c.pole, s)
	size := cmplx.Abs(w)
	e := decay(c.pole, s)
	dead := e == 0
	a := c.rate * s
	front := complex(1, 0)               // (rate s)^m/m!
	gain := complex(1, 0)                // (-rate/p)^m
	unit := complex(-c.rate, 0) / c.pole // -rate/p
	term := e                            // e^{-w} w^j/j!
	var partial complex128               // e^{-w} sum_{j<m} w^j/j!
	for m := 1; m <= c.n; m++ {
		gain *= unit
		if dead {
			q[m-1] = gain
			continue
		}
		partial += term
		term *= w / complex(float64(m), 0)
		front *= complex(a/float64(m), 0)
		if size > float64(m+1) {
			q[m-1] = gain * (1 - partial)
			continue
		}
		sum, t := complex128(1), complex128(1) // m! phi_m
		for k := 1; k < 400; k++ {
			t *= w / complex(float64(m+k), 0)
			sum += t
			if math.Abs(real(t))+math.Abs(imag(t)) < 1e-18 {
				break
			}
		}
		q[m-1] = front * e * sum
	}
}

// evolve replaces z by its free evolution with growth g, plus x q.
func (c *chain) evolve(z, g, q *state, x complex128) {
	for m := c.n - 1; m >= 0; m-- {
		sum := q[m] * x
		for j := 0; j <= m; j++ {
			sum += g[j] * z[m-j]
		}
		z[m] = sum
	}
}

// pull replaces the functional f by f after free evolution with growth g:
// (f A)_i = sum_{m>=i} f_m g_{m-i}.
func (c *chain) pull(f, g *state) {
	for i := 0; i < c.n; i++ {
		sum := complex128(0)
		for m := i; m < c.n; m++ {
			sum += f[m] * g[m-i]
		}
		f[i] = sum
	}
}

// remaining stores the functional that takes a state to the integral of the
// output from then on, input zero: f_i = sum_{m>=i} out_m rate^{m-i}/(-p)^{m-i+1}.
func (c *chain) remaining(f *state) {
	unit := complex(-c.rate, 0) / c.pole
	for i := 0; i < c.n; i++ {
		sum := complex128(0)
		for m := c.n - 1; m >= i; m-- { // Horner in unit
			sum = sum*unit + c.out[m]
		}
		f[i] = sum / -c.pole
	}
}

// exponent returns p s, without the idle half of a complex product.
func exponent(p complex128, s float64) complex128 { return complex(real(p)*s, imag(p)*s) }

// decay returns e^{p s} with its full relative accuracy, which 1 + expm1 has only
// for small |p| s.
func decay(p complex128, s float64) complex128 {
	if real(p)*s < deadExponent {
		return 0
	}
	return cmplx.Exp(exponent(p, s))
}

// expm1 returns e^z - 1 without cancellation for small z, for Re z not above
// about 700:
//
//	expm1(a) cos b - 2 sin^2(b/2) + i e^a sin b.
func expm1(z complex128) complex128 {
	a, b := real(z), imag(z)
	if a < deadExponent {
		return -1
	}
	ea := math.Expm1(a)
	if b == 0 {
		return complex(ea, 0)
	}
	sin, cos := math.Sincos(b)
	half := math.Sin(b / 2)
	return complex(ea*cos-2*half*half, (ea+1)*sin)
}
