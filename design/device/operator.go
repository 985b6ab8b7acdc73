package device

import (
	"cmp"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
)

// Kron gives the Kronecker product of a and b, a's indices slower.
func Kron(a, b Matrix) Matrix {
	n := a.N * b.N
	m := Zero(n)
	for i := range a.N {
		for j := range a.N {
			f := a.Data[i*a.N+j]
			if f == 0 {
				continue
			}
			for k := range b.N {
				for l := range b.N {
					m.Data[(i*b.N+k)*n+j*b.N+l] = f * b.Data[k*b.N+l]
				}
			}
		}
	}
	return m
}

// Embed gives the product of operators on single sites, by the number of the site and in its own dimension, with the identity on all others: a
// matrix of the whole device. An operator of the wrong dimension is a caller's bug and panics.
func (d *Device) Embed(ops map[int]Matrix) Matrix {
	var m Matrix
	for i, s := range d.Sites {
		o, ok := ops[i]
		if !ok {
			o = Identity(s.Levels)
		}
		if o.N != s.Levels {
			panic(fmt.Sprintf("device: an operator of %d levels on a site of %d", o.N, s.Levels))
		}
		if i == 0 {
			m = Matrix{N: o.N, Data: slices.Clone(o.Data)}
		} else {
			m = Kron(m, o)
		}
	}
	return m
}

// LiftAt gives what an operator x X + y Y + z Z, given on two levels, means on a site, in the site's own dimension: itself on two levels; on a ladder
//
//	x (a + a') + y i(a' - a) - 2 z n,
//
// with a the lowering operator and n the number of the level, so that the 0-1 block is the operator itself, up to its trace; and on a spin of more
// levels 2 (x Sx + y Sy + z Sz).
func (d *Device) LiftAt(site int, m Matrix) Matrix {
	s := &d.Sites[site]
	levels := s.Levels
	if levels == 2 {
		return m
	}
	l := Zero(levels)
	z := real(m.At(0, 0)-m.At(1, 1)) / 2
	for n := range levels {
		square := n + 1 // of the element of X between levels n and n+1
		diagonal := -2 * z * float64(n)
		if !s.ladder() {
			square *= levels - 1 - n
			diagonal = z * float64(levels-1-2*n)
		}
		l.Data[n*levels+n] = complex(diagonal, 0)
		if n+1 < levels {
			r := complex(math.Sqrt(float64(square)), 0)
			l.Data[n*levels+n+1], l.Data[(n+1)*levels+n] = r*m.At(0, 1), r*m.At(1, 0)
		}
	}
	return l
}

// Local gives X, Y or Z of a site, in the site's own dimension; see LiftAt.
func (d *Device) Local(site int, name string) Matrix {
	o, _ := Operator(name)
	return d.LiftAt(site, o)
}

// half gives half of X, Y or Z of a site, in the site's own dimension.
func (d *Device) half(site int, name string) Matrix {
	o, _ := Operator(name)
	return d.LiftAt(site, o.Scale(0.5))
}

// Basis gives an orthogonal basis of the traceless operators of a site of n levels, n^2-1 Hermitian matrices of Frobenius norm sqrt(n), and their
// names: X, Y and Z of two levels; of more the real and the imaginary parts of the transitions, "Re 0-1", "Im 0-1", ..., and "level 1", ..., of
// which "level k" sets level k against the mean of those before it.
func (d *Device) Basis(site int) (ops []Matrix, names []string) {
	n := d.Sites[site].Levels
	if n == 2 {
		for _, name := range OperatorNames() {
			o, _ := Operator(name)
			ops, names = append(ops, o), append(names, name)
		}
		return ops, names
	}
	f := complex(math.Sqrt(float64(n)), 0)
	for i := range n {
		for j := i + 1; j < n; j++ {
			re, im := Transition(n, i, j)
			ops = append(ops, re.Scale(f), im.Scale(f))
			names = append(names, fmt.Sprintf("Re %d-%d", i, j), fmt.Sprintf("Im %d-%d", i, j))
		}
	}
	for k := 1; k < n; k++ { // diag(1, ..., 1, -k, 0, ...)
		o := Zero(n)
		g := f / complex(math.Sqrt(float64(k*(k+1))), 0)
		for i := range k {
			o.Data[i*n+i] = g
		}
		o.Data[k*n+k] = -complex(float64(k), 0) * g
		ops, names = append(ops, o), append(names, fmt.Sprintf("level %d", k))
	}
	return ops, names
}

