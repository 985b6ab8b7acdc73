package dynamics

import "math"

// A kit multiplies square matrices of one dimension, row by row in flat slices:
// written out for d = 3 and 4, by rows in groups of four above. The destination
// may not be an operand. A kit has scratch memory of its own and serves one
// goroutine.
type kit struct {
	d, dd int
	t     []complex128 // scratch
	cheap []series     // by number of powers; see expm.go
}

func newKit(d int) *kit {
	return &kit{d: d, dd: d * d, t: make([]complex128, d*d), cheap: newSeries()}
}

func conj(z complex128) complex128 { return complex(real(z), -imag(z)) }

func times(z complex128, f float64) complex128 { return complex(f*real(z), f*imag(z)) }

// mul stores a b in c.
func (k *kit) mul(c, a, b []complex128) {
	switch k.d {
	case 3:
		mul3((*[9]complex128)(c), (*[9]complex128)(a), (*[9]complex128)(b))
	case 4:
		mul4((*[16]complex128)(c), (*[16]complex128)(a), (*[16]complex128)(b))
	default:
		mulN(c, a, b, k.d)
	}
}

// mulAdd adds a b to c.
func (k *kit) mulAdd(c, a, b []complex128) {
	switch k.d {
	case 3:
		mulAdd3((*[9]complex128)(c), (*[9]complex128)(a), (*[9]complex128)(b))
	case 4:
		mulAdd4((*[16]complex128)(c), (*[16]complex128)(a), (*[16]complex128)(b))
	default:
		mulAddN(c, a, b, k.d)
	}
}

// mulLeft stores a' b in c.
func (k *kit) mulLeft(c, a, b []complex128) {
	switch k.d {
	case 3:
		mulLeft3((*[9]complex128)(c), (*[9]complex128)(a), (*[9]complex128)(b))
	case 4:
		mulLeft4((*[16]complex128)(c), (*[16]complex128)(a), (*[16]complex128)(b))
	default:
		mulLeftN(c, a, b, k.d)
	}
}

// mulRight stores a b' in c.
func (k *kit) mulRight(c, a, b []complex128) {
	adjoint(k.t, b, k.d)
	k.mul(c, a, k.t)
}

// herm stores a b in c, known to be Hermitian: half of it is computed.
func (k *kit) herm(c, a, b []complex128) {
	switch k.d {
	case 3:
		herm3((*[9]complex128)(c), (*[9]complex128)(a), (*[9]complex128)(b))
	case 4:
		herm4((*[16]complex128)(c), (*[16]complex128)(a), (*[16]complex128)(b))
	default:
		hermN(c, a, b, k.d)
	}
}

// hermLeft stores a' b in c, known to be Hermitian.
func (k *kit) hermLeft(c, a, b []complex128) {
	switch k.d {
	case 3:
		hermLeft3((*[9]complex128)(c), (*[9]complex128)(a), (*[9]complex128)(b))
	case 4:
		hermLeft4((*[16]complex128)(c), (*[16]complex128)(a), (*[16]complex128)(b))
	default:
		hermLeftN(c, a, b, k.d)
	}
}

// hermRight stores a b' in c, known to be Hermitian.
func (k *kit) hermRight(c, a, b []complex128) {
	adjoint(k.t, b, k.d)
	k.herm(c, a, k.t)
}

// turn stores -i (p - p') in c, which may be p.
func (k *kit) turn(c, p []complex128) {
	d := k.d
	switch d {
	case 3:
		turn3((*[9]complex128)(c), (*[9]complex128)(p))
		return
	case 4:
		turn4((*[16]complex128)(c), (*[16]complex128)(p))
		return
	}
	for i := range d {
		c[i*d+i] = complex(2*imag(p[i*d+i]), 0)
		for j := i + 1; j < d; j++ {
			x, y := p[i*d+j], p[j*d+i]
			z := complex(imag(x)+imag(y), real(y)-real(x))
			c[i*d+j], c[j*d+i] = z, conj(z)
		}
	}
}

