package robust

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Rotations are what playback adds to a gate on a code space of two levels a site:
// one 2x2 unitary for each site, row by row, the first site slowest. M, the block of
// the gate, becomes After M Before. Both are empty where nothing is free.
type Rotations struct {
	Before, After [][4]complex128
}

func (r Rotations) clone() Rotations { return Rotations{slices.Clone(r.Before), slices.Clone(r.After)} }

// Angles returns the turns about Z of rotations about Z, rad: exp(-i angle Z/2).
func Angles(list [][4]complex128) []float64 {
	var angles []float64
	for _, m := range list {
		angles = append(angles, cmplx.Phase(m[3]/m[0]))
	}
	return angles
}

// An aim is what a gate of several levels is to do: a unitary on the code space, up to
// the rotations that are free, or a map of some states to others. A gate's residuals are
//
//	( phase W'M - 1 )/√c       M = After P X P Before, of c code levels; phase that of the trace
//	( rows of X that leave the code space )/√c
//
// or, from k states to the span of as many others,
//
//	( (1 - P_to) X |from> )/√k
//
// with X the gate in the frame of the undriven device.
type aim struct {
	d, c, k int // k: columns, c of a gate
	code    []int
	outside []int

	target []complex128 // c x c; nil for states
	from   []complex128 // d x k
	away   []complex128 // d x d, 1 - P_to

	before, after []complex128 // d x d: free evolution that is taken out

	sites int
	sides [2]bool // before, after
	axes  []int   // of the free turns of every site: Z, or all three
	set   Rotations
	warm  bool
}

// newAim takes the part of a problem that concerns the gate.
func newAim(s *Levels) *aim {
	d := s.Dim
	a := &aim{d: d, c: len(s.Code), k: len(s.Code), code: s.Code, target: s.Target}
	inside := make([]bool, d)
	for _, i := range s.Code {
		inside[i] = true
	}
	for i := range d {
		if !inside[i] {
			a.outside = append(a.outside, i)
		}
	}
	if len(s.From) > 0 {
		a.k = len(s.From)
		a.from, a.away = make([]complex128, d*a.k), make([]complex128, d*d)
		for i := range d {
			a.away[i*d+i] = 1
		}
		for j := range s.From {
			for i, p := range s.Code {
				a.from[p*a.k+j] = s.From[j][i]
				for l, q := range s.Code {
					a.away[p*d+q] -= s.To[j][i] * cmplx.Conj(s.To[j][l])
				}
			}
		}
		a.target, a.outside = nil, nil
	}
	a.before, a.after = diagonal(d), diagonal(d)
	a.sides = [2]bool{s.FreeBefore || s.Local, s.FreeAfter || s.Local}
	if a.axes = []int{2}; s.Local {
		a.axes = []int{0, 1, 2}
	}
	for 1<<a.sites < a.c {
		a.sites++
	}
	a.reset()
	return a
}

// free tells whether rotations are.
func (a *aim) free() bool { return a.sides[0] || a.sides[1] }

// angles counts the free angles.
func (a *aim) angles() int {
	n := 0
	for _, s := range a.sides {
		if s {
			n += a.sites * len(a.axes)
		}
	}
	return n
}

// reset forgets the rotations of the last gate.
func (a *aim) reset() {
	a.warm = false
	a.set = Rotations{}
	for side, list := range []*[][4]complex128{&a.set.Before, &a.set.After} {
		if a.sides[side] {
			for range a.sites {
				*list = append(*list, [4]complex128{1, 0, 0, 1})
			}
		}
	}
}

// rows counts the residuals of one gate.
func (a *aim) rows() int {
	if a.target == nil {
		return 2 * a.d * a.k
	}
	return 2 * a.c * a.d
}

func diagonal(n int) []complex128 {
	m := make([]complex128, n*n)
	for i := range n {
		m[i*n+i] = 1
	}
	return m
}

// product returns a b, of m x n and n x p entries.
func product(a, b []complex128, m, n, p int) []complex128 {
	c := make([]complex128, m*p)
	for i := range m {
		row := c[i*p : (i+1)*p]
		for k := range n {
			if f := a[i*n+k]; f != 0 {
				for j, v := range b[k*p : (k+1)*p] {
					row[j] += f * v
				}
			}
		}
	}
	return c
}