// Transition gives the real and the imaginary part of the transition between levels i and j of n, each of Frobenius norm 1.
func Transition(n, i, j int) (re, im Matrix) {
	const r = math.Sqrt2 / 2
	re, im = Zero(n), Zero(n)
	re.Data[i*n+j], re.Data[j*n+i] = r, r
	im.Data[i*n+j], im.Data[j*n+i] = complex(0, -r), complex(0, r)
	return re, im
}

// Aim gives the number of the site that a channel of the device is meant for, and whether it drives it, or biases it.
func (d *Device) Aim(channel string) (site int, drives bool) {
	site, drive, _ := d.aim(channel)
	return site, drive >= 0
}

// aim gives the site that a channel is meant for, and the number of its drive, -1 for a bias.
func (d *Device) aim(channel string) (site, drive int, ok bool) {
	for i, o := range d.Drives {
		if o.Channel == channel {
			site, ok = d.Site(o.Site)
			return site, i, ok
		}
	}
	for _, o := range d.Biases {
		if o.Channel == channel {
			site, ok = d.Site(o.Site)
			return site, -1, ok
		}
	}
	return 0, -1, false
}

// BiasOperator gives what bias number bias multiplies, so that H += u times it, or Rate times it, in the dimension of its site: half the operator
// of its axis, and with a Loop half of Z with the sign that a detuning has, that of Site.Zero.
func (d *Device) BiasOperator(bias int) Matrix {
	site, _ := d.Site(d.Biases[bias].Site)
	return d.biased(&d.Biases[bias], site)
}

// biased gives what a bias multiplies at a site.
func (d *Device) biased(b *Bias, site int) Matrix {
	o := d.half(site, b.Axis)
	if b.Loop != nil && d.Sites[site].Zero == Lower {
		o = o.Scale(-1)
	}
	return o
}

// ShiftOperator gives what a drive-induced shift of the site that a channel drives multiplies, Z/2 whichever energy |0> has, as a matrix of the
// whole device: H += kappa |u|^2 Z/2 with kappa in rad/ns, of the profile, and u in shares of full scale.
func (d *Device) ShiftOperator(channel string) Matrix {
	site, _, _ := d.aim(channel)
	return d.Embed(map[int]Matrix{site: d.half(site, "Z")})
}

// Operators gives what the two quadratures of drive number drive multiply, so that H += u_I ops[0] + u_Q ops[1], in the dimension of its site: X/2,
// and Y/2 with a sign, lifted to the site's levels. Mixing is that of its channel in the hardware profile.
//
// With +Y/2, u = u_I + i u_Q multiplies |1><0|/2. If |0> is the lower state that raises the energy by w and goes with e^{-iwt}: the carrier
// is Re[u e^{-iwt}] = I cos wt + Q sin wt. If |0> is the upper one it goes with e^{+iwt}, and the carrier is I cos wt - Q sin wt. With the
// other mixing the field turns the other way, and Q acts by -Y/2.
func (d *Device) Operators(drive int, mixing string) [2]Matrix {
	site, _ := d.Site(d.Drives[drive].Site)
	return d.quadratures(site, mixing)
}

// plus is the mixing of a carrier I cos wt + Q sin wt = Re[u e^{-iwt}]; the other one is I cos wt - Q sin wt = Re[u e^{iwt}].
const plus = "I cos + Q sin"

func (d *Device) quadratures(site int, mixing string) [2]Matrix {
	x, _ := Operator("X")
	y, _ := Operator("Y")
	sign := complex128(-1)
	if (mixing == plus) == (d.Sites[site].Zero == Lower) {
		sign = 1
	}
	return [2]Matrix{d.LiftAt(site, x.Scale(0.5)), d.LiftAt(site, y.Scale(sign*0.5))}
}