// bracket stores -i [a, b] in c, for Hermitian a and b.
func (k *kit) bracket(c, a, b []complex128) {
	k.mul(c, a, b)
	k.turn(c, c)
}

func adjoint(c, a []complex128, d int) {
	for i := range d {
		row := a[i*d : i*d+d]
		for j, x := range row {
			c[j*d+i] = conj(x)
		}
	}
}

func identity(c []complex128, d int) {
	clear(c)
	for i := range d {
		c[i*d+i] = 1
	}
}

// add4 adds w a + x b + y c + z e to dst.
func add4(dst, a, b, c, e []complex128, w, x, y, z complex128) {
	a, b, c, e = a[:len(dst)], b[:len(dst)], c[:len(dst)], e[:len(dst)]
	for j := range dst {
		dst[j] += w*a[j] + x*b[j] + y*c[j] + z*e[j]
	}
}

// add2 adds w a + x b to dst.
func add2(dst, a, b []complex128, w, x complex128) {
	a, b = a[:len(dst)], b[:len(dst)]
	for j := range dst {
		dst[j] += w*a[j] + x*b[j]
	}
}

// add1 adds w a to dst.
func add1(dst, a []complex128, w complex128) {
	a = a[:len(dst)]
	for j := range dst {
		dst[j] += w * a[j]
	}
}

// addReal adds f a to dst.
func addReal(dst, a []complex128, f float64) {
	a = a[:len(dst)]
	for j, x := range a {
		y := dst[j]
		dst[j] = complex(real(y)+f*real(x), imag(y)+f*imag(x))
	}
}

func mulN(c, a, b []complex128, d int) {
	clear(c)
	mulAddN(c, a, b, d)
}

func mulAddN(c, a, b []complex128, d int) {
	for i := range d {
		row := c[i*d : i*d+d]
		w := a[i*d : i*d+d]
		k := 0
		for ; k+3 < d; k += 4 {
			r := b[k*d:]
			add4(row, r, r[d:], r[2*d:], r[3*d:], w[k], w[k+1], w[k+2], w[k+3])
		}
		for ; k < d; k++ {
			add1(row, b[k*d:], w[k])
		}
	}
}

func mulLeftN(c, a, b []complex128, d int) {
	for i := range d {
		row := c[i*d : i*d+d]
		clear(row)
		k := 0
		for ; k+3 < d; k += 4 {
			r, w := b[k*d:], a[k*d+i:]
			add4(row, r, r[d:], r[2*d:], r[3*d:], conj(w[0]), conj(w[d]), conj(w[2*d]), conj(w[3*d]))
		}
		for ; k < d; k++ {
			add1(row, b[k*d:], conj(a[k*d+i]))
		}
	}
}

func hermN(c, a, b []complex128, d int) {
	for i := range d {
		row := c[i*d+i : i*d+d]
		clear(row)
		w := a[i*d : i*d+d]
		k := 0
		for ; k+3 < d; k += 4 {
			r := b[k*d+i:]
			add4(row, r, r[d:], r[2*d:], r[3*d:], w[k], w[k+1], w[k+2], w[k+3])
		}
		for ; k < d; k++ {
			add1(row, b[k*d+i:], w[k])
		}
	}
	mirror(c, d)
}

func hermLeftN(c, a, b []complex128, d int) {
	for i := range d {
		row := c[i*d+i : i*d+d]
		clear(row)
		k := 0
		for ; k+3 < d; k += 4 {
			r, w := b[k*d+i:], a[k*d+i:]
			add4(row, r, r[d:], r[2*d:], r[3*d:], conj(w[0]), conj(w[d]), conj(w[2*d]), conj(w[3*d]))
		}
		for ; k < d; k++ {
			add1(row, b[k*d+i:], conj(a[k*d+i]))
		}
	}
	mirror(c, d)
}

// mirror makes c Hermitian from its upper triangle.
func mirror(c []complex128, d int) {
	for i := range d {
		c[i*d+i] = complex(real(c[i*d+i]), 0)
		for j := i + 1; j < d; j++ {
			c[j*d+i] = conj(c[i*d+j])
		}
	}
}