// adjoint returns a' of a, m x n.
func adjoint(a []complex128, m, n int) []complex128 {
	b := make([]complex128, m*n)
	for i := range m {
		for j := range n {
			b[j*m+i] = cmplx.Conj(a[i*n+j])
		}
	}
	return b
}

// whole returns the product over sites, c x c; the identity for none.
func (a *aim) whole(list [][4]complex128) []complex128 {
	if len(list) == 0 {
		return diagonal(a.c)
	}
	m, n := []complex128{1}, 1
	for _, r := range list {
		next := make([]complex128, 4*n*n)
		for i := range 2 * n {
			for j := range 2 * n {
				next[i*2*n+j] = m[i/2*n+j/2] * r[i%2*2+j%2]
			}
		}
		m, n = next, 2*n
	}
	return m
}

// pauli stores -i/2 times a Pauli matrix of one site times m, c rows of p, in dst.
func (a *aim) pauli(dst []complex128, axis, site int, m []complex128, p int) {
	bit := 1 << (a.sites - 1 - site)
	for i := range a.c {
		up := i&bit == 0
		from, f := i, complex128(-0.5i)
		switch axis {
		case 0:
			from = i ^ bit
		case 1: // -i/2 Y is real
			if from, f = i^bit, 0.5; up {
				f = -0.5
			}
		case 2:
			if !up {
				f = 0.5i
			}
		}
		for j := range p {
			dst[i*p+j] = f * m[from*p+j]
		}
	}
}

// turn multiplies one site's rotation by exp of the best rotation of all that are
// free, and returns how far it moved, as a sine. part is the trace over the other
// sites of the product whose own trace is to grow.
func (a *aim) turn(r *[4]complex128, part [4]complex128) float64 {
	var q [4]float64 // cos, then -sin times the axis: exp = q0 - i q.σ
	if len(a.axes) == 1 {
		phase := (cmplx.Phase(part[0]) - cmplx.Phase(part[3])) / 2
		if part[0] == 0 || part[3] == 0 {
			return 0
		}
		q[3], q[0] = math.Sincos(phase)
	} else {
		v := [4]complex128{part[0] + part[3], -1i * (part[1] + part[2]), part[1] - part[2], -1i * (part[0] - part[3])}
		sum := complex128(0)
		for _, x := range v {
			sum += x * x
		}
		turned := cmplx.Rect(1, -cmplx.Phase(sum)/2)
		size := 0.0
		for i, x := range v {
			q[i] = real(turned * x)
			size += q[i] * q[i]
		}
		if size == 0 {
			return 0
		}
		for i := range q {
			q[i] /= math.Sqrt(size)
		}
	}
	if q[0] < 0 {
		for i := range q {
			q[i] = -q[i]
		}
	}
	e := [4]complex128{complex(q[0], -q[3]), complex(-q[2], -q[1]), complex(q[2], -q[1]), complex(q[0], q[3])}
	*r = [4]complex128{
		e[0]*r[0] + e[1]*r[2], e[0]*r[1] + e[1]*r[3],
		e[2]*r[0] + e[3]*r[2], e[2]*r[1] + e[3]*r[3],
	}
	return math.Sqrt(q[1]*q[1] + q[2]*q[2] + q[3]*q[3])
}

// traceOthers returns the trace of m, c x c, over all sites but one.
func (a *aim) traceOthers(m []complex128, site int) (part [4]complex128) {
	bit := 1 << (a.sites - 1 - site)
	for i := range a.c {
		if i&bit != 0 {
			continue
		}
		for p := range 2 {
			for q := range 2 {
				part[2*p+q] += m[(i+p*bit)*a.c+i+q*bit]
			}
		}
	}
	return part
}

// fit turns the free rotations to where |Tr W' After x Before| is largest, x the c x c
// block of the gate: site by site in closed form, until none of them moves. The first
// time it looks from several sides.
func (a *aim) fit(x []complex128) {
	if !a.free() {
		return
	}
	if a.warm {
		a.climb(x)
		return
	}
	const looks = 6
	rng := rand.New(rand.NewPCG(uint64(a.c), 0))
	best, found := -1.0, Rotations{}
	for look := range looks {
		a.reset()
		if look > 0 {
			for _, list := range [][][4]complex128{a.set.Before, a.set.After} {
				for s := range list {
					var part [4]complex128
					for i := range part {
						part[i] = complex(rng.NormFloat64(), rng.NormFloat64())
					}
					a.turn(&list[s], part)
				}
			}
		}
		// a little better is no better: the first of several equals is taken
		if t := a.climb(x); t > best*(1+1e-9) {
			best, found = t, a.set
		}
	}
	a.set, a.warm = found, true
}

