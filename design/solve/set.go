package solve

import "math"

// A Set is a convex set around the origin in n dimensions: the points c with
// |a·c| <= 1 for every row, (p·c)² + (q·c)² <= 1 for every disc and cᵀQc <= 1 for
// every ball. The zero Set is not useful; NewSet makes one.
type Set struct {
	n     int
	rows  []span
	discs [][2]span
	balls []ball
}

// A ball is the limit cᵀ Q c <= 1 with Q positive semidefinite, kept whole.
type ball struct{ q []float64 }

// A span is a vector that is zero outside [lo, lo+len(v)).
type span struct {
	lo int
	v  []float64
}

// NewSet returns the whole space of n dimensions, to which limits are added.
func NewSet(n int) *Set { return &Set{n: n} }

// Dim returns the number of dimensions.
func (s *Set) Dim() int { return s.n }

// Constraints counts one-sided limits: two for a row, one for a disc or a
// ball.
func (s *Set) Constraints() int { return 2*len(s.rows) + len(s.discs) + len(s.balls) }

// AddRow demands |a·c| <= bound, bound > 0. Rows that are zero are left out.
func (s *Set) AddRow(a []float64, bound float64) {
	if sp := trim(a, bound); len(sp.v) > 0 {
		s.rows = append(s.rows, sp)
	}
}

// AddDisc demands (p·c)² + (q·c)² <= radius², radius > 0.
func (s *Set) AddDisc(p, q []float64, radius float64) {
	a, b := trim(p, radius), trim(q, radius)
	if len(a.v)+len(b.v) > 0 {
		s.discs = append(s.discs, [2]span{a, b})
	}
}

// AddBall demands cᵀ Q c <= bound², bound > 0, for a symmetric positive
// semidefinite Q, n x n row by row.
func (s *Set) AddBall(q []float64, bound float64) {
	b := ball{make([]float64, len(q))}
	for i, v := range q {
		b.q[i] = v / (bound * bound)
	}
	s.balls = append(s.balls, b)
}

// times returns c·Q·d.
func (b ball) times(c, d []float64) float64 {
	n, sum := len(c), 0.0
	for i, v := range c {
		if v != 0 {
			row := b.q[i*n : (i+1)*n]
			for k, w := range row {
				sum += v * w * d[k]
			}
		}
	}
	return sum
}

func trim(a []float64, bound float64) span {
	lo, hi := 0, len(a)
	for lo < hi && a[lo] == 0 {
		lo++
	}
	for hi > lo && a[hi-1] == 0 {
		hi--
	}
	v := make([]float64, hi-lo)
	for i := range v {
		v[i] = a[lo+i] / bound
	}
	return span{lo, v}
}

func (s span) dot(c []float64) float64 {
	c = c[s.lo : s.lo+len(s.v)]
	sum := 0.0
	for i, v := range s.v {
		sum += v * c[i]
	}
	return sum
}

func (s span) addTo(g []float64, f float64) {
	g = g[s.lo : s.lo+len(s.v)]
	for i, v := range s.v {
		g[i] += f * v
	}
}

// Gauge returns how far out c lies: 0 at the origin, 1 on the boundary.
func (s *Set) Gauge(c []float64) float64 {
	m := 0.0
	for i := range s.rows {
		m = math.Max(m, math.Abs(s.rows[i].dot(c)))
	}
	for i := range s.discs {
		m = math.Max(m, math.Hypot(s.discs[i][0].dot(c), s.discs[i][1].dot(c)))
	}
	for _, b := range s.balls {
		m = math.Max(m, math.Sqrt(math.Max(0, b.times(c, c))))
	}
	return m
}

// reach returns the largest t with c + t p in the set, for c inside: the linear
// rows in closed form, the discs by their quadratic.
func (s *Set) reach(c, p []float64) float64 {
	t := math.Inf(1)
	for i := range s.rows {
		v, d := s.rows[i].dot(c), s.rows[i].dot(p)
		if d < 0 {
			v, d = -v, -d
		}
		if d > 0 {
			t = math.Min(t, (1-v)/d)
		}
	}
	for i := range s.discs {
		x, y := s.discs[i][0].dot(c), s.discs[i][1].dot(c)
		dx, dy := s.discs[i][0].dot(p), s.discs[i][1].dot(p)
		t = math.Min(t, root(dx*dx+dy*dy, x*dx+y*dy, 1-x*x-y*y))
	}
	for _, q := range s.balls {
		t = math.Min(t, root(q.times(p, p), q.times(c, p), 1-q.times(c, c)))
	}
	return math.Max(t, 0)
}

