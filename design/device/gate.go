package device

import (
	"math"
	"math/cmplx"
)

// Operator gives the Pauli matrix "X", "Y" or "Z"; ok is false for another name.
func Operator(name string) (m Matrix, ok bool) {
	switch name {
	case "X":
		return Matrix{2, []complex128{0, 1, 1, 0}}, true
	case "Y":
		return Matrix{2, []complex128{0, -1i, 1i, 0}}, true
	case "Z":
		return Matrix{2, []complex128{1, 0, 0, -1}}, true
	}
	return Matrix{}, false
}

// OperatorNames lists the names that Operator knows.
func OperatorNames() []string { return []string{"X", "Y", "Z"} }

// Gate gives a named gate as a rotation by angle [rad] about a unit axis; ok is false for another name. H is the half turn about
// X+Z, S and T are the quarter and the eighth of a turn about Z, each up to the global phase, which has no meaning here.
func Gate(name string) (axis [3]float64, angle float64, ok bool) {
	x, y, z := [3]float64{1, 0, 0}, [3]float64{0, 1, 0}, [3]float64{0, 0, 1}
	switch name {
	case "identity":
		return z, 0, true
	case "X90":
		return x, math.Pi / 2, true
	case "-X90":
		return x, -math.Pi / 2, true
	case "X180":
		return x, math.Pi, true
	case "Y90":
		return y, math.Pi / 2, true
	case "-Y90":
		return y, -math.Pi / 2, true
	case "Y180":
		return y, math.Pi, true
	case "Z90", "S":
		return z, math.Pi / 2, true
	case "Z180":
		return z, math.Pi, true
	case "H":
		return [3]float64{math.Sqrt2 / 2, 0, math.Sqrt2 / 2}, math.Pi, true
	case "T":
		return z, math.Pi / 4, true
	}
	return axis, 0, false
}

// GateNames lists the names that Gate knows.
func GateNames() []string {
	return []string{"X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T", "identity"}
}

// Rotation gives exp(-i angle/2 (n.sigma)) = cos(angle/2) - i sin(angle/2) (n.sigma), with the angle in rad and n a unit axis.
func Rotation(axis [3]float64, angle float64) Matrix {
	s, c := math.Sincos(angle / 2)
	x, y, z := s*axis[0], s*axis[1], s*axis[2]
	return Matrix{2, []complex128{
		complex(c, -z), complex(-y, -x),
		complex(y, -x), complex(c, z),
	}}
}

// UnitaryTolerance is how far, in the Frobenius norm of m'm - 1, a matrix that a person has typed may be from unitary:
// entries of eight digits are well inside, entries of four are not. AxisAngle removes what is left.
const UnitaryTolerance = 1e-6

// AxisAngle reads a 2 by 2 unitary as a rotation: m = e^{i phase} exp(-i angle/2 (n.sigma)), with the angle in rad from 0 to pi.
// It gives the rotation nearest to m; defect is || m'm - 1 || in the Frobenius norm, and ok is false where that exceeds
// UnitaryTolerance, or m is not 2 by 2. No turn at all has the axis Z, and the axis of a half turn, of which the sign has no meaning,
// has its first component that is not zero positive.
func AxisAngle(m Matrix) (axis [3]float64, angle, defect float64, ok bool) {
	if m.N != 2 {
		return axis, 0, math.Inf(1), false
	}
	defect = m.Adjoint().Mul(m).Add(-1, Identity(2)).Norm()
	if !(defect <= UnitaryTolerance) {
		return axis, 0, defect, false
	}
	// Without its phase, sqrt(det m), the matrix is q0 - i q.sigma up to a sign.
	phase := cmplx.Sqrt(m.At(0, 0)*m.At(1, 1) - m.At(0, 1)*m.At(1, 0))
	a, b, c, d := m.At(0, 0)/phase, m.At(0, 1)/phase, m.At(1, 0)/phase, m.At(1, 1)/phase
	q := [4]float64{real(a+d) / 2, -imag(b+c) / 2, real(c-b) / 2, imag(d-a) / 2}
	// Rounding alone must not decide between the two signs of a half turn, nor tilt the axis of no turn.
	const tiny = 1e-12
	sign := 1.0
	for _, v := range q {
		if math.Abs(v) > tiny {
			sign = math.Copysign(1, v)
			break
		}
	}
	sine := math.Hypot(math.Hypot(q[1], q[2]), q[3])
	if sine <= tiny {
		return [3]float64{0, 0, 1}, 0, defect, true
	}
	for i := range axis {
		if axis[i] = sign * q[i+1] / sine; math.Abs(axis[i]) <= tiny {
			axis[i] = 0 // and not -0
		}
	}
	return axis, 2 * math.Atan2(sine, math.Abs(q[0])), defect, true
}
