package dynamics

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// smooth returns controls of a smooth drive sampled at the nodes of n equal
// steps over T ns: two quadratures built from a few harmonics.
func smooth(n int, T float64) (u []float64, steps []float64) {
	var v []float64
	h := T / float64(n)
	for j := range n {
		steps = append(steps, h)
		for _, g := range GaussNodes {
			t := (float64(j) + g) * h / T
			u = append(u, 1.1*math.Sin(math.Pi*t)+0.7*math.Sin(3*math.Pi*t)-0.3*math.Cos(5*t))
			v = append(v, 0.9*math.Sin(2*math.Pi*t)+0.2-0.4*math.Cos(4*t))
		}
	}
	return append(u, v...), steps
}

func spinOn(steps []float64) *Spin {
	s := &Spin{
		Static: Vec{0.02, -0.01, 0.11},
		Axes:   []Vec{{0.25, 0, 0.01}, {0.02, 0.24, 0}},
		Steps:  steps, First: 0, Last: len(steps),
		Held: []Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}, {0.3, -0.5, 0.2}},
	}
	return s
}

// bear gives the spin two control-borne errors of the controls u: all of them, and
// the first alone; and readies it.
func bear(s *Spin, u []float64) *Spin {
	first := make([]float64, len(u))
	copy(first, u[:len(u)/2])
	s.Borne = [][]float64{u, first}
	s.Reset()
	return s
}

// slowSpin is the definition, transcribed: the field as a function of time,
// midpoint rotations in very many steps, and the toggled integral of the error
// summed at the midpoints (Richardson extrapolation in the caller).
func slowSpin(n int, T float64, s *Spin) (Quat, []Vec) {
	h := T / float64(n)
	q := One
	tog := make([]Vec, len(s.Toggle))
	for j := range n {
		t := (float64(j) + 0.5) / float64(n)
		u := []float64{
			1.1*math.Sin(math.Pi*t) + 0.7*math.Sin(3*math.Pi*t) - 0.3*math.Cos(5*t),
			0.9*math.Sin(2*math.Pi*t) + 0.2 - 0.4*math.Cos(4*t)}
		f := s.Static
		for k, e := range s.Axes {
			for i := range 3 {
				f[i] += u[k] * e[i]
			}
		}
		half := Turn(Vec{f[0] * h / 2, f[1] * h / 2, f[2] * h / 2})
		mid := half.Mul(q).Conj().Rotation()
		for i, v := range s.Held {
			x := mid.Apply(v)
			for c := range 3 {
				tog[i][c] += h * x[c]
			}
		}
		for i, gains := range [][]float64{{1, 1}, {1, 0}} {
			var v Vec
			for k, e := range s.Axes {
				for c := range 3 {
					v[c] += gains[k] * u[k] * e[c]
				}
			}
			x := mid.Apply(v)
			for c := range 3 {
				tog[len(s.Held)+i][c] += h * x[c]
			}
		}
		q = half.Mul(half.Mul(q))
	}
	return q, tog
}

func TestOrderFour(t *testing.T) {
	const T = 12.0
	ref := bear(spinOn(make([]float64, 4)), make([]float64, 16))
	q1, t1 := slowSpin(20000, T, ref)
	q2, t2 := slowSpin(40000, T, ref)
	var gate Quat
	tog := make([]Vec, len(t1))
	for i := range gate {
		gate[i] = (4*q2[i] - q1[i]) / 3
	}
	for e := range tog {
		for i := range 3 {
			tog[e][i] = (4*t2[e][i] - t1[e][i]) / 3
		}
	}
	var last [2]float64
	for _, n := range []int{12, 24, 48, 96} {
		u, steps := smooth(n, T)
		s := bear(spinOn(steps), u)
		s.Run(u, Vec{})
		var e [2]float64
		for i := range gate {
			e[0] = math.Max(e[0], math.Abs(s.Gate[i]-gate[i]))
		}
		for k := range tog {
			for i := range 3 {
				e[1] = math.Max(e[1], math.Abs(s.Toggle[k][i]-tog[k][i]))
			}
		}
		if n > 24 {
			for k, name := range []string{"gate", "toggled integral"} {
				if order := math.Log2(last[k] / e[k]); !(math.Abs(order-4) <= 0.3) {
					t.Errorf("%s: %d steps: error %.3g, order %.2f, want 4", name, n, e[k], order)
				}
			}
		}
		last = e
	}
	if !(last[0] < 1e-6 && last[1] < 1e-5) {
		t.Errorf("errors at 96 steps: %.3g %.3g", last[0], last[1])
	}
}

func fullTurn(w Vec) turn {
	var t turn
	t.begin(w.vec())
	t.average()
	t.halfway()
	t.slopes()
	return t
}

