package robust

import (
	"math"
)

// loadLevels is load, where the errors of amplitudes leave given terms alone.
func (g *LevelsGate) loadLevels(u []float64, v [][]float64) {
	g.load(u, v)
	g.copyAmplitudes()
}

// Figures evaluates controls u and the v of classes of kind Line.
func (g *LevelsGate) Figures(u []float64, v [][]float64) Figures {
	g.loadLevels(u, v)
	g.nominal.Run(g.u, nil)
	g.aim.reset()
	var f Figures
	f.Infidelity, f.Leakage = g.aim.see(g.nominal.Gate, true).losses()
	f.Rotations = g.aim.set.clone()
	f.Susceptibility, f.Leak = make([]float64, len(g.held)), make([]float64, len(g.held))
	d := g.spec.Dim
	f.Noise = make([]float64, len(g.held))
	for _, w := range g.waves {
		f.Noise[w.class] += w.factor * w.factor * sumSquares(g.read[0].of(g.nominal.Toggle[w.toggle], d, g.coord))
	}
	if c := float64(g.aim.c); g.aim.target != nil {
		for i := range f.Noise { // average gate infidelity
			f.Noise[i] *= c / (c + 1)
		}
	}
	for class := range g.held {
		c := &g.held[class]
		r := g.reading(class)
		member := 0
		sum, leak, size, whole := 0.0, 0.0, 0.0, 0.0
		for _, t := range g.toggles {
			if t.class != class {
				continue
			}
			a := g.nominal.Toggle[t.toggle]
			col := r.of(a, d, g.coord)
			w := 1.0
			if c.Kind == Static || c.Kind == Any {
				op := g.nominal.Held[t.toggle]
				w = c.factor(member)
				x := g.size(op, c.Leak)
				size += w * w * x * x
				whole += w * w * squared(op, d)
			} else {
				size, whole = g.power(g.v[class])
				size, whole = size/g.span, whole/g.span
			}
			for i := range col {
				col[i] *= w
			}
			sum += sumSquares(col)
			leak += w * w * sumSquares(g.leaves.of(a, d, g.coord))
			member++
		}
		if size > 0 {
			f.Susceptibility[class] = math.Sqrt(sum/size) / g.span
		}
		if whole > 0 {
			f.Leak[class] = math.Sqrt(leak/whole) / g.span
		}
	}
	return f
}

// squared is the square of the Frobenius norm without the trace.
func squared(v []complex128, d int) float64 {
	sum := 0.0
	for _, x := range v {
		sum += real(x)*real(x) + imag(x)*imag(x)
	}
	trace := real(traceOf(v, d))
	return math.Max(0, sum-trace*trace/float64(d))
}

// power returns ∫ ||V||² dt over the window of the error that rides on the controls as
// v: of what residuals are compared to, and of the whole V.
func (g *LevelsGate) power(v []float64) (size, whole float64) {
	dd := g.spec.Dim * g.spec.Dim
	m := make([]complex128, dd)
	for j := g.spec.Grid.First; j < g.spec.Grid.Last; j++ {
		for node := 2 * j; node < 2*j+2; node++ {
			clear(m)
			for k, e := range g.spec.Axes {
				at := k*g.nodes + node
				f := complex(v[at], 0)
				for i, x := range e {
					m[i] += f * x
				}
				if g.spec.Shifts != nil {
					f *= complex(2*g.u[at], 0)
					for i, x := range g.spec.Shifts[k] {
						m[i] += f * x
					}
				}
			}
			h := g.spec.Grid.Steps[j] / 2
			s := g.size(m, false)
			size += h * s * s
			whole += h * squared(m, g.spec.Dim)
		}
	}
	return size, whole
}

// InfidelityAt returns the infidelity of controls u at given rotations.
func (g *LevelsGate) InfidelityAt(u []float64, r Rotations) float64 {
	g.set(u)
	g.nominal.Run(g.u, nil)
	g.aim.set, g.aim.warm = r.clone(), true
	loss, _ := g.aim.see(g.nominal.Gate, false).losses()
	return loss
}

// MeanInfidelity is that of Gate, at the rotations that are best without error.
func (g *LevelsGate) MeanInfidelity(u []float64, v [][]float64, class int) float64 {
	g.loadLevels(u, v)
	c := g.held[class]
	c.OneSided = false
	kept := g.members
	defer func() { g.members = kept }()
	g.members = append(c.members(class), c.placed(class)...)
	if len(g.members) == 0 {
		return 0
	}
	if g.aim.free() {
		g.nominal.Run(g.u, nil)
		g.aim.reset()
		g.aim.see(g.nominal.Gate, true)
	}
	losses := make([]float64, len(g.members))
	for i := range g.members {
		g.runMember(i)
		loss, _ := g.aim.see(g.finite.Gate, false).losses()
		losses[i] = loss
	}
	return c.mean(losses)
}
