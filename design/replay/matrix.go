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

// nearestUnitary takes away what rounding on paper has done to a recorded unitary matrix: two Newton steps for the
// polar factor, W -> W (3 - W'W)/2.
func nearestUnitary(w []complex128, n int) []complex128 {
	u := append([]complex128(nil), w...)
	g, next := make([]complex128, n*n), make([]complex128, n*n)
	for range 2 {
		mulAdjointLeft(g, u, u, n)
		for i := range g {
			g[i] *= -0.5
		}
		for i := range n {
			g[i*n+i] += 1.5
		}
		mul(next, u, g, n)
		copy(u, next)
	}
	return u
}

// sparse is a matrix as the list of its elements that are not zero.
type sparse []struct {
	i, j int
	v    complex128
}

func sparsely(m []complex128, n int) sparse { return appendSparse(nil, m, n) }

func appendSparse(s sparse, m []complex128, n int) sparse {
	for i := range n {
		for j := range n {
			if v := m[i*n+j]; v != 0 {
				s = append(s, struct {
					i, j int
					v    complex128
				}{i, j, v})
			}
		}
	}
	return s
}
