package device

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// Each gate by what it does to |00>, |01>, |10>, |11>; roots by their squares.
func TestGate2(t *testing.T) {
	want := map[string][][]complex128{ // rows: where each state goes
		"CNOT":     {{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 0, 1}, {0, 0, 1, 0}},
		"CZ":       {{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 1, 0}, {0, 0, 0, -1}},
		"SWAP":     {{1, 0, 0, 0}, {0, 0, 1, 0}, {0, 1, 0, 0}, {0, 0, 0, 1}},
		"iSWAP":    {{1, 0, 0, 0}, {0, 0, 1i, 0}, {0, 1i, 0, 0}, {0, 0, 0, 1}},
		"identity": {{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 1, 0}, {0, 0, 0, 1}},
	}
	roots := map[string]string{"sqrt-iSWAP": "iSWAP", "sqrt-SWAP": "SWAP"}
	if len(want)+len(roots) != len(Gate2Names()) {
		t.Errorf("%d gates", len(Gate2Names()))
	}
	for _, name := range Gate2Names() {
		m, ok := Gate2(name)
		if !ok || !near(m.Adjoint().Mul(m), Identity(4), 1e-15) {
			t.Errorf("%s is %v, %v", name, m, ok)
		}
		square := m
		w := want[name]
		if root := roots[name]; root != "" {
			square, w = m.Mul(m), want[root]
			if !(math.Abs(real(m.At(1, 1))) > 0.1) || m.At(0, 0) != 1 {
				t.Errorf("%s is %v", name, m)
			}
		}
		for from := range 4 {
			for to := range 4 {
				if got := square.At(to, from); !(cmplx.Abs(got-w[from][to]) <= 1e-15) {
					t.Errorf("%s takes state %d to %v of state %d", name, from, got, to)
				}
			}
		}
	}
	if _, ok := Gate2("cnot"); ok {
		t.Error("a gate cnot")
	}
	// sqrt-iSWAP = exp(i pi/8 (XX + YY)) and sqrt-SWAP: the singlet goes to i times itself.
	m, _ := Gate2("sqrt-iSWAP")
	if !(cmplx.Abs(m.At(1, 2)-complex(0, math.Sin(math.Pi/4))) <= 1e-15) {
		t.Errorf("sqrt-iSWAP %v", m)
	}
	if m, _ = Gate2("sqrt-SWAP"); m.At(1, 1)-m.At(1, 2) != 1i {
		t.Errorf("sqrt-SWAP %v", m)
	}
	// The exchange makes the inverse of iSWAP after a quarter of its period, and a half turn about Z before and after makes that an iSWAP.
	d := &Device{Sites: []Site{{Name: "a", Levels: 2}, {Name: "b", Levels: 2}}, Couplings: []Coupling{{Kind: Exchange, Sites: []string{"a", "b"}, Strength: 1}}}
	h := d.Static()
	u := Identity(4).Add(-1i*1, h).Add(-1, h.Mul(h)) // exp(-i pi/2 h) with h^3 = h
	z, _ := Operator("Z")
	around := d.Embed(map[int]Matrix{0: z})
	iswap, _ := Gate2("iSWAP")
	if !near(u, iswap.Adjoint(), 1e-15) || !near(around.Mul(u).Mul(around), iswap, 1e-15) {
		t.Errorf("exchange makes %v", u)
	}
}

func TestControlled(t *testing.T) {
	u := randomMatrix(rand.New(rand.NewPCG(1, 2)), 3)
	m := Controlled(u)
	for i := range 6 {
		for j := range 6 {
			want := complex128(0)
			switch {
			case i >= 3 && j >= 3:
				want = u.At(i-3, j-3)
			case i == j:
				want = 1
			}
			if m.At(i, j) != want {
				t.Errorf("entry %d, %d is %v, want %v", i, j, m.At(i, j), want)
			}
		}
	}
	x, _ := Operator("X")
	// Twice controlled: |11> alone turns the last.
	toffoli := Controlled(Controlled(x))
	for from := range 8 {
		to := from
		if from >= 6 {
			to = from ^ 1
		}
		if toffoli.At(to, from) != 1 {
			t.Errorf("state %d goes elsewhere", from)
		}
	}
}

func randomRotation(r *rand.Rand) Matrix {
	n := [3]float64{r.NormFloat64(), r.NormFloat64(), r.NormFloat64()}
	l := math.Hypot(math.Hypot(n[0], n[1]), n[2])
	return Rotation([3]float64{n[0] / l, n[1] / l, n[2] / l}, 6*r.Float64()).Scale(cmplx.Rect(1, 6*r.Float64()))
}

// The table of Makhlin 2002 (Quantum Inf. Process. 1, 243; from memory; of the roots of SWAP the sign by the eigenvalues 1, 1, 1, i and the formula), and invariance under rotations of single sites and phases.
func TestInvariants(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	for name, want := range map[string]struct {
		g1 complex128
		g2 float64
	}{
		"identity": {1, 3}, "CNOT": {0, 1}, "CZ": {0, 1}, "SWAP": {-1, -3}, "iSWAP": {0, -1}, "sqrt-iSWAP": {0.25, 1}, "sqrt-SWAP": {-0.25i, 0},
	} {
		m, _ := Gate2(name)
		for k := range 20 {
			g1, g2 := Invariants(m)
			if !(cmplx.Abs(g1-want.g1) <= 1e-14) || !(math.Abs(g2-want.g2) <= 1e-14) {
				t.Errorf("%s, round %d: %v and %v, want %v and %v", name, k, g1, g2, want.g1, want.g2)
			}
			m, _ = Gate2(name)
			m = Kron(randomRotation(r), randomRotation(r)).Mul(m).Mul(Kron(randomRotation(r), randomRotation(r)))
		}
	}
	// The other root of SWAP is another gate.
	m, _ := Gate2("sqrt-SWAP")
	if g1, _ := Invariants(m.Adjoint()); !(cmplx.Abs(g1-0.25i) <= 1e-14) {
		t.Errorf("inverse of sqrt-SWAP: %v", g1)
	}
}

// Nearest to what was typed: a unitary, no farther from it than the one that it was made from, with the phase that it had; and nothing for a matrix that is none.
func TestUnitary(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	for range 50 {
		exact := Kron(randomRotation(r), Kron(randomRotation(r), randomRotation(r)))
		typed := exact.Add(1e-8, randomMatrix(r, 8))
		u, defect, ok := Unitary(typed)
		if !ok || !(defect > 0) || !near(u.Adjoint().Mul(u), Identity(8), 1e-14) || !(typed.Add(-1, u).Norm() <= typed.Add(-1, exact).Norm()) {
			t.Fatalf("defect %g, left %g", defect, u.Adjoint().Mul(u).Add(-1, Identity(8)).Norm())
		}
		// u'm of the nearest one has no anti-Hermitian part.
		p := u.Adjoint().Mul(typed)
		if !near(p, p.Adjoint(), 1e-14) {
			t.Fatalf("not the nearest: %g", p.Add(-1, p.Adjoint()).Norm())
		}
	}
	for _, m := range []Matrix{Zero(4), Identity(4).Scale(1 + 1e-6), Identity(4).Add(1e-3, randomMatrix(r, 4))} {
		if _, _, ok := Unitary(m); ok {
			t.Errorf("%v taken for unitary", m)
		}
	}
}
