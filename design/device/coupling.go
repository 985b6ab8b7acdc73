package device

import (
	"cmp"
	"math"
	"slices"
)

// still is how slowly something turns that is taken to stand still, and how near two frequencies are that are taken for one, rad/ns: 1 Hz.
const still = 2 * math.Pi * 1e-9

// Rotating is a part of the Hamiltonian that turns: H += cos(w t) Cosine + sin(w t) Sine.
type Rotating struct {
	Frequency    float64 // w, rad/ns, above 0; t counts from the start of the gate's window
	Cosine, Sine Matrix  // Hermitian, of the whole device, rad/ns
}

// Rotating gives what of the couplings turns in the frames of the sites, by ascending frequency, each frequency once: V becomes
// exp(i F t) V exp(-i F t) with F the sum over sites of frame frequency times number of the level, so the element between levels i and j turns with
// e^{i (F_i - F_j) t}.
func (d *Device) Rotating() []Rotating {
	_, kept, _ := d.frames()
	return kept
}

// Dropped gives in the same form what turns and is left out, of the couplings with RotatingWave.
func (d *Device) Dropped() []Rotating {
	_, _, dropped := d.frames()
	return dropped
}

// element is an entry of a coupling that turns with e^{i w t}, w > 0.
type element struct {
	w    float64
	i, j int
	v    complex128
}

// frames takes the couplings apart: what stands still in the frames of the sites, what turns, and what turns and is left out.
func (d *Device) frames() (static Matrix, kept, dropped []Rotating) {
	static = Zero(d.Dim())
	var turning, left []element
	for i := range d.Couplings {
		c := &d.Couplings[i]
		m := d.coupling(c)
		for row := range m.N {
			for col := range m.N {
				v := m.Data[row*m.N+col]
				if v == 0 {
					continue
				}
				switch w := d.turns(row, col); {
				case math.Abs(w) <= still:
					static.Data[row*m.N+col] += v
				case w > 0 && c.RotatingWave:
					left = append(left, element{w, row, col, v})
				case w > 0: // the one across the diagonal is its conjugate
					turning = append(turning, element{w, row, col, v})
				}
			}
		}
	}
	return static, gather(turning, static.N), gather(left, static.N)
}

// turns gives how fast the element in a row and column of a whole matrix turns, rad/ns.
func (d *Device) turns(row, col int) float64 {
	w := 0.0
	for k := len(d.Sites) - 1; k >= 0; k-- {
		s := &d.Sites[k]
		w += s.frame() * float64(s.number(row%s.Levels)-s.number(col%s.Levels))
		row, col = row/s.Levels, col/s.Levels
	}
	return w
}

// gather sorts elements by frequency: v e^{iwt} and its conjugate are cos(wt) (V + V') + sin(wt) i(V - V').
func gather(list []element, n int) []Rotating {
	slices.SortStableFunc(list, func(a, b element) int { return cmp.Compare(a.w, b.w) })
	var all []Rotating
	for _, e := range list {
		if len(all) == 0 || e.w-all[len(all)-1].Frequency > still {
			all = append(all, Rotating{e.w, Zero(n), Zero(n)})
		}
		r := &all[len(all)-1]
		conjugate := complex(real(e.v), -imag(e.v))
		r.Cosine.Data[e.i*n+e.j] += e.v
		r.Cosine.Data[e.j*n+e.i] += conjugate
		r.Sine.Data[e.i*n+e.j] += 1i * e.v
		r.Sine.Data[e.j*n+e.i] += -1i * conjugate
	}
	return all
}

// coupling gives what a coupling adds to the Hamiltonian, before any frame; see the kinds of Coupling.
func (d *Device) coupling(c *Coupling) Matrix {
	j := complex(c.Strength, 0)
	sites := make([]int, len(c.Sites))
	for i, name := range c.Sites {
		sites[i], _ = d.Site(name)
	}
	if c.Kind == Product {
		ops := map[int]Matrix{}
		for i, s := range sites {
			ops[s] = d.Local(s, c.Axes[i])
		}
		return d.Embed(ops).Scale(j / 2)
	}
	pair := func(a, b Matrix) Matrix { return d.Embed(map[int]Matrix{sites[0]: a, sites[1]: b}) }
	if c.Kind == Dispersive {
		return pair(d.numbers(sites[0]), d.numbers(sites[1])).Scale(j)
	}
	if c.Kind == Exchange {
		a, b := d.lowering(sites[0]), d.lowering(sites[1])
		return pair(a, b.Adjoint()).Add(1, pair(a.Adjoint(), b)).Scale(j)
	}
	same := func(axis string) Matrix { return pair(d.half(sites[0], axis), d.half(sites[1], axis)) }
	total := same("X").Add(1, same("Y")).Add(1, same("Z"))
	if c.Kind == Dipolar {
		total = same("Z").Scale(3).Add(-1, total)
	}
	return total.Scale(j)
}

// numbers gives the operator of the number of a site's level above the ground state.
func (d *Device) numbers(site int) Matrix {
	s := &d.Sites[site]
	m := Zero(s.Levels)
	for k := range s.Levels {
		m.Data[k*s.Levels+k] = complex(float64(s.number(k)), 0)
	}
	return m
}

// lowering gives the operator that takes a quantum of energy out of a site: a of a ladder, and (X +- iY)/2 of a spin.
func (d *Device) lowering(site int) Matrix {
	sign := complex128(1i)
	if d.Sites[site].Zero == Upper {
		sign = -1i
	}
	return d.half(site, "X").Add(sign, d.half(site, "Y"))
}
