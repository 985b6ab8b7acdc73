package dynamics

import "math"

// The exponential of a step, exp(-i t H) = cos(t H) - i sin(t H), from powers of
// Y = H²:
//
//	cos(t H) = sum_j a_j t^{2j} Y^j        sin(t H) = t H sum_j b_j t^{2j} Y^j
//
// Every factor is a polynomial in H, so every product is Hermitian and half of it
// is computed. With m powers the Taylor series of cos x and sin x / x are economised
// (Lanczos 1956, Applied Analysis, ch. VII: the highest power is replaced by the
// polynomial of lower degree nearest to it on [0, r], through the shifted Chebyshev
// polynomial of that degree) for x² <= r, the largest r with an error under
// seriesError.

// seriesError bounds what the series of one exponential leave out.
const seriesError = 5e-16

// mostPowers serves |t H| up to 2; longer arguments are halved and doubled back.
const mostPowers = 9

// A series is the pair of polynomials for one number of powers, m = its index.
type series struct {
	reach float64                 // largest |t H|
	a, b  [mostPowers + 1]float64 // coefficients of Y^0 .. Y^m
}

// newSeries returns the series of 1 to mostPowers powers, indexed by that number.
func newSeries() []series {
	all := make([]series, mostPowers+1)
	for m := 1; m <= mostPowers; m++ {
		r := 4.0
		for {
			var s series
			if e := s.economise(m, r); e <= seriesError {
				s.reach = math.Sqrt(r)
				all[m] = s
				break
			}
			r *= 0.95
		}
	}
	return all
}

// economise fills the coefficients for x² <= r and returns a bound of the error.
func (s *series) economise(m int, r float64) float64 {
	const top = mostPowers + 8
	// Taylor coefficients in units of r: y = x²/r in [0, 1]
	var a, b [top + 1]float64
	a[0], b[0] = 1, 1
	for j := 1; j <= top; j++ {
		a[j] = -a[j-1] * r / float64((2*j-1)*2*j)
		b[j] = -b[j-1] * r / float64(2*j*(2*j+1))
	}
	// shifted Chebyshev polynomials: T_{n+1} = (4y-2) T_n - T_{n-1}
	var cheb [top + 1][top + 1]float64
	cheb[0][0] = 1
	cheb[1][0], cheb[1][1] = -1, 2
	for n := 1; n < top; n++ {
		for j := 0; j <= n+1; j++ {
			v := -2*cheb[n][j] - cheb[n-1][j]
			if j > 0 {
				v += 4 * cheb[n][j-1]
			}
			cheb[n+1][j] = v
		}
	}
	left := 0.0
	for n := top; n > m; n-- {
		fa, fb := a[n]/cheb[n][n], b[n]/cheb[n][n]
		left += math.Abs(fa)
		for j := 0; j <= n; j++ {
			a[j] -= fa * cheb[n][j]
			b[j] -= fb * cheb[n][j]
		}
	}
	scale := 1.0
	for j := 0; j <= m; j++ {
		s.a[j], s.b[j] = a[j]*scale, b[j]*scale
		scale /= r
	}
	return left
}

// powers are H, H², H⁴ ... of one Hermitian matrix, enough for |t| <= its reach.
type powers struct {
	h     []complex128
	y     [mostPowers + 1][]complex128 // y[j] = H^{2j}, j >= 1
	m     int
	halve int     // arguments are divided by 2^halve
	norm  float64 // bounds the spectral norm of h
	poly  []complex128
}

func newPowers(k *kit) *powers {
	p := &powers{poly: make([]complex128, k.dd)}
	for j := 1; j <= mostPowers; j++ {
		p.y[j] = make([]complex128, k.dd)
	}
	return p
}

