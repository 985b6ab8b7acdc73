package robust

import (
	"math"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
)

// Maps of every sort: a gentle one, one that bends everywhere, and one that is flat at rest.
func cubic(s float64) (value, slope, curvature float64) {
	return s + 0.2*s*s - 0.05*s*s*s, 1 + 0.4*s - 0.15*s*s, 0.4 - 0.3*s
}

func wave3(s float64) (value, slope, curvature float64) {
	sin, cos := math.Sincos(1.3*s + 0.4)
	return sin - math.Sin(0.4), 1.3 * cos, -1.69 * sin
}

func folded(s float64) (value, slope, curvature float64) {
	return 1 - math.Cos(s), math.Sin(s), math.Cos(s)
}

// mappedToo adds, to each problem, those of the same with maps of one control and of all.
func mappedToo(list map[string]Levels) map[string]Levels {
	all := map[string]Levels{}
	for name, s := range list {
		all[name] = s
		s.Maps = []Map{nil, nil, wave3}
		all[name+", one map"] = s
		s.Maps = []Map{cubic, wave3, folded}
		all[name+", maps"] = s
	}
	return all
}

// mapsOn is a spin with maps of both controls, which are constant in every step, and errors of every kind that rides on them; the last is of a line.
func mapsOn(rng *rand.Rand, a axisKind) (x slow, shares []float64, line []float64) {
	held := []Class{detuning, amplitude, {Kind: Mixed, Mix: [][]float64{{0, -1}, {0.4, 0}}, Weight: 1, Size: 0.04}, {Kind: Line, Weight: 1, Size: 0.05}}
	spin := spinOn(a, held)
	spin.Maps = []Map{wave3, cubic}
	n := len(a.grid.Steps)
	x = slow{spin: spin}
	for i := range 2 * n {
		shares, line = append(shares, 1.5*rng.NormFloat64()), append(line, rng.NormFloat64())
		value, _, _ := spin.Maps[i/n](shares[i])
		x.u = append(x.u, value)
	}
	return x, shares, line
}

// added is what an error adds to the shares per λ, by its definition.
func added(c Class, shares, line []float64) []float64 {
	n := len(shares) / 2
	w := make([]float64, len(shares))
	for i := range w {
		switch c.Kind {
		case Amplitude:
			w[i] = shares[i]
		case Mixed:
			w[i] = c.Mix[i/n][0]*shares[i%n] + c.Mix[i/n][1]*shares[n+i%n]
		case Line:
			w[i] = line[i]
		}
	}
	return w
}

func twice(list []float64) (nodes []float64) {
	for _, v := range list {
		nodes = append(nodes, v, v)
	}
	return nodes
}

// TestMappedFigures compares a spin of mapped controls, of one kernel and of the other, with the slow writing-out of
// the definitions: an error moves what arrives, so that to first order the control is moved by the slope times that, and of finite errors
// by what the map makes of it.
func TestMappedFigures(t *testing.T) {
	rng := rand.New(rand.NewPCG(12, 1))
	const tol = 1e-12
	w := matrixOf(target)
	for _, a := range []axisKind{axes()[0], axes()[1], axes()[2]} {
		s, shares, line := mapsOn(rng, a)
		n := len(a.grid.Steps)
		fresh := func() *Gate { return NewGate(s.spin, Response{}, 0) } // nothing is left of an earlier call
		g := fresh()
		u, v := twice(shares), [][]float64{nil, nil, nil, twice(line)}
		f := g.Figures(u, v)
		same := func(what string, got, want float64) {
			t.Helper()
			if !(math.Abs(got-want) <= tol*(1+want)) {
				t.Errorf("%s: %s is %v, want %v", a.name, what, got, want)
			}
		}
		same("infidelity", f.Infidelity, infidelity(w, s.unitary([3]float64{}, 1)))
		same("infidelity at angles of zero", fresh().InfidelityAt(u, 0, 0), infidelity(w, s.unitary([3]float64{}, 1)))
		same("infidelity of a detuning", fresh().Infidelity(u, dynamics.Vec{0.01, 0, 0.02}, 1), infidelity(w, s.unitary([3]float64{0.01, 0, 0.02}, 1)))
		same("susceptibility to detuning", f.Susceptibility[0], s.static(dynamics.Vec{0, 0, 1}))
		moved := func(by float64, add []float64) slow {
			o := slow{spin: s.spin, u: append([]float64(nil), s.u...)}
			for i := range o.u {
				if j := i % n; j >= a.grid.First && j < a.grid.Last {
					o.u[i], _, _ = s.spin.Maps[i/n](shares[i] + by*add[i])
				}
			}
			return o
		}
		same("infidelity of an amplitude", fresh().Infidelity(u, dynamics.Vec{}, 1.07), infidelity(w, moved(0.07, shares).unitary([3]float64{}, 1)))
		free := s.spin // at the angles that are best without the error
		free.FreeBefore, free.FreeAfter = true, true
		best := NewGate(free, Response{}, 0).Figures(u, v)
		same("infidelity at best angles", NewGate(free, Response{}, 0).Infidelity(u, dynamics.Vec{}, 1), best.Infidelity)
		for i, c := range s.spin.Held {
			if c.Kind == Static {
				continue
			}
			add := added(c, shares, line)
			same("susceptibility", f.Susceptibility[i], s.susceptibility(func(j int) matrix {
				var field [3]float64
				for k := range 2 {
					_, slope, _ := s.spin.Maps[k](shares[k*n+j])
					for q := range 3 {
						field[q] += slope * add[k*n+j] * s.spin.Axes[k][q] / 2
					}
				}
				return sigma(field)
			}))
			mean := 0.0
			for _, sign := range []float64{1, -1} {
				mean += infidelity(w, moved(sign*c.Size, add).unitary([3]float64{}, 1)) / 2
			}
			same("mean infidelity", g.MeanInfidelity(u, v, i), mean)
		}
		// the same by the kernel of more levels
		l := levelsOn(2, a, append([]Class(nil), s.spin.Held...))
		st := s.spin.Static
		l.Static = scaledMatrix(sum(scaledMatrix(pauliX, st[0]), scaledMatrix(pauliY, st[1]), scaledMatrix(pauliZ, st[2])), 0.5)
		for k, e := range s.spin.Axes {
			l.Axes[k] = scaledMatrix(sum(scaledMatrix(pauliX, e[0]), scaledMatrix(pauliY, e[1]), scaledMatrix(pauliZ, e[2])), 0.5)
		}
		l.Maps = s.spin.Maps
		h, err := NewLevelsGate(l, Response{}, 0)
		if err != nil {
			t.Fatal(err)
		}
		same("infidelity of levels at no rotations", h.InfidelityAt(u, Rotations{}), f.Infidelity)
		o := h.Figures(u, v)
		same("infidelity of levels", o.Infidelity, f.Infidelity)
		for i := range s.spin.Held {
			if got, want := o.Susceptibility[i], f.Susceptibility[i]; !(math.Abs(got-want) <= 1e-11) {
				t.Errorf("%s: susceptibility %d of levels is %v, want %v", a.name, i, got, want)
			}
			if i > 0 { // of a static error levels measure λ otherwise
				same("mean infidelity of levels", h.MeanInfidelity(u, v, i), g.MeanInfidelity(u, v, i))
			}
		}
	}
}

