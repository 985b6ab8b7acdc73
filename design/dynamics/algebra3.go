package dynamics

// mul3 stores a b in c.
func mul3(c, a, b *[9]complex128) {
	for i := 0; i < 9; i += 3 {
		w, x, y := a[i], a[i+1], a[i+2]
		c[i] = w*b[0] + x*b[3] + y*b[6]
		c[i+1] = w*b[1] + x*b[4] + y*b[7]
		c[i+2] = w*b[2] + x*b[5] + y*b[8]
	}
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

// gram3 adds w a' b + v p' q to s, the outer products of one row each; with diag,
// where a is b and p is q, only the upper triangle.
func gram3(s *[9]complex128, a, b, p, q *[3]complex128, w, v float64, diag bool) {
	b0, b1, b2 := b[0], b[1], b[2]
	q0, q1, q2 := q[0], q[1], q[2]
	for i := range 3 {
		x := complex(w*real(a[i]), -w*imag(a[i]))
		y := complex(v*real(p[i]), -v*imag(p[i]))
		r := (*[3]complex128)(s[3*i:])
		if diag {
			for j := i; j < 3; j++ {
				r[j] += x*b[j] + y*q[j]
			}
			continue
		}
		r[0] += x*b0 + y*q0
		r[1] += x*b1 + y*q1
		r[2] += x*b2 + y*q2
	}
}

// back3 stores f sum over the terms of sign x[from,:] M[block] in y.
func back3(y *[3]complex128, x, m []complex128, terms []term, f float64) {
	var r0, r1, r2 complex128
	for _, t := range terms {
		c := (*[9]complex128)(m[9*t.block:])
		p := (*[3]complex128)(x[3*t.from:])
		for i := range 3 {
			w := p[i]
			r0 += w * c[3*i+0]
			r1 += w * c[3*i+1]
			r2 += w * c[3*i+2]
		}
	}
	g := complex(f, 0)
	y[0], y[1], y[2] = g*r0, g*r1, g*r2
}