// root returns the positive root of a t² + 2 b t - room, a >= 0, without
// cancellation; +Inf for a = 0.
func root(a, b, room float64) float64 {
	if !(a > 0) {
		return math.Inf(1)
	}
	r := math.Sqrt(b*b + a*room)
	if b > 0 {
		return room / (b + r)
	}
	return (r - b) / a
}

// barrier returns φ(c) = -sum ln(slack), +Inf outside the set.
func (s *Set) barrier(c []float64) float64 {
	sum, prod := 0.0, 1.0
	for i := range s.rows {
		v := s.rows[i].dot(c)
		slack := (1 - v) * (1 + v) // both sides at once
		if !(slack > 0) {
			return math.Inf(1)
		}
		if prod *= slack; prod < 1e-200 {
			sum -= math.Log(prod)
			prod = 1
		}
	}
	for i := range s.discs {
		x, y := s.discs[i][0].dot(c), s.discs[i][1].dot(c)
		slack := 1 - x*x - y*y
		if !(slack > 0) {
			return math.Inf(1)
		}
		if prod *= slack; prod < 1e-200 {
			sum -= math.Log(prod)
			prod = 1
		}
	}
	for _, b := range s.balls {
		slack := 1 - b.times(c, c)
		if !(slack > 0) {
			return math.Inf(1)
		}
		sum -= math.Log(slack)
	}
	return sum - math.Log(prod)
}

// derivatives stores the barrier's gradient in g and the upper
// triangle of its Hessian in h (row-major n x n) for c inside the set.
func (s *Set) derivatives(c, g, h []float64) {
	clear(g)
	clear(h)
	for i := range s.rows {
		r := s.rows[i]
		v := r.dot(c)
		a, b := 1/(1-v), 1/(1+v)
		r.addTo(g, a-b)
		r.addOuter(h, s.n, a*a+b*b)
	}
	for i := range s.discs {
		p, q := s.discs[i][0], s.discs[i][1]
		x, y := p.dot(c), q.dot(c)
		w := 2 / (1 - x*x - y*y)
		p.addTo(g, w*x)
		q.addTo(g, w*y)
		// w (p pᵀ + q qᵀ) + w² (x p + y q)(x p + y q)ᵀ
		p.addOuter(h, s.n, w+w*w*x*x)
		q.addOuter(h, s.n, w+w*w*y*y)
		addMixed(h, s.n, p, q, w*w*x*y)
	}
	for _, b := range s.balls {
		// w Q + w² (Q c)(Q c)ᵀ
		qc := b.apply(c)
		w := 2 / (1 - dotted(c, qc))
		for i, v := range qc {
			g[i] += w * v
			row, q := h[i*s.n:(i+1)*s.n], b.q[i*s.n:(i+1)*s.n]
			for k := i; k < s.n; k++ {
				row[k] += w*q[k] + w*w*v*qc[k]
			}
		}
	}
}

// apply returns Q c.
func (b ball) apply(c []float64) []float64 {
	qc := make([]float64, len(c))
	for i := range qc {
		qc[i] = dotted(b.q[i*len(c):(i+1)*len(c)], c)
	}
	return qc
}

func dotted(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

// addOuter adds f v vᵀ to the upper triangle of h.
func (s span) addOuter(h []float64, n int, f float64) {
	for i, v := range s.v {
		row := h[(s.lo+i)*n+s.lo+i : (s.lo+i)*n+s.lo+len(s.v)]
		w := f * v
		for k, u := range s.v[i:] {
			row[k] += w * u
		}
	}
}

// addMixed adds f (p qᵀ + q pᵀ) to the upper triangle of h.
func addMixed(h []float64, n int, p, q span, f float64) {
	if f == 0 {
		return
	}
	if p.lo > q.lo {
		p, q = q, p
	}
	if p.lo+len(p.v) <= q.lo { // as of a line that keeps the quadratures apart: every entry lies above the diagonal
		for i, v := range p.v {
			row := h[(p.lo+i)*n+q.lo : (p.lo+i)*n+q.lo+len(q.v)]
			w := f * v
			for k, u := range q.v {
				row[k] += w * u
			}
		}
		return
	}
	for i, v := range p.v {
		r := p.lo + i
		for k, u := range q.v {
			c := q.lo + k
			switch {
			case r < c:
				h[r*n+c] += f * v * u
			case r > c:
				h[c*n+r] += f * v * u
			default:
				h[r*n+r] += 2 * f * v * u
			}
		}
	}
}