func TestTurnSeries(t *testing.T) {
	// Either side of the switch from series to closed form: G against its
	// definition ∫ Rᵀ by Simpson, and the slope by w against central differences.
	for _, th := range []float64{0, 1e-9, 1e-3, 0.0999999, 0.1000001, 0.7, 3, 7} {
		w := Vec{th * 2 / 3, -th / 3, th * 2 / 3}
		tu := fullTurn(w)
		const n = 400
		var want Mat
		for k := 0; k <= n; k++ {
			c := 2.0
			if k == 0 || k == n {
				c = 1
			} else if k%2 == 1 {
				c = 4
			}
			s := float64(k) / n
			r := Turn(Vec{w[0] * s, w[1] * s, w[2] * s}).Conj().Rotation()
			for l := range r {
				want[l] += c / (3 * n) * r[l]
			}
		}
		half := Turn(Vec{w[0] / 2, w[1] / 2, w[2] / 2}).Conj().Rotation()
		for l := range want {
			if !(math.Abs(tu.mean[l]-want[l]) <= 1e-8*math.Max(1, th*th)) || !(math.Abs(tu.half[l]-half[l]) <= 1e-14) {
				t.Errorf("θ = %v: G %v want %v; half %v want %v", th, tu.mean, want, tu.half, half)
			}
		}
		v, bow := Vec{0.3, 0.8, -0.2}, Vec{-0.5, 0.1, 0.9}
		var slope Mat
		tu.slope(&slope, 1.7, v.vec(), bow.vec())
		for i := range 3 {
			const e = 1e-4
			p, m := w, w
			p[i] += e
			m[i] -= e
			tp, tm := fullTurn(p), fullTurn(m)
			gp, gm := tp.toggled(1.7, v.vec(), bow.vec()).pub(), tm.toggled(1.7, v.vec(), bow.vec()).pub()
			for l := range 3 {
				if want := (gp[l] - gm[l]) / (2 * e); !(math.Abs(slope[3*l+i]-want) <= 5e-9) {
					t.Errorf("θ = %v: slope[%d][%d] = %v, want %v", th, l, i, slope[3*l+i], want)
				}
			}
		}
	}
}

func TestDerive(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	const n = 9
	u, steps := smooth(n, 5)
	for i := range u {
		u[i] += 0.3 * rng.NormFloat64()
	}
	steps[7], steps[8] = 1.3, 0.2 // unequal steps outside the window
	for _, c := range []struct {
		offset Vec
		shifts []Vec
		toggle bool
	}{{Vec{}, nil, true}, {Vec{0.01, -0.03, 0.02}, nil, false}, {Vec{}, []Vec{{0, 0.01, 0.05}, {0.02, 0, -0.04}}, true}} {
		s := spinOn(steps)
		s.First, s.Last, s.Shifts = 1, 7, c.shifts
		bear(s, u)
		alone := s.Borne[1] // a field of its own; Borne[0] is u itself
		s.Run(u, c.offset)
		q0 := s.Gate
		d := slopes(s, len(u))
		if !c.toggle {
			d.Toggle, d.Direct = nil, nil
		}
		s.Derive(u, d)
		const e = 1e-5
		worst := 0.0
		for i := range u {
			x := u[i]
			u[i] = x + e
			s.Run(u, c.offset)
			dp := q0.Conj().Mul(s.Gate)
			tp := append([]Vec(nil), s.Toggle...)
			u[i] = x - e
			s.Run(u, c.offset)
			dm := q0.Conj().Mul(s.Gate)
			tm := append([]Vec(nil), s.Toggle...)
			u[i] = x
			for k := range 3 {
				// exp(-i δ·σ/2) = 1 - i δ·σ/2: δ is twice the vector part
				worst = math.Max(worst, math.Abs(d.Gate[k][i]-(dp[k+1]-dm[k+1])/e))
			}
			if !c.toggle {
				continue
			}
			for k := range s.Toggle {
				for l := range 3 {
					got := d.Toggle[3*k+l][i]
					if k == len(s.Held) { // u moves the field and the error
						got += d.Direct[l][i]
					}
					worst = math.Max(worst, math.Abs(got-(tp[k][l]-tm[k][l])/(2*e)))
				}
			}
			y, last := alone[i], len(s.Toggle)-1
			alone[i] = y + e
			s.Run(u, c.offset)
			p := s.Toggle[last]
			alone[i] = y - e
			s.Run(u, c.offset)
			m := s.Toggle[last]
			alone[i] = y
			for l := range 3 {
				worst = math.Max(worst, math.Abs(d.Direct[3+l][i]-(p[l]-m[l])/(2*e)))
			}
		}
		if !(worst <= 2e-9) {
			t.Errorf("shifts %v: derivative off by %.3g", c.shifts, worst)
		}
	}
}