// climb is fit from where the rotations are; it returns the trace's size.
func (a *aim) climb(x []complex128) float64 {
	const sweeps, still = 500, 1e-12
	c := a.c
	back := adjoint(a.target, c, c)
	for range sweeps {
		moved := 0.0
		if a.sides[1] {
			rest := product(product(x, a.whole(a.set.Before), c, c, c), back, c, c, c)
			for s := range a.set.After {
				m := product(a.whole(a.set.After), rest, c, c, c)
				moved = math.Max(moved, a.turn(&a.set.After[s], a.traceOthers(m, s)))
			}
		}
		if a.sides[0] {
			rest := product(product(back, a.whole(a.set.After), c, c, c), x, c, c, c)
			for s := range a.set.Before {
				m := product(a.whole(a.set.Before), rest, c, c, c)
				moved = math.Max(moved, a.turn(&a.set.Before[s], a.traceOthers(m, s)))
			}
		}
		if !(moved > still) {
			break
		}
	}
	m := product(product(back, a.whole(a.set.After), c, c, c), product(x, a.whole(a.set.Before), c, c, c), c, c, c)
	t := complex128(0)
	for i := range c {
		t += m[i*c+i]
	}
	return cmplx.Abs(t)
}

// A view is one gate U seen from an aim, at the aim's rotations: E = left U right - 1
// (without the 1 for states) with its residuals.
type view struct {
	a      *aim
	u      []complex128
	m      int          // rows of E
	f      float64      // of the residuals
	left   []complex128 // m x d, the phase included
	right  []complex128 // d x k
	leftU  []complex128 // left U
	e      []complex128 // m x k: left U right, without the 1
	trace  float64      // of e; zero for states
	leave  []complex128 // rows of after outside the code space
	leaveU []complex128 // leave U
	enter  []complex128 // d x c: before on the code space
	gone   []complex128 // outside x c

	directions [][]complex128 // of the residuals by each free angle, m x k
	pull       []complex128   // what the trace becomes by each, -i times real at the best angles
}

// see looks at a gate u, d x d, and fits the rotations to it if wanted.
func (a *aim) see(u []complex128, fit bool) *view {
	v := &view{a: a, u: append([]complex128(nil), u...)}
	d, c := a.d, a.c
	y := product(a.after, u, d, d, d)
	if a.target == nil {
		v.m, v.f = d, 1/math.Sqrt(float64(a.k))
		v.left = product(a.away, a.after, d, d, d)
		v.right = product(a.before, a.from, d, d, a.k)
		v.leftU = product(a.away, y, d, d, d)
		v.e = product(v.leftU, v.right, d, d, a.k)
		return v
	}
	v.m, v.f = c, 1/math.Sqrt(float64(c))
	v.enter = make([]complex128, d*c)
	for i := range d {
		for j, q := range a.code {
			v.enter[i*c+j] = a.before[i*d+q]
		}
	}
	rows := func(m []complex128, list []int) []complex128 {
		var r []complex128
		for _, i := range list {
			r = append(r, m[i*d:(i+1)*d]...)
		}
		return r
	}
	out, inU := rows(a.after, a.code), rows(y, a.code)
	v.leave, v.leaveU = rows(a.after, a.outside), rows(y, a.outside)
	v.gone = product(v.leaveU, v.enter, len(a.outside), d, c)
	if fit {
		a.fit(product(inU, v.enter, c, d, c))
	}
	before, after := a.whole(a.set.Before), a.whole(a.set.After)
	w := product(adjoint(a.target, c, c), after, c, c, c)
	v.right = product(v.enter, before, d, c, c)
	v.leftU = product(w, inU, c, c, d)
	v.e = product(v.leftU, v.right, c, d, c)
	t := complex128(0)
	for i := range c {
		t += v.e[i*c+i]
	}
	phase := complex128(1)
	if v.trace = cmplx.Abs(t); v.trace > 0 {
		phase = cmplx.Conj(t) / complex(v.trace, 0)
	}
	for i := range v.e {
		v.e[i] *= phase
	}
	for i := range v.leftU {
		v.leftU[i] *= phase
	}
	v.left = product(w, out, c, c, d)
	for i := range v.left {
		v.left[i] *= phase
	}
	return v
}