// TestMappedResiduals ties residuals to figures: of the coefficients of a line that passes on what each step plays, those of a mapped
// spin are its figures; and a map that is straight changes nothing, to the last bit.
func TestMappedResiduals(t *testing.T) {
	rng := rand.New(rand.NewPCG(12, 2))
	for _, a := range []axisKind{axes()[0], axes()[2]} {
		s, shares, line := mapsOn(rng, a)
		r := identity(a.grid)
		r.Slopes = make([][]Block, len(s.spin.Held))
		for i, c := range s.spin.Held {
			if c.Kind == Line { // each step's share times a factor of its own
				n := len(a.grid.Steps)
				re := append([]float64(nil), r.Blocks[0].Re...)
				for j := range n {
					for node := range 2 * n {
						re[j*2*n+node] *= line[j]
					}
				}
				r.Slopes[i] = []Block{{N: n, Quadrature: true, Re: re}}
			}
		}
		g := NewGate(s.spin, r, 0.5)
		res := make([]float64, g.Rows())
		g.Residuals(shares, res)
		n := len(a.grid.Steps)
		add := make([]float64, len(shares))
		for i := range add {
			add[i] = line[i%n] * shares[i]
		}
		u, v := twice(shares), [][]float64{nil, nil, nil, twice(add)}
		f := g.Figures(u, v)
		if got := 2. / 3 * squares(res[:3]); !(math.Abs(got-f.Infidelity) <= 1e-13) {
			t.Errorf("%s: 2/3 of the squared gate residuals is %v, want %v", a.name, got, f.Infidelity)
		}
		at := 3 + 3*len(s.spin.Held)
		for i := range s.spin.Held {
			mean := 0.0
			for range 2 {
				mean += squares(res[at:at+3]) * 2 / 3 / 0.25 / 2
				at += 3
			}
			if got := g.MeanInfidelity(u, v, i); !(math.Abs(got-mean) <= 1e-13) {
				t.Errorf("%s: finite residuals of class %d mean %v, want %v", a.name, i, mean, got)
			}
			size := 0.0 // of what λ adds, relative to full scale
			for j := a.grid.First; j < a.grid.Last; j++ {
				var field dynamics.Vec
				for k := range 2 {
					_, slope, _ := s.spin.Maps[k](shares[k*n+j])
					for q := range 3 {
						field[q] += slope * added(s.spin.Held[i], shares, add)[k*n+j] * s.spin.Axes[k][q] / norm(s.spin.Axes[0])
					}
				}
				size += a.grid.Steps[j] * squares(field[:]) / a.grid.Window()
			}
			if i == 0 {
				size = 1
			}
			if got, want := math.Sqrt(squares(res[3+3*i:6+3*i])), f.Susceptibility[i]*math.Sqrt(size); !(math.Abs(got-want) <= 1e-12*(1+want)) {
				t.Errorf("%s: first-order residuals of class %d have length %v, want %v", a.name, i, got, want)
			}
		}
		straight := func(s float64) (value, slope, curvature float64) { return s, 1, 0 }
		var want []float64
		for _, maps := range [][]Map{nil, {nil, straight}, {straight, straight}} {
			s.spin.Maps = maps
			g := NewGate(s.spin, r, 0.5)
			jac := make([]float64, g.Rows()*g.Dim())
			g.Residuals(shares, res)
			g.Jacobian(jac)
			list := append(append([]float64(nil), res...), jac...)
			if want == nil {
				want = list
			}
			for i, v := range list {
				if !(math.Abs(v-want[i]) <= 1e-14*(1+math.Abs(want[i]))) {
					t.Fatalf("%s, %d maps: entry %d is %v, want %v", a.name, len(maps), i, v, want[i])
				}
			}
		}
	}
}
