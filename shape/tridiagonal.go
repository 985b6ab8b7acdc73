package shape

import "math"

// slepianMatrix is the part of the commuting matrix T that acts on the
// symmetric or on the antisymmetric sequences of length n, in the coordinates
// y(k) = sqrt(2) v(k) for k < n/2 and, for odd n and symmetric v, y(k) = v(k) at
// the centre. It is symmetric, tridiagonal, with positive off-diagonal
// elements; so its eigenvalues are distinct.
type slepianMatrix struct {
	n            int  // length of the sequences
	odd          bool // antisymmetric sequences
	diagonal     []float64
	next         []float64 // next[k] couples k and k+1; one shorter than diagonal
	square       []float64 // next squared
	above, below float64   // bounds of the eigenvalues
	forward      []float64 // scratch: pivots from the top
	backward     []float64 // and from the bottom
}

// slepianHalf makes the matrix for sequences of length n and band w.
func slepianHalf(n int, w float64, odd bool) *slepianMatrix {
	size := (n + 1) / 2
	if odd {
		size = n / 2
	}
	m := &slepianMatrix{
		n:        n,
		odd:      odd,
		diagonal: make([]float64, size),
		next:     make([]float64, size-1),
		square:   make([]float64, size-1),
		forward:  make([]float64, size),
		backward: make([]float64, size),
	}
	cos := math.Cos(2 * math.Pi * w)
	for k := range m.diagonal {
		x := float64(n-1-2*k) / 2
		m.diagonal[k] = float64(x * x * cos)
	}
	for k := range m.next {
		m.next[k] = float64(k+1) * float64(n-k-1) / 2
	}
	// The fold. With even n, element n/2-1 couples to its own mirror image; with
	// odd n, the centre couples to its two neighbours alike.
	switch last := size - 1; {
	case n%2 == 0 && odd:
		m.diagonal[last] -= float64(n) * float64(n) / 8
	case n%2 == 0:
		m.diagonal[last] += float64(n) * float64(n) / 8
	case !odd && last > 0:
		m.next[last-1] *= math.Sqrt2
	}
	m.above, m.below = math.Inf(-1), math.Inf(1)
	for k, e := range m.next {
		m.square[k] = e * e
	}
	for k, d := range m.diagonal { // Gershgorin's discs
		var r float64
		if k > 0 {
			r += m.next[k-1]
		}
		if k < size-1 {
			r += m.next[k]
		}
		m.above, m.below = math.Max(m.above, d+r), math.Min(m.below, d-r)
	}
	margin := 1e-15 * (1 + math.Max(math.Abs(m.above), math.Abs(m.below))) * 8
	m.above, m.below = m.above+margin, m.below-margin
	return m
}

// size is the order of the matrix.
func (m *slepianMatrix) size() int { return len(m.diagonal) }

// tiny stands in for a pivot that is exactly zero. Elements are halves and
// products of whole numbers of ordinary size, so that it is far below all of
// them, and its reciprocal times their squares is far from overflow.
const tiny = 1e-200

// larger counts the eigenvalues above x: by Sylvester's law of inertia, the
// positive pivots of the elimination of T - x.
func (m *slepianMatrix) larger(x float64) int {
	count := 0
	pivot := m.diagonal[0] - x
	for k, e2 := range m.square {
		if pivot > 0 {
			count++
		}
		if pivot == 0 {
			pivot = -tiny
		}
		pivot = (m.diagonal[k+1] - x) - e2/pivot
	}
	if pivot > 0 {
		count++
	}
	return count
}

// eigenvalue returns the eigenvalue that has index others above it, by
// bisection down to neighbouring doubles or a few units of rounding of T. The
// eigenvalue must lie below upper.
func (m *slepianMatrix) eigenvalue(index int, upper float64) float64 {
	lo, hi := m.below, upper
	step := 0x1p-53 * math.Max(math.Abs(m.above), math.Abs(m.below))
	for hi-lo > step {
		mid := lo + (hi-lo)/2
		if mid <= lo || mid >= hi {
			break
		}
		if m.larger(mid) > index {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo + (hi-lo)/2
}

// vector stores in v, n long, the unit sequence that belongs to lambda.
//
// Eliminating T - lambda from the top leaves pivots p, from the bottom pivots
// q. A vector that solves all equations but the one in row r leaves in that row
//
//	g(r) = p(r) + q(r) - (T(r,r) - lambda),
//
// so the r of the smallest |g| gives the best vector and, by Rayleigh's
// quotient, lambda + g(r)/|y|^2 the better eigenvalue [fernando]. Each element
// follows from its neighbour by one division, so that even elements far below
// the largest keep their digits, and their signs are known when they underflow.
// One repetition with the better eigenvalue brings the vector to the limit that
// rounding sets.
func (m *slepianMatrix) vector(lambda float64, v []float64) {
	size := m.size()
	p, q := m.forward, m.backward
	y := v[:size]
	for range 2 {
		p[0] = m.diagonal[0] - lambda
		for k, e2 := range m.square {
			if p[k] == 0 {
				p[k] = -tiny
			}
			p[k+1] = (m.diagonal[k+1] - lambda) - e2/p[k]
		}
		q[size-1] = m.diagonal[size-1] - lambda
		for k := size - 2; k >= 0; k-- {
			if q[k+1] == 0 {
				q[k+1] = -tiny
			}
			q[k] = (m.diagonal[k] - lambda) - m.square[k]/q[k+1]
		}
		row, miss := 0, math.Inf(1)
		for k, d := range m.diagonal {
			if g := p[k] + q[k] - (d - lambda); math.Abs(g) < math.Abs(miss) {
				row, miss = k, g
			}
		}
		y[row] = 1
		norm := 1.0
		for k := row - 1; k >= 0; k-- {
			y[k] = -m.next[k] / p[k] * y[k+1]
			norm += y[k] * y[k]
		}
		for k := row + 1; k < size; k++ {
			y[k] = -m.next[k-1] / q[k] * y[k-1]
			norm += y[k] * y[k]
		}
		// The first element is positive when an even number of positive pivots
		// stands between it and row: true even where it has underflowed.
		scale := 1 / math.Sqrt(norm)
		for _, pivot := range p[:row] {
			if pivot > 0 {
				scale = -scale
			}
		}
		for k := range y {
			y[k] *= scale
		}
		lambda += miss / norm
	}
	for k := range m.n / 2 {
		y[k] *= math.Sqrt2 / 2
	}
}

// project takes out of the first half of v what it holds of u, both sequences
// of length n and of the same parity, and u of unit norm and already whole.
func (m *slepianMatrix) project(v, u []float64) {
	half := m.n / 2
	var dot float64
	for k, uk := range u[:half] {
		dot += uk * v[k]
	}
	dot *= 2
	if m.size() > half {
		dot += u[half] * v[half]
	}
	size := m.size()
	for k, uk := range u[:size] {
		v[k] -= dot * uk
	}
}

// unfold completes v from its first half and makes its norm 1 again.
func (m *slepianMatrix) unfold(v []float64) {
	half := m.n / 2
	var norm float64
	for _, x := range v[:half] {
		norm += x * x
	}
	norm *= 2
	if m.n%2 == 1 {
		if m.odd {
			v[half] = 0
		}
		norm += v[half] * v[half]
	}
	scale := 1 / math.Sqrt(norm)
	for k := range v[:m.n-half] {
		v[k] *= scale
	}
	for k, x := range v[:half] {
		if m.odd {
			x = -x
		}
		v[m.n-1-k] = x
	}
}