// block returns phase W' After X, c x c.
func (v *view) block() []complex128 { return product(v.leftU, v.enter, v.a.c, v.a.d, v.a.c) }

// residual stores the residuals in r.
func (v *view) residual(r []float64) {
	at := 0
	put := func(list []complex128, square bool) {
		for i, z := range list {
			if square && i%(v.a.k+1) == 0 {
				z--
			}
			r[at], r[at+1] = v.f*real(z), v.f*imag(z)
			at += 2
		}
	}
	put(v.e, v.a.target != nil)
	put(v.gone, false)
}

// turns fills directions and pull.
func (v *view) turns() {
	a := v.a
	if v.directions != nil || !a.free() {
		return
	}
	c := a.c
	w := adjoint(a.target, c, c)
	before := a.whole(a.set.Before)
	// phase After X Before = W e, and phase W' After X = leftU enter
	we := product(a.target, v.e, c, c, c)
	half := v.block()
	moved := make([]complex128, c*c)
	for side, free := range a.sides {
		if !free {
			continue
		}
		for s := range a.sites {
			for _, axis := range a.axes {
				var d []complex128
				if side == 1 {
					a.pauli(moved, axis, s, we, c)
					d = product(w, moved, c, c, c)
				} else {
					a.pauli(moved, axis, s, before, c)
					d = product(half, moved, c, c, c)
				}
				t := complex128(0)
				for i := range c {
					t += d[i*c+i]
				}
				v.pull = append(v.pull, t)
				v.directions = append(v.directions, v.follow(d, t))
			}
		}
	}
}

// follow adds to a change d of e, of trace t, what the phase makes of it.
func (v *view) follow(d []complex128, t complex128) []complex128 {
	if v.trace > 0 {
		f := complex(0, -imag(t)/v.trace)
		for i := range d {
			d[i] += f * v.e[i]
		}
	}
	return d
}

// along returns the derivative of the residuals by free angle n.
func (v *view) along(n int) []float64 {
	r := make([]float64, v.a.rows())
	for i, z := range v.directions[n] {
		r[2*i], r[2*i+1] = v.f*real(z), v.f*imag(z)
	}
	return r
}

// functional adds to dst the coordinates of the Hermitian K with
// Tr(K δ) = Re( f Σ_j left[j] (-i δ) right[j] ): the change by U -> U exp(-i δ).
// left are n rows and right n columns of d entries, as columns of d x n.
func functional(dst []float64, f complex128, left, right []complex128, d, n int) {
	f *= -1i
	at := d
	sum := func(p, q int) complex128 { // -i f Σ right[p] left[q]
		t := complex128(0)
		for j := range n {
			t += right[p*n+j] * left[j*d+q]
		}
		return f * t
	}
	for p := range d {
		dst[p] += real(sum(p, p))
		for q := p + 1; q < d; q++ {
			x, y := sum(p, q), sum(q, p)
			dst[at] += math.Sqrt2 / 2 * (real(x) + real(y))
			dst[at+1] += math.Sqrt2 / 2 * (imag(x) - imag(y))
			at += 2
		}
	}
}

// lever stores in dst, rows x d², what takes the coordinates of the generator δ,
// U -> U exp(-i δ), to the derivatives of the residuals at fixed rotations.
func (v *view) lever(dst []float64) {
	a := v.a
	d, k := a.d, a.k
	dd := d * d
	clear(dst)
	row := 0
	column := make([]complex128, d)
	outer := func(left []complex128, right []complex128, n, i, j int) {
		for p := range d {
			column[p] = right[p*n+j]
		}
		functional(dst[row*dd:(row+1)*dd], complex(v.f, 0), left[i*d:(i+1)*d], column, d, 1)
		functional(dst[(row+1)*dd:(row+2)*dd], complex(0, -v.f), left[i*d:(i+1)*d], column, d, 1)
		row += 2
	}
	for i := range v.m {
		for j := range k {
			outer(v.leftU, v.right, k, i, j)
		}
	}
	for i := range a.outside {
		for j := range k {
			outer(v.leaveU, v.enter, k, i, j)
		}
	}
	if a.target == nil || v.trace == 0 {
		return
	}
	// the phase follows the trace
	turn := make([]float64, dd)
	functional(turn, complex(0, -1/v.trace), v.leftU, v.right, d, k) // Im dT / T
	for i, z := range v.e {
		re, im := dst[2*i*dd:(2*i+1)*dd], dst[(2*i+1)*dd:(2*i+2)*dd]
		for q, t := range turn {
			re[q] += v.f * imag(z) * t
			im[q] -= v.f * real(z) * t
		}
	}
}

