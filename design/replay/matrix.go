package replay

import (
	"math"
	"math/cmplx"
)

// Small dense matrices, row-major, n x n. Destinations never alias sources.

// mul sets dst = a b.
func mul(dst, a, b []complex128, n int) {
	for i := range n {
		for j := range n {
			var s complex128
			for k := range n {
				s += a[i*n+k] * b[k*n+j]
			}
			dst[i*n+j] = s
		}
	}
}

// mulAdjointLeft sets dst = a' b.
func mulAdjointLeft(dst, a, b []complex128, n int) {
	for i := range n {
		for j := range n {
			var s complex128
			for k := range n {
				s += cmplx.Conj(a[k*n+i]) * b[k*n+j]
			}
			dst[i*n+j] = s
		}
	}
}

// mulAdjointRight sets dst = a b'.
func mulAdjointRight(dst, a, b []complex128, n int) {
	for i := range n {
		for j := range n {
			var s complex128
			for k := range n {
				s += a[i*n+k] * cmplx.Conj(b[j*n+k])
			}
			dst[i*n+j] = s
		}
	}
}

func setIdentity(m []complex128, n int) {
	clear(m)
	for i := range n {
		m[i*n+i] = 1
	}
}

func dropTrace(m []complex128, n int) {
	var t complex128
	for i := range n {
		t += m[i*n+i]
	}
	t /= complex(float64(n), 0)
	for i := range n {
		m[i*n+i] -= t
	}
}

func square(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

func frobenius(m []complex128) float64 {
	s := 0.0
	for _, v := range m {
		s += square(v)
	}
	return math.Sqrt(s)
}

// inner gives Re Tr a'b.
func inner(a, b []complex128) float64 {
	s := 0.0
	for i, v := range a {
		s += real(v)*real(b[i]) + imag(v)*imag(b[i])
	}
	return s
}

// operatorNorm bounds the largest singular value of a Hermitian matrix by the smaller of its Frobenius norm and its
// largest row sum; for Pauli operators the latter is exact.
func operatorNorm(m []complex128, n int) float64 {
	rows := 0.0
	for i := range n {
		s := 0.0
		for j := range n {
			s += cmplx.Abs(m[i*n+j])
		}
		rows = math.Max(rows, s)
	}
	return math.Min(rows, frobenius(m))
}

// cut sets dst to the block of the full n x n matrix m on the code space, without its trace.
func cut(dst, m []complex128, n int, code []int) {
	d := len(code)
	for i, a := range code {
		for j, b := range code {
			dst[i*d+j] = m[a*n+b]
		}
	}
	dropTrace(dst, d)
}

// multiply sets dst = a b, of m x n and n x p elements.
func multiply(dst, a, b []complex128, m, n, p int) {
	clear(dst[:m*p])
	for i := range m {
		out := dst[i*p : (i+1)*p]
		for k, f := range a[i*n : (i+1)*n] {
			if f == 0 {
				continue
			}
			for j, v := range b[k*p : (k+1)*p] {
				out[j] += f * v
			}
		}
	}
}

// multiplyAdjoint sets dst = a' b, of n x m and n x p elements.
func multiplyAdjoint(dst, a, b []complex128, m, n, p int) {
	clear(dst[:m*p])
	for k := range n {
		for i, f := range a[k*m : (k+1)*m] {
			f = cmplx.Conj(f)
			out := dst[i*p : (i+1)*p]
			for j, v := range b[k*p : (k+1)*p] {
				out[j] += f * v
			}
		}
	}
}

// kron gives the product of matrices 2 x 2, the first slowest.
func kron(list [][]complex128) []complex128 {
	m, n := []complex128{1}, 1
	for _, u := range list {
		next := make([]complex128, 4*n*n)
		for i := range 2 * n {
			for j := range 2 * n {
				next[i*2*n+j] = m[i/2*n+j/2] * u[i%2*2+j%2]
			}
		}
		m, n = next, 2*n
	}
	return m
}

// nearestUnitary takes away what rounding on paper has done to k recorded columns of n elements that are orthonormal, a unitary matrix where
// k is n: two Newton steps for the polar factor, W -> W (3 - W'W)/2.
func nearestUnitary(w []complex128, n, k int) []complex128 {
	u := append([]complex128(nil), w...)
	g, next := make([]complex128, k*k), make([]complex128, n*k)
	for range 2 {
		multiplyAdjoint(g, u, u, k, n, k)
		for i := range g {
			g[i] *= -0.5
		}
		for i := range k {
			g[i*k+i] += 1.5
		}
		multiply(next, u, g, n, k, k)
		copy(u, next)
	}
	return u
}

// sparse is a matrix as the list of its elements that are not zero.
type sparse struct {
	elements []element
	rows     []int // of a factor to its right that count
}

type element struct {
	i, j int
	v    complex128
}

func sparsely(m []complex128, n int) sparse { return appendSparse(sparse{}, m, n) }

func appendSparse(s sparse, m []complex128, n int) sparse {
	for j := range n {
		some := false
		for i := range n {
			if v := m[i*n+j]; v != 0 {
				s.elements, some = append(s.elements, element{i, j, v}), true
			}
		}
		if some {
			s.rows = append(s.rows, j)
		}
	}
	return s
}
