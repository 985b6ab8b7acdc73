package robust

import (
	"math"
	"math/cmplx"

	"holdfast/design/dynamics"
)

// This file is the definition, transcribed: 2x2 complex matrices for
// controls that are constant within every step, where a step's propagator has a
// closed form and nothing is expanded. It shares neither quaternions nor
// rotation matrices with the code under test.

type matrix [2][2]complex128

var pauli = [3]matrix{{{0, 1}, {1, 0}}, {{0, -1i}, {1i, 0}}, {{1, 0}, {0, -1}}}

func (a matrix) mul(b matrix) (c matrix) {
	for i := range 2 {
		for j := range 2 {
			c[i][j] = a[i][0]*b[0][j] + a[i][1]*b[1][j]
		}
	}
	return c
}

func (a matrix) adjoint() matrix {
	return matrix{{cmplx.Conj(a[0][0]), cmplx.Conj(a[1][0])}, {cmplx.Conj(a[0][1]), cmplx.Conj(a[1][1])}}
}

func (a matrix) trace() complex128 { return a[0][0] + a[1][1] }

func (a *matrix) add(f float64, b matrix) {
	for i := range 2 {
		for j := range 2 {
			a[i][j] += complex(f, 0) * b[i][j]
		}
	}
}

func (a matrix) norm2() float64 { return real(a.adjoint().mul(a).trace()) }

// sigma is v·σ.
func sigma(v [3]float64) (m matrix) {
	for i := range 3 {
		m.add(v[i], pauli[i])
	}
	return m
}

// evolve is exp(-i t F·σ/2) = cos(|F|t/2) - i sin(|F|t/2) F·σ/|F|.
func evolve(f [3]float64, t float64) matrix {
	size := math.Sqrt(f[0]*f[0] + f[1]*f[1] + f[2]*f[2])
	m := matrix{{1, 0}, {0, 1}}
	if size == 0 {
		return m
	}
	c, s := math.Cos(size*t/2), math.Sin(size*t/2)
	n := sigma(f)
	for i := range 2 {
		for j := range 2 {
			m[i][j] = complex(c, 0)*m[i][j] - complex(0, s/size)*n[i][j]
		}
	}
	return m
}

// slow is what a Spin does under controls that are constant in every step.
type slow struct {
	spin Spin
	u    []float64 // I of every step, then Q of every step
}

// nodes gives the same controls as the code under test wants them.
func (s slow) nodes() []float64 {
	var u []float64
	for _, v := range s.u {
		u = append(u, v, v)
	}
	return u
}

// field is F of step j, H = F·σ/2, with an offset and a scale inside the window.
func (s slow) field(j int, offset [3]float64, scale float64) [3]float64 {
	f := [3]float64(s.spin.Static)
	if j < s.spin.Grid.First || j >= s.spin.Grid.Last {
		offset, scale = [3]float64{}, 1
	}
	n := len(s.spin.Grid.Steps)
	for i := range 3 {
		f[i] += offset[i] + scale*(s.u[j]*s.spin.Axes[0][i]+s.u[n+j]*s.spin.Axes[1][i])
	}
	return f
}

// unitary is the gate in the frame of the undriven device: what the static part
// does before the window's begin and after its end is taken out.
func (s slow) unitary(offset [3]float64, scale float64) matrix {
	u := matrix{{1, 0}, {0, 1}}
	for j, h := range s.spin.Grid.Steps {
		u = evolve(s.field(j, offset, scale), h).mul(u)
	}
	static := [3]float64(s.spin.Static)
	return evolve(static, -s.spin.Grid.Trail).mul(u).mul(evolve(static, -s.spin.Grid.Lead))
}

// infidelity is the average gate infidelity 1 - (Tr M'M + |Tr W'M|²)/(d(d+1)) of
// Pedersen, Moeller, Moelmer 2007, Phys. Lett. A 367, 47.
func infidelity(w, m matrix) float64 {
	tr := cmplx.Abs(w.adjoint().mul(m).trace())
	return 1 - (real(m.adjoint().mul(m).trace())+tr*tr)/6
}

// boole integrates over [0, h] with the closed rule of order 6 on pieces cut
// fine enough for 1e-13.
func boole(h float64, f func(t float64) matrix) (sum matrix) {
	pieces := 4 + int(30*h)
	d := h / float64(pieces)
	for p := range pieces {
		for k, w := range []float64{7, 32, 12, 32, 7} {
			sum.add(w*d/90, f((float64(p)+float64(k)/4)*d))
		}
	}
	return sum
}

// toggled is ∫ U'(t) V(t) U(t) dt over the window, and ∫ ||V||² dt.
func (s slow) toggled(v func(j int) matrix) (sum matrix, size float64) {
	u := matrix{{1, 0}, {0, 1}}
	for j, h := range s.spin.Grid.Steps {
		f := s.field(j, [3]float64{}, 1)
		if j >= s.spin.Grid.First && j < s.spin.Grid.Last {
			sum.add(1, boole(h, func(t float64) matrix {
				ut := evolve(f, t).mul(u)
				return ut.adjoint().mul(v(j)).mul(ut)
			}))
			size += h * v(j).norm2()
		}
		u = evolve(f, h).mul(u)
	}
	return sum, size
}

// susceptibility is ||∫ V_I dt||_F / ( √T (∫ ||V||_F² dt)^½ ).
func (s slow) susceptibility(v func(j int) matrix) float64 {
	a, size := s.toggled(v)
	return math.Sqrt(a.norm2() / (s.spin.Grid.Window() * size))
}

func (s slow) static(v dynamics.Vec) float64 {
	return s.susceptibility(func(int) matrix { return sigma(v) })
}

// borne is the amplitude error's V: the driven part of H.
func (s slow) borne(j int) matrix {
	n := len(s.spin.Grid.Steps)
	var f [3]float64
	for i := range 3 {
		f[i] = (s.u[j]*s.spin.Axes[0][i] + s.u[n+j]*s.spin.Axes[1][i]) / 2
	}
	return sigma(f)
}

// mmap is the averaged map V -> V̄ in the basis σ/√2.
func (s slow) mmap() (m [3][3]float64) {
	for col := range 3 {
		a, _ := s.toggled(func(int) matrix { return pauli[col] })
		for row := range 3 {
			m[row][col] = real(pauli[row].mul(a).trace()) / 2 / s.spin.Grid.Window()
		}
	}
	return m
}

// framePotential is (1/T²) ∫∫ |Tr U'(t) U(s)|² dt ds over the window.
func (s slow) framePotential() float64 {
	type node struct {
		u matrix
		w float64
	}
	var list []node
	u := matrix{{1, 0}, {0, 1}}
	for j, h := range s.spin.Grid.Steps {
		f := s.field(j, [3]float64{}, 1)
		if j >= s.spin.Grid.First && j < s.spin.Grid.Last {
			pieces := 2 + int(8*h)
			d := h / float64(pieces)
			for p := range pieces {
				for k, w := range []float64{7, 32, 12, 32, 7} {
					list = append(list, node{evolve(f, (float64(p)+float64(k)/4)*d).mul(u), w * d / 90})
				}
			}
		}
		u = evolve(f, h).mul(u)
	}
	sum := 0.0
	for _, a := range list {
		for _, b := range list {
			tr := cmplx.Abs(a.u.adjoint().mul(b.u).trace())
			sum += a.w * b.w * tr * tr
		}
	}
	t := s.spin.Grid.Window()
	return sum / (t * t)
}
