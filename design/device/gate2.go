package device

import "math"

// Gate2 gives a named gate on two sites, 4 by 4, the first site slower; ok is false for another name. CNOT turns the second site when the first is
// |1>. iSWAP is exp(i pi/4 (XX + YY)), which takes |01> to i|10>, and sqrt-iSWAP its root exp(i pi/8 (XX + YY)); the exchange J (XX + YY)/2 with
// J > 0 makes their inverses, which are these up to half turns about Z of one site before and after. sqrt-SWAP is the root of SWAP that gives the singlet the phase i.
func Gate2(name string) (m Matrix, ok bool) {
	// block gives the gate that leaves |00> and |11> alone and acts on |01>, |10> by [[a, b], [b, a]].
	block := func(a, b complex128) Matrix {
		return FromRows([][]complex128{{1, 0, 0, 0}, {0, a, b, 0}, {0, b, a, 0}, {0, 0, 0, 1}})
	}
	switch name {
	case "CNOT":
		x, _ := Operator("X")
		return Controlled(x), true
	case "CZ":
		z, _ := Operator("Z")
		return Controlled(z), true
	case "SWAP":
		return block(0, 1), true
	case "iSWAP":
		return block(0, 1i), true
	case "sqrt-iSWAP":
		const r = math.Sqrt2 / 2
		return block(r, complex(0, r)), true
	case "sqrt-SWAP":
		return block(0.5+0.5i, 0.5-0.5i), true
	case "identity":
		return Identity(4), true
	}
	return Matrix{}, false
}

// Gate2Names lists the names that Gate2 knows.
func Gate2Names() []string {
	return []string{"CNOT", "CZ", "SWAP", "iSWAP", "sqrt-iSWAP", "sqrt-SWAP", "identity"}
}

// Controlled gives diag(1, u): u on the other sites when one more, the slowest, is |1>.
func Controlled(u Matrix) Matrix {
	n := 2 * u.N
	m := Identity(n)
	for i := range u.N {
		copy(m.Data[(u.N+i)*n+u.N:(u.N+i+1)*n], u.Data[i*u.N:(i+1)*u.N])
	}
	return m
}

// Invariants gives what rotations of single sites before and after leave of a 4 by 4 unitary u (Makhlin 2002, Quantum Inf. Process. 1, 243):
// with m the matrix in a basis of maximally entangled states,
//
//	G1 = Tr^2(m^T m) / (16 det u),    G2 = (Tr^2(m^T m) - Tr (m^T m)^2) / (4 det u).
//
// Two gates are one up to such rotations and a phase if and only if they agree in both. The identity has 1 and 3, CNOT and CZ 0 and 1, SWAP -1
// and -3, iSWAP 0 and -1, sqrt-iSWAP 1/4 and 1, sqrt-SWAP -i/4 and 0 and its inverse i/4 and 0.
func Invariants(m Matrix) (g1 complex128, g2 float64) {
	const r = math.Sqrt2 / 2
	q := FromRows([][]complex128{{r, 0, 0, 1i * r}, {0, 1i * r, r, 0}, {0, 1i * r, -r, 0}, {r, 0, 0, -1i * r}})
	b := q.Adjoint().Mul(m).Mul(q)
	t := Zero(4)
	for i := range 4 {
		for j := range 4 {
			t.Data[j*4+i] = b.Data[i*4+j]
		}
	}
	p := t.Mul(b)
	trace, det := p.Trace(), determinant(m)
	return trace * trace / (16 * det), real((trace*trace - p.Mul(p).Trace()) / (4 * det))
}

// determinant gives the determinant of a unitary matrix, by elimination with column pivots.
func determinant(m Matrix) complex128 {
	n := m.N
	a := m.Scale(1)
	det := complex128(1)
	for k := range n {
		p := k
		for i := k + 1; i < n; i++ {
			if size(a.Data[i*n+k]) > size(a.Data[p*n+k]) {
				p = i
			}
		}
		if a.Data[p*n+k] == 0 {
			return 0
		}
		if p != k {
			det = -det
			for j := range n {
				a.Data[p*n+j], a.Data[k*n+j] = a.Data[k*n+j], a.Data[p*n+j]
			}
		}
		det *= a.Data[k*n+k]
		for i := k + 1; i < n; i++ {
			f := a.Data[i*n+k] / a.Data[k*n+k]
			for j := k; j < n; j++ {
				a.Data[i*n+j] -= f * a.Data[k*n+j]
			}
		}
	}
	return det
}

func size(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

// Unitary gives the unitary matrix nearest to m; defect is || m'm - 1 || in the Frobenius norm, and ok is false where that exceeds
// UnitaryTolerance. The global phase stays.
func Unitary(m Matrix) (u Matrix, defect float64, ok bool) {
	one := Identity(m.N)
	defect = m.Adjoint().Mul(m).Add(-1, one).Norm()
	if !(defect <= UnitaryTolerance) {
		return m, defect, false
	}
	u = m
	for range 2 { // u (3 - u'u)/2 squares the defect
		u = u.Mul(one.Scale(3).Add(-1, u.Adjoint().Mul(u))).Scale(0.5)
	}
	return u, defect, true
}