// A bend says how the free angles follow the gate: at the best ones the slope of
// |trace|² by each is zero, so that dα = -H⁺ dS with H its matrix of second
// derivatives (implicit function; the whole is variable projection, Golub and Pereyra
// 1973, SIAM J. Numer. Anal. 10, 413).
type bend struct {
	n       int
	inverse []float64      // n x n, pseudo-inverse of H
	left    [][]complex128 // by angle: what stands in the place of left, or nil
	right   [][]complex128
}

// bend prepares how the angles of a fitted view follow; nil when none is free.
func (v *view) bend() *bend {
	a := v.a
	n := a.angles()
	if n == 0 {
		return nil
	}
	v.turns()
	c, d := a.c, a.d
	b := &bend{n: n, left: make([][]complex128, n), right: make([][]complex128, n)}
	w := adjoint(a.target, c, c)
	before := a.whole(a.set.Before)
	we := product(a.target, v.e, c, c, c) // phase After X Before
	half := v.block()                     // phase W' After X
	type angle struct{ side, site, axis int }
	var list []angle
	for side, free := range a.sides {
		for s := range a.sites {
			for _, axis := range a.axes {
				if free {
					list = append(list, angle{side, s, axis})
				}
			}
		}
	}
	// left, without the gate's own block: phase W' After on the code rows of after
	phased := product(a.target, v.left, c, c, d) // phase After out
	moved := make([]complex128, c*c)
	for i, g := range list {
		if g.side == 1 {
			m := make([]complex128, c*d)
			a.pauli(m, g.axis, g.site, phased, d)
			b.left[i] = product(w, m, c, c, d)
		} else {
			a.pauli(moved, g.axis, g.site, before, c)
			b.right[i] = product(v.enter, moved, d, c, c)
		}
	}
	second := mat.NewSymDense(n, nil)
	for i, g := range list {
		// T by angle i, as a matrix whose trace with the next turn is taken
		var at []complex128
		m := make([]complex128, c*c)
		for j := i; j < n; j++ {
			o := list[j]
			var t complex128
			switch {
			case g.side == 1 && o.side == 1: // Tr W' g o (After X Before)
				a.pauli(moved, o.axis, o.site, we, c)
				a.pauli(m, g.axis, g.site, moved, c)
				t = traceOf(product(w, m, c, c, c), c)
			case g.side == 0 && o.side == 0: // Tr half g o before
				a.pauli(moved, o.axis, o.site, before, c)
				a.pauli(m, g.axis, g.site, moved, c)
				t = traceOf(product(half, m, c, c, c), c)
			default: // g before, o after: Tr W' o W half g before
				if at == nil {
					a.pauli(moved, g.axis, g.site, before, c)
					at = product(product(a.target, half, c, c, c), moved, c, c, c)
				}
				a.pauli(m, o.axis, o.site, at, c)
				t = traceOf(product(w, m, c, c, c), c)
			}
			second.SetSym(i, j, v.trace*real(t)+real(cmplx.Conj(v.pull[j])*v.pull[i]))
		}
	}
	b.inverse = pseudoInverse(second, n)
	return b
}

func traceOf(m []complex128, n int) (t complex128) {
	for i := range n {
		t += m[i*n+i]
	}
	return t
}

// pseudoInverse leaves out the directions in which nothing changes: of two angles that
// do the same.
func pseudoInverse(m *mat.SymDense, n int) []float64 {
	inverse := make([]float64, n*n)
	var e mat.EigenSym
	if !e.Factorize(m, true) {
		return inverse
	}
	var q mat.Dense
	e.VectorsTo(&q)
	values := e.Values(nil)
	largest := 0.0
	for _, x := range values {
		largest = math.Max(largest, math.Abs(x))
	}
	for k, x := range values {
		if !(math.Abs(x) > 1e-9*largest) {
			continue
		}
		for i := range n {
			for j := range n {
				inverse[i*n+j] += q.At(i, k) * q.At(j, k) / x
			}
		}
	}
	return inverse
}