// A sparse is a Hermitian or general operator by rows, for products with full
// matrices.
type sparse struct {
	d     int
	start []int // of each row in col, at and val; d+1 entries
	col   []int
	at    []int // row d + column
	val   []complex128
}

func newSparse(a []complex128, d int) *sparse {
	s := &sparse{d: d, start: make([]int, d+1)}
	for i := range d {
		for j := range d {
			if v := a[i*d+j]; v != 0 {
				s.col = append(s.col, j)
				s.at = append(s.at, i*d+j)
				s.val = append(s.val, v)
			}
		}
		s.start[i+1] = len(s.col)
	}
	return s
}

// load takes the values of a full matrix over into the pattern.
func (s *sparse) load(a []complex128) {
	val := s.val[:len(s.at)]
	for i, at := range s.at {
		val[i] = a[at]
	}
}

// mul stores s b in c.
func (s *sparse) mul(c, b []complex128) {
	d := s.d
	for i := range d {
		row := c[i*d : i*d+d]
		clear(row)
		s.row(row, b, i, 0)
	}
}

// herm stores s b in c, known to be Hermitian.
func (s *sparse) herm(c, b []complex128) {
	d := s.d
	for i := range d {
		row := c[i*d+i : i*d+d]
		clear(row)
		s.row(row, b, i, i)
	}
	mirror(c, d)
}

// row adds row i of s b, from column j on, to dst.
func (s *sparse) row(dst, b []complex128, i, j int) {
	d := s.d
	at, end := s.start[i], s.start[i+1]
	for ; at+3 < end; at += 4 {
		c, v := s.col[at:at+4:at+4], s.val[at:at+4:at+4]
		add4(dst, b[c[0]*d+j:], b[c[1]*d+j:], b[c[2]*d+j:], b[c[3]*d+j:], v[0], v[1], v[2], v[3])
	}
	if at+1 < end {
		add2(dst, b[s.col[at]*d+j:], b[s.col[at+1]*d+j:], s.val[at], s.val[at+1])
		at += 2
	}
	if at < end {
		add1(dst, b[s.col[at]*d+j:], s.val[at])
	}
}

// trace returns Tr(s a) for Hermitian s and a.
func (s *sparse) trace(a []complex128) float64 {
	t := 0.0
	val := s.val[:len(s.at)]
	for i, at := range s.at {
		x, v := a[at], val[i] // s_ij a_ji = s_ij conj(a_ij)
		t += real(v)*real(x) + imag(v)*imag(x)
	}
	return t
}

// add adds f s to the full matrix a.
func (s *sparse) add(a []complex128, f float64) {
	val := s.val[:len(s.at)]
	for i, at := range s.at {
		v, x := val[i], a[at]
		a[at] = complex(real(x)+f*real(v), imag(x)+f*imag(v))
	}
}

// spread bounds the spectral norm of the Hermitian matrix a: its Frobenius norm, or
// above four levels its largest row sum if that is smaller.
func spread(a []complex128, d int) float64 {
	all := 0.0
	for _, x := range a {
		all += real(x)*real(x) + imag(x)*imag(x)
	}
	if d <= 4 {
		return math.Sqrt(all)
	}
	return min(math.Sqrt(all), rowSum(a, d))
}

// rowSum returns the largest sum of the entries of a row, |Re| + |Im| of each.
func rowSum(a []complex128, d int) float64 {
	most := 0.0
	for i := range d {
		sum := 0.0
		for _, x := range a[i*d : i*d+d] {
			sum += math.Abs(real(x)) + math.Abs(imag(x))
		}
		most = max(most, sum)
	}
	return most
}

// center subtracts the mean of the diagonal of a from it, and returns it.
func center(a []complex128, d int) float64 {
	m := 0.0
	for i := range d {
		m += real(a[i*d+i])
	}
	m /= float64(d)
	for i := range d {
		a[i*d+i] -= complex(m, 0)
	}
	return m
}
