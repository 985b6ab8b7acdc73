package device

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

func TestMatrix(t *testing.T) {
	a := FromRows([][]complex128{{1, 2i}, {3, 4 + 1i}})
	b := FromRows([][]complex128{{0, 1}, {-1i, 2}})
	if got, want := a.Mul(b), (Matrix{2, []complex128{2, 1 + 4i, 1 - 4i, 11 + 2i}}); !near(got, want, 0) {
		t.Errorf("product %v, want %v", got, want)
	}
	if got, want := a.Adjoint(), (Matrix{2, []complex128{1, 3, -2i, 4 - 1i}}); !near(got, want, 0) {
		t.Errorf("adjoint %v, want %v", got, want)
	}
	if got, want := a.Scale(2i), (Matrix{2, []complex128{2i, -4, 6i, 8i - 2}}); !near(got, want, 0) {
		t.Errorf("scaled %v, want %v", got, want)
	}
	if a.Trace() != 5+1i || a.At(1, 0) != 3 {
		t.Errorf("trace %v, entry %v", a.Trace(), a.At(1, 0))
	}
	if got, want := a.Norm(), math.Sqrt(1+4+9+17); !(math.Abs(got-want) <= 1e-15*want) {
		t.Errorf("norm %v, want %v", got, want)
	}
	defer func() {
		if recover() == nil {
			t.Error("matrices of different size were added")
		}
	}()
	a.Add(1, Identity(3))
}

// Pauli matrices: each is its own inverse, and X Y = i Z in every cyclic order.
func TestOperator(t *testing.T) {
	names := OperatorNames()
	for i := range names {
		a, ok := Operator(names[i])
		b, _ := Operator(names[(i+1)%3])
		c, _ := Operator(names[(i+2)%3])
		if !ok || !near(a.Mul(a), Identity(2), 0) || !near(a.Mul(b), c.Scale(1i), 0) || !near(a, a.Adjoint(), 0) {
			t.Errorf("operator %s", names[i])
		}
	}
	if z, _ := Operator("Z"); z.At(0, 0) != 1 {
		t.Error("|0> is the +1 state of Z")
	}
	if _, ok := Operator("x"); ok {
		t.Error("an operator x")
	}
}

// Each gate by what it does: the Bloch vectors to which it takes X and Z (textbook definitions; a turn about n by the right hand).
func TestGate(t *testing.T) {
	r := math.Sqrt2 / 2
	want := map[string][2][3]float64{
		"identity": {{1, 0, 0}, {0, 0, 1}},
		"X90":      {{1, 0, 0}, {0, -1, 0}}, "-X90": {{1, 0, 0}, {0, 1, 0}}, "X180": {{1, 0, 0}, {0, 0, -1}},
		"Y90": {{0, 0, -1}, {1, 0, 0}}, "-Y90": {{0, 0, 1}, {-1, 0, 0}}, "Y180": {{-1, 0, 0}, {0, 0, -1}},
		"Z90": {{0, 1, 0}, {0, 0, 1}}, "Z180": {{-1, 0, 0}, {0, 0, 1}}, "S": {{0, 1, 0}, {0, 0, 1}}, "T": {{r, r, 0}, {0, 0, 1}},
		"H": {{0, 0, 1}, {1, 0, 0}},
	}
	if len(want) != len(GateNames()) {
		t.Errorf("%d gates, %d tested", len(GateNames()), len(want))
	}
	for _, name := range GateNames() {
		axis, angle, ok := Gate(name)
		if !ok {
			t.Errorf("%s is listed and not known", name)
		}
		u := Rotation(axis, angle)
		for i, from := range []string{"X", "Z"} {
			p, _ := Operator(from)
			image := u.Mul(p).Mul(u.Adjoint())
			for j, to := range OperatorNames() {
				q, _ := Operator(to)
				if got := real(image.Mul(q).Trace()) / 2; !(math.Abs(got-want[name][i][j]) <= 1e-15) {
					t.Errorf("%s takes %s to a %s part of %v, want %v", name, from, to, got, want[name][i][j])
				}
			}
		}
	}
	if _, _, ok := Gate("x90"); ok {
		t.Error("a gate x90")
	}
	// X90 entry by entry: exp(-i pi/4 X).
	axis, angle, _ := Gate("X90")
	if got, want := Rotation(axis, angle), FromRows([][]complex128{{complex(r, 0), complex(0, -r)}, {complex(0, -r), complex(r, 0)}}); !near(got, want, 1e-15) {
		t.Errorf("X90 = %v", got)
	}
}

func TestAxisAngle(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	for range 1000 {
		n := [3]float64{random.NormFloat64(), random.NormFloat64(), random.NormFloat64()}
		norm := math.Hypot(math.Hypot(n[0], n[1]), n[2])
		for i := range n {
			n[i] /= norm
		}
		angle := 4 * math.Pi * (2*random.Float64() - 1)
		m := Rotation(n, angle).Scale(cmplx.Rect(1, 2*math.Pi*random.Float64()))
		axis, turned, defect, ok := AxisAngle(m)
		if !ok || !(defect <= 1e-14) || !(turned >= 0 && turned <= math.Pi+1e-15) {
			t.Fatalf("angle %v, defect %v, %v", turned, defect, ok)
		}
		// The same gate: |Tr W'M| = 2, here by the distance of W'M from a multiple of the identity.
		p := Rotation(axis, turned).Adjoint().Mul(m)
		if !near(p, Identity(2).Scale(p.Trace()/2), 1e-14) {
			t.Fatalf("turn by %v about %v read as %v about %v", angle, n, turned, axis)
		}
	}
	// The cases whose axis is a matter of convention, with each sign of the phase.
	for _, phase := range []complex128{1, -1, 1i, -1i} {
		if axis, angle, _, ok := AxisAngle(Identity(2).Scale(phase)); !ok || angle != 0 || axis != [3]float64{0, 0, 1} {
			t.Errorf("identity: %v about %v", angle, axis)
		}
		for i, name := range OperatorNames() {
			m, _ := Operator(name)
			axis, angle, _, ok := AxisAngle(m.Scale(phase))
			if !ok || !(math.Abs(angle-math.Pi) <= 1e-15) || !(math.Abs(axis[i]-1) <= 1e-15) {
				t.Errorf("%s: %v about %v", name, angle, axis)
			}
			quarter, _, _, _ := AxisAngle(Rotation(axis, math.Pi/2).Scale(phase))
			for _, v := range append(axis[:], quarter[:]...) {
				if v == 0 && math.Signbit(v) {
					t.Errorf("%s: an axis with -0, %v or %v", name, axis, quarter)
				}
			}
		}
	}
	// Typed with eight digits it is the gate; with four it is refused.
	if _, angle, defect, ok := AxisAngle(FromRows([][]complex128{{0.70710678, -0.70710678i}, {-0.70710678i, 0.70710678}})); !ok || !(math.Abs(angle-math.Pi/2) <= 1e-15) {
		t.Errorf("eight digits: %v, %v, %v", angle, defect, ok)
	}
	for _, m := range []Matrix{FromRows([][]complex128{{0.7071, -0.7071i}, {-0.7071i, 0.7071}}), Zero(2), Identity(2).Scale(1 + 1e-6), Identity(3), FromRows([][]complex128{{1, 1}, {0, 1}})} {
		if _, _, _, ok := AxisAngle(m); ok {
			t.Errorf("%v taken for a rotation", m)
		}
	}
}