// A Path is a way of a channel to the device: u e^{-i Frequency t} stands there in the place of u. H += Re Operators[0] + Im Operators[1] of that, or
// Re Operators[0] for a baseband channel, or of one with a map its Rate times Operators[0].
type Path struct {
	Frequency float64  // rad/ns, of either sign, t from the start of the gate's window; 0 for what turns with the frame
	Operators []Matrix // of u_I and u_Q, or of u alone; of the whole device
}

// Reach gives what a channel does to a site per share of 1 and at phase 0, as a Path: to its own or, by crosstalk, to another. It is one of no
// frequency unless both sites state theirs.
//
// The carrier of a drive turns with the frame of its own site, w1. In the frame of a site that turns at w2 the part of the carrier that is not
// averaged away turns at w1 - w2: Re[u e^{-i w1 t}], the mixing I cos + Q sin, becomes u e^{-i(w1-w2)t} in the place of u, and the other mixing,
// Re[u e^{i w1 t}], u e^{i(w1-w2)t}, whichever energy |0> has, with the operators that Operators gives for it.
func (d *Device) Reach(channel string, site int, mixing string) Path {
	own, drive, _ := d.aim(channel)
	if drive < 0 {
		b := &Bias{Axis: "Z"}
		for i := range d.Biases {
			if d.Biases[i].Channel == channel {
				b = &d.Biases[i]
			}
		}
		return Path{Operators: []Matrix{d.Embed(map[int]Matrix{site: d.biased(b, site)})}}
	}
	var p Path
	for _, o := range d.quadratures(site, mixing) {
		p.Operators = append(p.Operators, d.Embed(map[int]Matrix{site: o}))
	}
	if from, to := &d.Sites[own], &d.Sites[site]; from.Frequency > 0 && to.Frequency > 0 {
		if p.Frequency = from.frame() - to.frame(); mixing != plus {
			p.Frequency = -p.Frequency
		}
		if math.Abs(p.Frequency) <= still {
			p.Frequency = 0
		}
	}
	return p
}

// Paths gives the ways of a channel to the device: first the one of frequency 0, which is what it does to its own site and by crosstalk to those
// of the same frame, and then one for each other frequency, ascending. Mixing is that of the channel in the hardware profile, of no meaning for
// a baseband channel. A channel that is not of this device has none.
func (d *Device) Paths(channel, mixing string) []Path {
	own, _, ok := d.aim(channel)
	if !ok {
		return nil
	}
	paths := []Path{d.Reach(channel, own, mixing)}
	for _, c := range d.Crosstalk {
		site, ok := d.Site(c.Site)
		if c.Channel != channel || !ok {
			continue
		}
		p := d.Reach(channel, site, mixing)
		at := slices.IndexFunc(paths, func(o Path) bool { return math.Abs(o.Frequency-p.Frequency) <= still })
		if at < 0 {
			at = len(paths)
			empty := Path{Frequency: p.Frequency}
			for range p.Operators {
				empty.Operators = append(empty.Operators, Zero(d.Dim()))
			}
			paths = append(paths, empty)
		}
		// Re(s u) and Im(s u) on the two operators, sorted by u_I and u_Q.
		s := cmplx.Rect(c.Share, c.Phase)
		ops := slices.Clone(paths[at].Operators)
		re, im := complex(real(s), 0), complex(imag(s), 0)
		ops[0] = ops[0].Add(re, p.Operators[0])
		if len(ops) == 2 {
			ops[0] = ops[0].Add(im, p.Operators[1])
			ops[1] = ops[1].Add(re, p.Operators[1]).Add(-im, p.Operators[0])
		}
		paths[at].Operators = ops
	}
	slices.SortStableFunc(paths[1:], func(a, b Path) int { return cmp.Compare(a.Frequency, b.Frequency) })
	return paths
}
