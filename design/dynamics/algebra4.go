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

// gram4 adds w a' b + v p' q to s, the outer products of one row each; with diag,
// where a is b and p is q, only the upper triangle.
func gram4(s *[16]complex128, a, b, p, q *[4]complex128, w, v float64, diag bool) {
	b0, b1, b2, b3 := b[0], b[1], b[2], b[3]
	q0, q1, q2, q3 := q[0], q[1], q[2], q[3]
	for i := range 4 {
		x := complex(w*real(a[i]), -w*imag(a[i]))
		y := complex(v*real(p[i]), -v*imag(p[i]))
		r := (*[4]complex128)(s[4*i:])
		if diag {
			for j := i; j < 4; j++ {
				r[j] += x*b[j] + y*q[j]
			}
			continue
		}
		r[0] += x*b0 + y*q0
		r[1] += x*b1 + y*q1
		r[2] += x*b2 + y*q2
		r[3] += x*b3 + y*q3
	}
}

// back4 stores f sum over the terms of sign x[from,:] M[block] in y.
func back4(y *[4]complex128, x, m []complex128, terms []term, f float64) {
	var r0, r1, r2, r3 complex128
	for _, t := range terms {
		c := (*[16]complex128)(m[16*t.block:])
		p := (*[4]complex128)(x[4*t.from:])
		for i := range 4 {
			w := p[i]
			r0 += w * c[4*i+0]
			r1 += w * c[4*i+1]
			r2 += w * c[4*i+2]
			r3 += w * c[4*i+3]
		}
	}
	g := complex(f, 0)
	y[0], y[1], y[2], y[3] = g*r0, g*r1, g*r2, g*r3
}
