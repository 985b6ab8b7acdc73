package device

import (
	"math"
	"math/cmplx"
)

// Matrix is a square complex matrix, row by row: the entry in row i, column j is Data[i*N+j]. The methods that give a matrix
// make a new one and leave their operands alone. They are for set-up, not for inner loops. Operands of one operation must be of
// one size; a difference is a caller's bug and panics.
type Matrix struct {
	N    int
	Data []complex128
}

// Zero gives the n by n matrix of zeros.
func Zero(n int) Matrix { return Matrix{N: n, Data: make([]complex128, n*n)} }

// Identity gives the n by n identity.
func Identity(n int) Matrix {
	m := Zero(n)
	for i := range n {
		m.Data[i*n+i] = 1
	}
	return m
}

// FromRows copies rows, as quantity.Table.Matrix gives them, into a Matrix. They must be square.
func FromRows(rows [][]complex128) Matrix {
	m := Zero(len(rows))
	for i, row := range rows {
		copy(m.Data[i*m.N:(i+1)*m.N], row)
	}
	return m
}

// At gives the entry in row i, column j.
func (m Matrix) At(i, j int) complex128 { return m.Data[i*m.N+j] }

// same panics unless a and b are of one size.
func same(a, b Matrix) {
	if a.N != b.N {
		panic("device: matrices of different size")
	}
}

// Mul gives the product m b.
func (m Matrix) Mul(b Matrix) Matrix {
	same(m, b)
	p := Zero(m.N)
	for i := range m.N {
		for k := range m.N {
			f := m.Data[i*m.N+k]
			for j := range m.N {
				p.Data[i*m.N+j] += f * b.Data[k*m.N+j]
			}
		}
	}
	return p
}

// Add gives m + f b.
func (m Matrix) Add(f complex128, b Matrix) Matrix {
	same(m, b)
	s := Zero(m.N)
	for i := range s.Data {
		s.Data[i] = m.Data[i] + f*b.Data[i]
	}
	return s
}

// Scale gives f m.
func (m Matrix) Scale(f complex128) Matrix { return Zero(m.N).Add(f, m) }

// Adjoint gives the conjugate transpose.
func (m Matrix) Adjoint() Matrix {
	a := Zero(m.N)
	for i := range m.N {
		for j := range m.N {
			a.Data[j*m.N+i] = cmplx.Conj(m.Data[i*m.N+j])
		}
	}
	return a
}

// Trace gives the sum of the diagonal.
func (m Matrix) Trace() complex128 {
	var t complex128
	for i := range m.N {
		t += m.Data[i*m.N+i]
	}
	return t
}

// Norm gives the Frobenius norm, sqrt(Tr m'm).
func (m Matrix) Norm() float64 {
	s := 0.0
	for _, v := range m.Data {
		s = math.Hypot(s, cmplx.Abs(v))
	}
	return s
}
