package dynamics

// mul3 stores a b in c.
func mul3(c, a, b *[9]complex128) {
	w, x, y := a[0], a[1], a[2]
	c[0] = w*b[0] + x*b[3] + y*b[6]
	c[1] = w*b[1] + x*b[4] + y*b[7]
	c[2] = w*b[2] + x*b[5] + y*b[8]
	w, x, y = a[3], a[4], a[5]
	c[3] = w*b[0] + x*b[3] + y*b[6]
	c[4] = w*b[1] + x*b[4] + y*b[7]
	c[5] = w*b[2] + x*b[5] + y*b[8]
	w, x, y = a[6], a[7], a[8]
	c[6] = w*b[0] + x*b[3] + y*b[6]
	c[7] = w*b[1] + x*b[4] + y*b[7]
	c[8] = w*b[2] + x*b[5] + y*b[8]
}

// mulLeft3 stores a' b in c.
func mulLeft3(c, a, b *[9]complex128) {
	for i := range 3 {
		w, x, y := conj(a[i]), conj(a[i+3]), conj(a[i+6])
		c[3*i] = w*b[0] + x*b[3] + y*b[6]
		c[3*i+1] = w*b[1] + x*b[4] + y*b[7]
		c[3*i+2] = w*b[2] + x*b[5] + y*b[8]
	}
}

// herm3 stores the Hermitian a b in c.
func herm3(c, a, b *[9]complex128) {
	w, x, y := a[0], a[1], a[2]
	c[0] = complex(real(w*b[0]+x*b[3]+y*b[6]), 0)
	c[1] = w*b[1] + x*b[4] + y*b[7]
	c[2] = w*b[2] + x*b[5] + y*b[8]
	c[3] = conj(c[1])
	c[6] = conj(c[2])
	w, x, y = a[3], a[4], a[5]
	c[4] = complex(real(w*b[1]+x*b[4]+y*b[7]), 0)
	c[5] = w*b[2] + x*b[5] + y*b[8]
	c[7] = conj(c[5])
	w, x, y = a[6], a[7], a[8]
	c[8] = complex(real(w*b[2]+x*b[5]+y*b[8]), 0)
}

// hermLeft3 stores the Hermitian a' b in c.
func hermLeft3(c, a, b *[9]complex128) {
	w, x, y := conj(a[0]), conj(a[3]), conj(a[6])
	c[0] = complex(real(w*b[0]+x*b[3]+y*b[6]), 0)
	c[1] = w*b[1] + x*b[4] + y*b[7]
	c[2] = w*b[2] + x*b[5] + y*b[8]
	c[3] = conj(c[1])
	c[6] = conj(c[2])
	w, x, y = conj(a[1]), conj(a[4]), conj(a[7])
	c[4] = complex(real(w*b[1]+x*b[4]+y*b[7]), 0)
	c[5] = w*b[2] + x*b[5] + y*b[8]
	c[7] = conj(c[5])
	w, x, y = conj(a[2]), conj(a[5]), conj(a[8])
	c[8] = complex(real(w*b[2]+x*b[5]+y*b[8]), 0)
}

// gram3 adds w a' b + v p' q to s, the outer products of one row each.
func gram3(s *[9]complex128, a, b, p, q *[3]complex128, w, v float64) {
	for i := range 3 {
		x := complex(w*real(a[i]), -w*imag(a[i]))
		y := complex(v*real(p[i]), -v*imag(p[i]))
		r := (*[3]complex128)(s[3*i:])
		r[0] += x*b[0] + y*q[0]
		r[1] += x*b[1] + y*q[1]
		r[2] += x*b[2] + y*q[2]
	}
}

// gramDiag3 adds the upper triangle of w a' a + v p' p to s.
func gramDiag3(s *[9]complex128, a, p *[3]complex128, w, v float64) {
	var x, y complex128
	x = complex(w*real(a[0]), -w*imag(a[0]))
	y = complex(v*real(p[0]), -v*imag(p[0]))
	s[0] += complex(real(x*a[0]+y*p[0]), 0)
	s[1] += x*a[1] + y*p[1]
	s[2] += x*a[2] + y*p[2]
	x = complex(w*real(a[1]), -w*imag(a[1]))
	y = complex(v*real(p[1]), -v*imag(p[1]))
	s[4] += complex(real(x*a[1]+y*p[1]), 0)
	s[5] += x*a[2] + y*p[2]
	x = complex(w*real(a[2]), -w*imag(a[2]))
	y = complex(v*real(p[2]), -v*imag(p[2]))
	s[8] += complex(real(x*a[2]+y*p[2]), 0)
}

// back3 stores the adjoint of f sum over the terms of x[from,:] M[block] in column l
// of y: no entries are shared at this dimension, so every sign is 1.
func back3(y *[9]complex128, l int, x, m []complex128, terms []term, f float64) {
	var r [3]complex128
	for _, t := range terms {
		c := (*[9]complex128)(m[9*t.block:])
		p := (*[3]complex128)(x[3*t.from:])
		w, x, y := p[0], p[1], p[2]
		r[0] += w*c[0] + x*c[3] + y*c[6]
		r[1] += w*c[1] + x*c[4] + y*c[7]
		r[2] += w*c[2] + x*c[5] + y*c[8]
	}
	for j := range r {
		y[3*j+l] = complex(f*real(r[j]), -f*imag(r[j]))
	}
}

// turn3 stores -i (p - p') in c, which may be p.
func turn3(c, p *[9]complex128) {
	c[0] = complex(2*imag(p[0]), 0)
	c[1] = complex(imag(p[1])+imag(p[3]), real(p[3])-real(p[1]))
	c[3] = conj(c[1])
	c[2] = complex(imag(p[2])+imag(p[6]), real(p[6])-real(p[2]))
	c[6] = conj(c[2])
	c[4] = complex(2*imag(p[4]), 0)
	c[5] = complex(imag(p[5])+imag(p[7]), real(p[7])-real(p[5]))
	c[7] = conj(c[5])
	c[8] = complex(2*imag(p[8]), 0)
}

// mulAdd3 adds a b to c.
func mulAdd3(c, a, b *[9]complex128) {
	for i := 0; i < 9; i += 3 {
		w, x, y := a[i], a[i+1], a[i+2]
		c[i] += w*b[0] + x*b[3] + y*b[6]
		c[i+1] += w*b[1] + x*b[4] + y*b[7]
		c[i+2] += w*b[2] + x*b[5] + y*b[8]
	}
}