// raise prepares the powers of h, which is kept by reference, for arguments up to t.
// s, when not nil, is h once more, by rows.
func (p *powers) raise(k *kit, h []complex128, s *sparse, t float64) {
	p.h = h
	if s != nil {
		s.herm(p.y[1], h)
	} else {
		k.herm(p.y[1], p.h, p.h)
	}
	p.norm = spread(h, k.d)
	if k.d > 4 { // the norm of H² bounds closer where there are many levels
		p.norm = min(p.norm, math.Sqrt(spread(p.y[1], k.d)))
	}
	x := t * p.norm
	p.halve = 0
	for x > k.cheap[mostPowers].reach && p.halve < 60 {
		x /= 2
		p.halve++
	}
	p.m = 1
	for p.m < mostPowers && x > k.cheap[p.m].reach {
		p.m++
	}
	for j := 2; j <= p.m; j++ {
		k.herm(p.y[j], p.y[j/2], p.y[j-j/2])
	}
}

// wave stores cos(t H) in c and sin(t H) in s.
func (p *powers) wave(k *kit, c, s []complex128, t float64, rows *sparse) {
	d := k.d
	for range p.halve {
		t /= 2
	}
	co := &k.cheap[p.m]
	var fa, fb [mostPowers + 1]float64
	tt := 1.0
	for j := 0; j <= p.m; j++ {
		fa[j], fb[j] = co.a[j]*tt, co.b[j]*tt*t
		tt *= t * t
	}
	if d <= 4 {
		p.combine(c, p.poly, 0, &fa, &fb)
	} else {
		for i := range d {
			at, end := i*d+i, i*d+d
			p.combine(c[at:end], p.poly[at:end], at, &fa, &fb)
		}
		mirror(c, d)
		mirror(p.poly, d)
	}
	for at := 0; at < len(c); at += d + 1 {
		c[at] += complex(fa[0], 0)
		p.poly[at] += complex(fb[0], 0)
	}
	if rows != nil {
		rows.herm(s, p.poly)
	} else {
		k.herm(s, p.h, p.poly)
	}
	for range p.halve { // cos 2x = 2 cos² x - 1, sin 2x = 2 sin x cos x
		k.herm(p.poly, s, c)
		for i, v := range p.poly {
			s[i] = 2 * v
		}
		k.herm(p.poly, c, c)
		for i, v := range p.poly {
			c[i] = 2 * v
		}
		for i := range d {
			c[i*d+i] -= 1
		}
	}
}

// combine stores the sums over j >= 1 of fa and fb times the powers, from entry at
// on, in c and q.
func (p *powers) combine(c, q []complex128, at int, fa, fb *[mostPowers + 1]float64) {
	n := len(c)
	q = q[:n]
	y := p.y[1][at:][:n]
	for i, v := range y {
		c[i] = complex(fa[1]*real(v), fa[1]*imag(v))
		q[i] = complex(fb[1]*real(v), fb[1]*imag(v))
	}
	j := 2
	for ; j+1 <= p.m; j += 2 {
		y, z := p.y[j][at:][:n], p.y[j+1][at:][:n]
		a, a2, b, b2 := fa[j], fa[j+1], fb[j], fb[j+1]
		for i, v := range y {
			u := z[i]
			x, w := c[i], q[i]
			c[i] = complex(real(x)+a*real(v)+a2*real(u), imag(x)+a*imag(v)+a2*imag(u))
			q[i] = complex(real(w)+b*real(v)+b2*real(u), imag(w)+b*imag(v)+b2*imag(u))
		}
	}
	if j <= p.m {
		y := p.y[j][at:][:n]
		a, b := fa[j], fb[j]
		for i, v := range y {
			x, w := c[i], q[i]
			c[i] = complex(real(x)+a*real(v), imag(x)+a*imag(v))
			q[i] = complex(real(w)+b*real(v), imag(w)+b*imag(v))
		}
	}
}

// unitary stores cos - i sin in e, which may be either.
func unitary(e, c, s []complex128) {
	c, s = c[:len(e)], s[:len(e)]
	for i, x := range c {
		y := s[i] // -i y = (im y) - i (re y)
		e[i] = complex(real(x)+imag(y), imag(x)-real(y))
	}
}