func TestRabi(t *testing.T) {
	// Rabi's formula: P1 = Ω²/(Ω²+Δ²) sin²(√(Ω²+Δ²) T/2).
	const O, D, T = 0.21, 0.13, 17.0
	steps := make([]float64, 10)
	u := make([]float64, 20)
	for i := range steps {
		steps[i] = T / 10
	}
	for i := range u {
		u[i] = 1
	}
	s := &Spin{Static: Vec{0, 0, D}, Axes: []Vec{{O, 0, 0}}, Steps: steps, Last: 10}
	s.Reset()
	s.Run(u, Vec{})
	g := math.Hypot(O, D)
	want := O * O / (g * g) * math.Pow(math.Sin(g*T/2), 2)
	if got := s.Gate[1]*s.Gate[1] + s.Gate[2]*s.Gate[2]; !(math.Abs(got-want) <= 1e-14) {
		t.Errorf("P1 = %v, want %v", got, want)
	}
}

func TestNoAllocation(t *testing.T) {
	u, steps := smooth(40, 20)
	s := bear(spinOn(steps), u)
	d := slopes(s, len(u))
	if n := testing.AllocsPerRun(10, func() {
		s.Run(u, Vec{})
		s.Derive(u, d)
	}); n != 0 {
		t.Errorf("%v allocations in Run and Derive", n)
	}
}

func slopes(s *Spin, n int) *Slopes {
	d := &Slopes{}
	for i := range d.Gate {
		d.Gate[i] = make([]float64, n)
	}
	for range 3 * len(s.Toggle) {
		d.Toggle = append(d.Toggle, make([]float64, n))
	}
	for range 3 * len(s.Borne) {
		d.Direct = append(d.Direct, make([]float64, n))
	}
	return d
}

// BenchmarkSpin times a pulse of 96 samples, two steps a sample, as design runs
// it: gate alone, and gate with every toggled error and all derivatives.
func BenchmarkSpin(b *testing.B) {
	u, steps := smooth(192, 96)
	for _, c := range []struct {
		name  string
		held  []Vec
		borne [][]float64
	}{
		{"none", nil, nil},
		{"any", []Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, nil},
		{"any+amplitude", []Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, [][]float64{u}},
	} {
		s := &Spin{Axes: []Vec{{0.25, 0, 0}, {0, 0.25, 0}}, Steps: steps, Last: len(steps), Held: c.held, Borne: c.borne}
		s.Reset()
		d := slopes(s, len(u))
		b.Run(fmt.Sprintf("%s/run", c.name), func(b *testing.B) {
			for b.Loop() {
				s.Run(u, Vec{})
			}
		})
		b.Run(fmt.Sprintf("%s/derive", c.name), func(b *testing.B) {
			for b.Loop() {
				s.Derive(u, d)
			}
		})
	}
}

func TestLandauZener(t *testing.T) {
	// A level crossing swept at rate a, H = (a t Z + D X)/2: a spin that starts in one
	// adiabatic state stays on its diabatic level with probability exp(-π D²/(2a))
	// (Landau 1932, Phys. Z. Sowjetunion 2, 46; Zener 1932, Proc. R. Soc. A 137, 696).
	// Between adiabatic states at ±T the sweep's ends disturb by D a/(a² T²)^{3/2}/2.
	const T, n = 150.0, 60000
	for _, c := range []struct{ a, D float64 }{{1, 0.5}, {1, 1}, {1, 1.6}, {2, 1}} {
		steps := make([]float64, n)
		u := make([]float64, 2*n)
		for j := range steps {
			steps[j] = 2 * T / n
			for k, g := range GaussNodes {
				u[2*j+k] = c.a * (-T + (float64(j)+g)*2*T/n)
			}
		}
		s := &Spin{Static: Vec{c.D, 0, 0}, Axes: []Vec{{0, 0, 1}}, Steps: steps, Last: n}
		s.Reset()
		s.Run(u, Vec{})
		// The Bloch vector of an adiabatic state is along the field, so the state
		// left at the end follows the field at the start turned by R.
		e := math.Hypot(c.D, c.a*T)
		r := s.Gate.Rotation()
		end := r.Apply(Vec{c.D / e, 0, -c.a * T / e})
		// to change from the upper to the lower adiabatic state is to stay on the level
		got := (1 - (end[0]*c.D+end[2]*c.a*T)/e) / 2
		want := math.Exp(-math.Pi * c.D * c.D / (2 * c.a))
		if tol := 4 * c.D / (c.a * c.a * T * T * T); !(math.Abs(got-want) <= tol) {
			t.Errorf("a = %v, D = %v: %v, want %v to %.1g", c.a, c.D, got, want, tol)
		}
	}
}
