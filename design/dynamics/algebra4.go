package dynamics

// mul4 stores a b in c.
func mul4(c, a, b *[16]complex128) {
	for i := 0; i < 16; i += 4 {
		w, x, y, z := a[i], a[i+1], a[i+2], a[i+3]
		c[i] = w*b[0] + x*b[4] + y*b[8] + z*b[12]
		c[i+1] = w*b[1] + x*b[5] + y*b[9] + z*b[13]
		c[i+2] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
		c[i+3] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	}
}

// mulLeft4 stores a' b in c.
func mulLeft4(c, a, b *[16]complex128) {
	for i := range 4 {
		w, x, y, z := conj(a[i]), conj(a[i+4]), conj(a[i+8]), conj(a[i+12])
		c[4*i] = w*b[0] + x*b[4] + y*b[8] + z*b[12]
		c[4*i+1] = w*b[1] + x*b[5] + y*b[9] + z*b[13]
		c[4*i+2] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
		c[4*i+3] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	}
}

// herm4 stores the Hermitian a b in c.
func herm4(c, a, b *[16]complex128) {
	w, x, y, z := a[0], a[1], a[2], a[3]
	c[0] = complex(real(w*b[0]+x*b[4]+y*b[8]+z*b[12]), 0)
	c[1] = w*b[1] + x*b[5] + y*b[9] + z*b[13]
	c[2] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
	c[3] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[4] = conj(c[1])
	c[8] = conj(c[2])
	c[12] = conj(c[3])
	w, x, y, z = a[4], a[5], a[6], a[7]
	c[5] = complex(real(w*b[1]+x*b[5]+y*b[9]+z*b[13]), 0)
	c[6] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
	c[7] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[9] = conj(c[6])
	c[13] = conj(c[7])
	w, x, y, z = a[8], a[9], a[10], a[11]
	c[10] = complex(real(w*b[2]+x*b[6]+y*b[10]+z*b[14]), 0)
	c[11] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[14] = conj(c[11])
	w, x, y, z = a[12], a[13], a[14], a[15]
	c[15] = complex(real(w*b[3]+x*b[7]+y*b[11]+z*b[15]), 0)
}

// hermLeft4 stores the Hermitian a' b in c.
func hermLeft4(c, a, b *[16]complex128) {
	w, x, y, z := conj(a[0]), conj(a[4]), conj(a[8]), conj(a[12])
	c[0] = complex(real(w*b[0]+x*b[4]+y*b[8]+z*b[12]), 0)
	c[1] = w*b[1] + x*b[5] + y*b[9] + z*b[13]
	c[2] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
	c[3] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[4] = conj(c[1])
	c[8] = conj(c[2])
	c[12] = conj(c[3])
	w, x, y, z = conj(a[1]), conj(a[5]), conj(a[9]), conj(a[13])
	c[5] = complex(real(w*b[1]+x*b[5]+y*b[9]+z*b[13]), 0)
	c[6] = w*b[2] + x*b[6] + y*b[10] + z*b[14]
	c[7] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[9] = conj(c[6])
	c[13] = conj(c[7])
	w, x, y, z = conj(a[2]), conj(a[6]), conj(a[10]), conj(a[14])
	c[10] = complex(real(w*b[2]+x*b[6]+y*b[10]+z*b[14]), 0)
	c[11] = w*b[3] + x*b[7] + y*b[11] + z*b[15]
	c[14] = conj(c[11])
	w, x, y, z = conj(a[3]), conj(a[7]), conj(a[11]), conj(a[15])
	c[15] = complex(real(w*b[3]+x*b[7]+y*b[11]+z*b[15]), 0)
}

// gram4 adds w a' b + v p' q to s, the outer products of one row each.
func gram4(s *[16]complex128, a, b, p, q *[4]complex128, w, v float64) {
	for i := range 4 {
		x := complex(w*real(a[i]), -w*imag(a[i]))
		y := complex(v*real(p[i]), -v*imag(p[i]))
		r := (*[4]complex128)(s[4*i:])
		r[0] += x*b[0] + y*q[0]
		r[1] += x*b[1] + y*q[1]
		r[2] += x*b[2] + y*q[2]
		r[3] += x*b[3] + y*q[3]
	}
}

