package robust

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"holdfast/design/dynamics"
)

// Figures say what a gate is worth.
type Figures struct {
	Infidelity float64 // average gate infidelity, at the best free angles
	Leakage    float64 // out of the code space; zero for one spin
	// Before and After are these angles, rad; zero where not free.
	Before, After float64
	Rotations     Rotations // of more levels, at which these figures are
	// Susceptibility of each held class, in order, and of more levels what it moves out of the code space,
	// relative to the whole error.
	Susceptibility []float64
	Leak           []float64
	Noise          []float64 // of each held class, the infidelity that its noise adds to first order in the spectrum
	Worst          []Worst   // of each held class; the zero value for classes of one error
}

// Worst is the error of a class that survives most.
type Worst struct {
	Susceptibility float64
	Direction      string // "0.83 X + 0.41 Y"
}

// Figures evaluates controls u and, by held class, the v of those of kind Line;
// v may be nil when there are none.
func (g *Gate) Figures(u []float64, v [][]float64) Figures {
	g.load(u, v)
	g.nominal.Run(g.u, dynamics.Vec{})
	var f Figures
	f.Before, f.After = g.best(g.nominal.Gate)
	f.Infidelity = g.infidelity(g.nominal.Gate, f.Before, f.After)
	at := 0
	// combine lists static classes before borne ones: walk them as NewGate did
	share := make([]float64, len(g.spec.Held))
	worst := make([]Worst, len(g.spec.Held))
	for i, c := range g.spec.Held {
		switch c.Kind {
		case Any:
			var m [9]float64
			for col := range 3 {
				t := g.averaged(at + col)
				for row := range 3 {
					m[3*row+col] = t[row]
				}
			}
			at += 3
			share[i], worst[i] = universal(m)
		case Static:
			share[i] = norm(g.averaged(at))
			at++
		}
	}
	for k, i := range g.borne {
		t := g.nominal.Toggle[len(g.nominal.Held)+k]
		if p := g.power(g.v[i]); p > 0 {
			share[i] = norm(t) / math.Sqrt(g.span*p)
		}
	}
	f.Susceptibility, f.Worst = share, worst
	return f
}

// infidelity returns the average gate infidelity of the grid's gate at free angles.
func (g *Gate) infidelity(q dynamics.Quat, before, after float64) float64 {
	m := g.see(q, before, after).miss
	return 2. / 3 * (m[0]*m[0] + m[1]*m[1] + m[2]*m[2])
}

// power returns ∫|F|² dt over the window, rad²/ns, of the field F that an error
// riding on the controls as v adds per λ.
func (g *Gate) power(v []float64) float64 {
	sum := 0.0
	for j := g.spec.Grid.First; j < g.spec.Grid.Last; j++ {
		for node := 2 * j; node < 2*j+2; node++ {
			var f dynamics.Vec
			for k, e := range g.spec.Axes {
				at := k*g.nodes + node
				for i := range 3 {
					f[i] += v[at] * e[i]
					if g.spec.Shifts != nil {
						f[i] += 2 * v[at] * g.u[at] * g.spec.Shifts[k][i]
					}
				}
			}
			sum += g.spec.Grid.Steps[j] / 2 * (f[0]*f[0] + f[1]*f[1] + f[2]*f[2])
		}
	}
	return sum
}

// universal returns ||M||_F/√3 of the averaged map and its worst direction.
func universal(m [9]float64) (float64, Worst) {
	sum := 0.0
	for _, v := range m {
		sum += v * v
	}
	var svd mat.SVD
	w := Worst{}
	if svd.Factorize(mat.NewDense(3, 3, m[:]), mat.SVDFull) {
		var v mat.Dense
		svd.VTo(&v)
		w.Susceptibility = svd.Values(nil)[0]
		w.Direction = inWords(mat.Col(nil, 0, &v), []string{"X", "Y", "Z"})
	}
	return math.Sqrt(sum / 3), w
}

// Infidelity returns the average gate infidelity of controls u with a static
// error of field offset (rad/ns) and every control scaled, in the window only, at the
// free angles that are best without the error.
func (g *Gate) Infidelity(u []float64, offset dynamics.Vec, scale float64) float64 {
	g.set(u)
	before, after := g.playback()
	return g.erring(member{offset: offset, scale: scale}, nil, before, after)
}

// playback returns the best free angles of the loaded controls.
func (g *Gate) playback() (before, after float64) {
	if g.free() {
		g.finite.Run(g.u, dynamics.Vec{})
		before, after = g.best(g.finite.Gate)
	}
	return before, after
}

// erring returns the infidelity of the loaded controls with a finite error.
func (g *Gate) erring(e member, v []float64, before, after float64) float64 {
	g.err(e, v)
	g.finite.Run(g.moved, e.offset)
	return g.infidelity(g.finite.Gate, before, after)
}

// MeanInfidelity returns the mean average gate infidelity over the finite errors
// of the numbered held class at its size, both signs of each, or over its Values by their Shares, of which with Worst it is the largest; u and v as for
// Figures.
func (g *Gate) MeanInfidelity(u []float64, v [][]float64, class int) float64 {
	g.load(u, v)
	c := g.spec.Held[class]
	c.OneSided = false
	list := c.ensemble()
	if c.Values != nil {
		list, _ = c.spread()
	}
	if len(list) == 0 {
		return 0
	}
	before, after := g.playback()
	losses := make([]float64, len(list))
	for i, e := range list {
		losses[i] = g.erring(e, g.added(class), before, after)
	}
	return c.mean(losses)
}

// mean weighs losses by the class's shares.
func (c *Class) mean(losses []float64) float64 {
	if c.Worst {
		return slices.Max(losses)
	}
	sum := 0.0
	for i, x := range losses {
		share := 1 / float64(len(losses))
		if c.Shares != nil {
			share = c.Shares[i]
		}
		sum += share * x
	}
	return sum
}

// InfidelityAt returns the average gate infidelity of controls u with rotations
// about Z by given angles, rad, before and after the gate, whatever is free.
func (g *Gate) InfidelityAt(u []float64, before, after float64) float64 {
	x := dynamics.Turn(dynamics.Vec{0, 0, after}).Mul(g.Unitary(u)).Mul(dynamics.Turn(dynamics.Vec{0, 0, before}))
	e := x.Mul(g.spec.Target.Conj())
	return 2. / 3 * (e[1]*e[1] + e[2]*e[2] + e[3]*e[3])
}

// Unitary returns the gate of controls u given at the grid's nodes, in the frame
// of the undriven device, without free angles.
func (g *Gate) Unitary(u []float64) dynamics.Quat {
	if g.mapped != nil {
		copy(g.moved, u)
		g.mapMoved()
		u = g.moved
	}
	g.finite.Run(u, dynamics.Vec{})
	return g.after.Mul(g.finite.Gate).Mul(g.before)
}