// slopes stores in dst, n x d², the derivatives of the angles by the coordinates of δ.
func (b *bend) slopes(v *view, dst []float64) {
	a := v.a
	dd := a.d * a.d
	raw := make([]float64, b.n*dd)
	for i := range b.n {
		row := raw[i*dd : (i+1)*dd]
		left, right := v.leftU, v.right
		if b.left[i] != nil {
			left = product(b.left[i], v.u, a.c, a.d, a.d)
		} else {
			right = b.right[i]
		}
		functional(row, complex(v.trace, 0), left, right, a.d, a.c)
		functional(row, cmplx.Conj(v.pull[i]), v.leftU, v.right, a.d, a.c)
	}
	clear(dst)
	for i := range b.n {
		for j := range b.n {
			f := -b.inverse[i*b.n+j]
			for q, x := range raw[j*dd : (j+1)*dd] {
				dst[i*dd+q] += f * x
			}
		}
	}
}

// cotangent adds to dst, d x d, the G with Re Tr(G' dU) = Σ z dr over the residuals r
// of the view, at fixed rotations.
func (v *view) cotangent(dst []complex128, z []float64) {
	a := v.a
	d, k := a.d, a.k
	cot := func(from, n int) []complex128 {
		m := make([]complex128, n)
		for i := range m {
			m[i] = complex(v.f*z[2*(from+i)], v.f*z[2*(from+i)+1])
		}
		return m
	}
	add := func(m []complex128) {
		for i, x := range m {
			dst[i] += x
		}
	}
	inside := cot(0, v.m*k)
	if v.trace > 0 { // the phase follows the trace
		w := 0.0
		for i, x := range inside {
			w -= imag(cmplx.Conj(x) * v.e[i])
		}
		for i := range k {
			inside[i*k+i] += complex(0, -w/v.trace)
		}
	}
	add(product(product(adjoint(v.left, v.m, d), inside, d, v.m, k), adjoint(v.right, d, k), d, k, d))
	if n := len(a.outside); n > 0 {
		out := cot(v.m*k, n*k)
		add(product(product(adjoint(v.leave, n, d), out, d, n, k), adjoint(v.enter, d, k), d, k, d))
	}
}

// cotangent adds to dst the G with Re Tr(G' dU) = Σ z dα over the angles.
func (b *bend) cotangent(v *view, dst []complex128, z []float64) {
	a := v.a
	c, d := a.c, a.d
	along := func(f complex128, left, right []complex128) {
		for i, x := range product(adjoint(left, c, d), adjoint(right, d, c), d, c, d) {
			dst[i] += f * x
		}
	}
	for j := range b.n {
		y := 0.0
		for i := range b.n {
			y -= z[i] * b.inverse[i*b.n+j]
		}
		if y == 0 {
			continue
		}
		left, right := v.left, v.right
		if b.left[j] != nil {
			left = b.left[j]
		} else {
			right = b.right[j]
		}
		along(complex(y*v.trace, 0), left, right)
		along(complex(y, 0)*v.pull[j], v.left, v.right)
	}
}

// losses returns the infidelity and the leakage of a view. Of a gate it is the average
// gate infidelity: with E and L the two parts of the residuals,
// |Tr W'M|/c = 1 - (|E|² + |L|²)/2, in which nothing cancels. Of states it is
// 1 - F averaged over them.
func (v *view) losses() (infidelity, leakage float64) {
	a := v.a
	if a.target == nil {
		inside := make([]bool, a.d)
		for _, i := range a.code {
			inside[i] = true
		}
		// what of e lies outside the code space is all that does: the targets are inside
		for i := range a.d {
			for j := range a.k {
				x := v.e[i*a.k+j]
				p := (real(x)*real(x) + imag(x)*imag(x)) / float64(a.k)
				infidelity += p
				if !inside[i] {
					leakage += p
				}
			}
		}
		return infidelity, leakage
	}
	r := make([]float64, a.rows())
	v.residual(r)
	inside := 0.0
	for _, x := range r[:2*a.c*a.c] {
		inside += x * x
	}
	for _, x := range r[2*a.c*a.c:] {
		leakage += x * x
	}
	x := (inside + leakage) / 2
	process := 2*x - x*x
	return (process*float64(a.c) + leakage) / float64(a.c+1), leakage
}