// gramDiag4 adds the upper triangle of w a' a + v p' p to s.
func gramDiag4(s *[16]complex128, a, p *[4]complex128, w, v float64) {
	var x, y complex128
	x = complex(w*real(a[0]), -w*imag(a[0]))
	y = complex(v*real(p[0]), -v*imag(p[0]))
	s[0] += complex(real(x*a[0]+y*p[0]), 0)
	s[1] += x*a[1] + y*p[1]
	s[2] += x*a[2] + y*p[2]
	s[3] += x*a[3] + y*p[3]
	x = complex(w*real(a[1]), -w*imag(a[1]))
	y = complex(v*real(p[1]), -v*imag(p[1]))
	s[5] += complex(real(x*a[1]+y*p[1]), 0)
	s[6] += x*a[2] + y*p[2]
	s[7] += x*a[3] + y*p[3]
	x = complex(w*real(a[2]), -w*imag(a[2]))
	y = complex(v*real(p[2]), -v*imag(p[2]))
	s[10] += complex(real(x*a[2]+y*p[2]), 0)
	s[11] += x*a[3] + y*p[3]
	x = complex(w*real(a[3]), -w*imag(a[3]))
	y = complex(v*real(p[3]), -v*imag(p[3]))
	s[15] += complex(real(x*a[3]+y*p[3]), 0)
}

// back4 stores the adjoint of f sum over the terms of x[from,:] M[block] in column l
// of y: no entries are shared at this dimension, so every sign is 1.
func back4(y *[16]complex128, l int, x, m []complex128, terms []term, f float64) {
	var r [4]complex128
	for _, t := range terms {
		c := (*[16]complex128)(m[16*t.block:])
		p := (*[4]complex128)(x[4*t.from:])
		w, x, y, z := p[0], p[1], p[2], p[3]
		r[0] += w*c[0] + x*c[4] + y*c[8] + z*c[12]
		r[1] += w*c[1] + x*c[5] + y*c[9] + z*c[13]
		r[2] += w*c[2] + x*c[6] + y*c[10] + z*c[14]
		r[3] += w*c[3] + x*c[7] + y*c[11] + z*c[15]
	}
	for j := range r {
		y[4*j+l] = complex(f*real(r[j]), -f*imag(r[j]))
	}
}

// turn4 stores -i (p - p') in c, which may be p.
func turn4(c, p *[16]complex128) {
	c[0] = complex(2*imag(p[0]), 0)
	c[1] = complex(imag(p[1])+imag(p[4]), real(p[4])-real(p[1]))
	c[4] = conj(c[1])
	c[2] = complex(imag(p[2])+imag(p[8]), real(p[8])-real(p[2]))
	c[8] = conj(c[2])
	c[3] = complex(imag(p[3])+imag(p[12]), real(p[12])-real(p[3]))
	c[12] = conj(c[3])
	c[5] = complex(2*imag(p[5]), 0)
	c[6] = complex(imag(p[6])+imag(p[9]), real(p[9])-real(p[6]))
	c[9] = conj(c[6])
	c[7] = complex(imag(p[7])+imag(p[13]), real(p[13])-real(p[7]))
	c[13] = conj(c[7])
	c[10] = complex(2*imag(p[10]), 0)
	c[11] = complex(imag(p[11])+imag(p[14]), real(p[14])-real(p[11]))
	c[14] = conj(c[11])
	c[15] = complex(2*imag(p[15]), 0)
}

// mulAdd4 adds a b to c.
func mulAdd4(c, a, b *[16]complex128) {
	for i := 0; i < 16; i += 4 {
		w, x, y, z := a[i], a[i+1], a[i+2], a[i+3]
		c[i] += w*b[0] + x*b[4] + y*b[8] + z*b[12]
		c[i+1] += w*b[1] + x*b[5] + y*b[9] + z*b[13]
		c[i+2] += w*b[2] + x*b[6] + y*b[10] + z*b[14]
		c[i+3] += w*b[3] + x*b[7] + y*b[11] + z*b[15]
	}
}
