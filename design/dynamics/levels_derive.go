package dynamics

import "math"

// Coordinates stores a Hermitian d x d matrix as d² real numbers in dst, whose sum of
// squares is ||a||_F²: the diagonal, then √2 Re and √2 Im of every entry above it, row
// by row. They are what the rows of a Jacobian refer to; a block of a is a subset of
// them (see Coordinate).
func Coordinates(dst []float64, a []complex128, d int) {
	at := d
	for i := range d {
		dst[i] = real(a[i*d+i])
		for j := i + 1; j < d; j++ {
			x := a[i*d+j]
			dst[at], dst[at+1] = math.Sqrt2*real(x), math.Sqrt2*imag(x)
			at += 2
		}
	}
}

// FromCoordinates is the inverse of Coordinates.
func FromCoordinates(a []complex128, c []float64, d int) {
	at := d
	for i := range d {
		a[i*d+i] = complex(c[i], 0)
		for j := i + 1; j < d; j++ {
			x := complex(c[at]/math.Sqrt2, c[at+1]/math.Sqrt2)
			a[i*d+j], a[j*d+i] = x, conj(x)
			at += 2
		}
	}
}

// Coordinate returns where Coordinates puts entry (i, j), i <= j: its real part; the
// imaginary part, for i < j, follows it.
func Coordinate(i, j, d int) int {
	if i == j {
		return i
	}
	return d + i*(2*d-i-1) + 2*(j-i-1)
}

// LevelsSlopes are the derivatives that Derive fills. Each row runs over controls and
// nodes like the controls of Run, the entries of known controls being left alone.
// Matrices are given by their Coordinates c, d² rows each; a nil row is not
// wanted, nor is a nil table.
//
// A residual (phase W'U - 1) of the gate moves by -i phase W'U δ; those of an error,
// P A P made traceless and (1-P) A P, are linear in the coordinates of A: with a code
// space of whole levels, some of them as they stand.
type LevelsSlopes struct {
	Gate   [][]float64 // row c: of the generator δ: U -> U exp(-i δ), in the frame of the grid's start
	Toggle [][]float64 // row d² e + c: of Toggle[e], by the controls
	Direct [][]float64 // row d² b + c: of the Toggle of Borne[b], by its v
}

// levelsSlope is the working memory of Derive.
type levelsSlope struct {
	rest   [][]complex128   // the shares of all later steps, by error
	lever  [][][]complex128 // by error and point: what the generator at the point multiplies
	turned [][]complex128   // the control seen from each point
	axis   []complex128     // the control seen from the middle
	total  []complex128
	free   []complex128 // derivative of a control-borne error by itself
	b1, b2 []complex128
	dh     []complex128
	coord  []float64
}

func newLevelsSlope(l *Levels) *levelsSlope {
	dd := l.k.dd
	s := &levelsSlope{rest: matrices(l.errors, dd), turned: matrices(l.most, dd), coord: make([]float64, dd)}
	for range l.errors {
		s.lever = append(s.lever, matrices(l.most, dd))
	}
	for _, m := range []*[]complex128{&s.axis, &s.total, &s.free, &s.b1, &s.b2, &s.dh} {
		*m = make([]complex128, dd)
	}
	return s
}

// Derive fills the derivatives of the last Run, the controls of which must be passed
// again. They are exact for the computation of Run to Within.
//
// With g_r = F_r' (dHb) F_r, the change of Hb seen from point r, the frames at the
// points and at the end turn by Γ_q = h sum_r upto[q][r] g_r and
// G = h sum_r weight[r] g_r, so that for an error seen as B_q, with correction C,
//
//	dA = i sum_r [g_r, Q_r] + ...,
//	Q_r = h weight[r] (A of all later steps) + h² sum_q weight[q] upto[q][r] B_q + h upto[mid][r] C,
//
// the dots standing for the changes of D, Hm and V.
func (l *Levels) Derive(u []float64, out *LevelsSlopes) {
	if l.slope == nil {
		l.slope = newLevelsSlope(l)
		l.room(0)
	}
	k, f, s := l.k, &l.f, l.slope
	nodes := 2 * len(l.Steps)
	nh := len(l.held)
	for _, a := range s.rest {
		clear(a)
	}
	for j := len(l.Steps) - 1; j >= 0; j-- {
		h, r := l.Steps[j], l.rules[j]
		g := gauss * h
		mid := r.n / 2
		inside := j >= l.First && j < l.Last && l.errors > 0
		toggling := out.Toggle != nil && l.errors > 0 && j < l.Last
		l.fields(u, j)
		l.frames(j)
		if inside && (toggling || out.Direct != nil) {
			l.toggle(u, j, 0)
		}
		if toggling {
			l.levers(j, inside)
		}
		for c := range len(l.axes) - l.Known {
			for node := range 2 {
				col := c*nodes + 2*j + node
				other, sign := f.h2, -1.0
				if node == 1 {
					other, sign = f.h1, 1
				}
				// dHb = e/2 -+ i g [e,H1 or H2] with g = (√3/12) h, e the axis at the node
				l.against(s.dh, other, c, u[col])
				for i, x := range s.dh {
					s.dh[i] = times(x, sign*g)
				}
				l.axis(s.dh, c, u[col], 0.5)
				clear(s.total)
				for q := range r.n {
					k.mul(f.p, s.dh, f.frame[q])
					k.hermLeft(s.turned[q], f.frame[q], f.p)
					addReal(s.total, s.turned[q], h*r.weight[q])
				}
				l.write(out.Gate, 0, s.total, col)
				seen := inside && (toggling || out.Direct != nil)
				if seen && (node == 0 || l.hasShift) {
					clear(s.b1)
					l.axis(s.b1, c, u[col], 1)
					k.mul(f.p, s.b1, f.mid)
					k.hermLeft(s.axis, f.mid, f.p)
				}
				for e := range l.errors {
					if out.Toggle == nil || !wanted(out.Toggle, e*k.dd, k.dd) {
						continue
					}
					clear(s.total)
					if toggling {
						for q := range r.n {
							k.mulAdd(s.total, s.turned[q], s.lever[e][q])
						}
						k.turn(s.total, s.total)
						for i, x := range s.total {
							s.total[i] = -x
						}
					}
					if inside && toggling {
						k.bracket(s.b1, s.axis, f.toggled[e][mid])
						addReal(s.total, s.b1, sign*g*h)
						if e >= nh {
							k.bracket(s.b1, s.axis, f.dvm[e-nh])
							addReal(s.total, s.b1, -0.5)
							if l.hasShift {
								clear(s.b1)
								l.shifts[c].add(s.b1, 2*l.Borne[e-nh][col])
								l.free(s.b1, j, sign)
								addReal(s.total, s.free, 1)
							}
						}
					}
					l.write(out.Toggle, e*k.dd, s.total, col)
				}
				if out.Direct == nil {
					continue
				}
				clear(s.free)
				if inside {
					clear(s.b1)
					l.axis(s.b1, c, u[col], 1)
					l.free(s.b1, j, sign)
				}
				for b := range l.Borne {
					l.write(out.Direct, b*k.dd, s.free, col)
				}
			}
		}
		if inside && toggling {
			for e := range l.errors {
				f.share(s.rest[e], e, r, h)
			}
		}
	}
}

// levers fills Q_r of step j.
func (l *Levels) levers(j int, inside bool) {
	f, s, h, r := &l.f, l.slope, l.Steps[j], l.rules[j]
	for e := range l.errors {
		for q := range r.n {
			m := s.lever[e][q]
			clear(m)
			addReal(m, s.rest[e], h*r.weight[q])
			if !inside {
				continue
			}
			for p := range r.n {
				addReal(m, f.toggled[e][p], h*h*r.weight[p]*r.upto[p][q])
			}
			addReal(m, f.bent[e], h*r.upto[r.n/2][q])
		}
	}
}

// axis adds f times what control c at u multiplies to a: Axes + 2u Shifts.
func (l *Levels) axis(a []complex128, c int, u, f float64) {
	l.axes[c].add(a, f)
	if l.hasShift {
		l.shifts[c].add(a, 2*u*f)
	}
}

// against stores -i [e, h] in a, e being the axis of control c at u.
func (l *Levels) against(a, h []complex128, c int, u float64) {
	l.axes[c].mul(a, h)
	if l.hasShift {
		l.shifts[c].mul(l.f.p, h)
		addReal(a, l.f.p, 2*u)
	}
	l.k.turn(a, a)
}

// free stores in slope.free the derivative of a control-borne error's share in step j
// by the error itself at one node, along e: V moves by e/2, DV by sign (√3/12) h² e.
// e is spoilt.
func (l *Levels) free(e []complex128, j int, sign float64) {
	k, f, s, h, r := l.k, &l.f, l.slope, l.Steps[j], l.rules[j]
	clear(s.free)
	for q := range r.n {
		k.mul(f.p, e, f.frame[q])
		k.hermLeft(f.q, f.frame[q], f.p)
		addReal(s.free, f.q, h*r.weight[q]/2)
		if q == r.n/2 {
			copy(s.b2, f.q)
		}
	}
	k.bracket(f.q, f.dm, s.b2)
	addReal(s.free, f.q, 0.5)
	k.bracket(f.q, f.hmm, s.b2)
	addReal(s.free, f.q, -sign*gauss*h*h)
}

// wanted tells whether one of n rows from the given one on is.
func wanted(rows [][]float64, from, n int) bool {
	for _, r := range rows[from : from+n] {
		if r != nil {
			return true
		}
	}
	return false
}

// write puts the coordinates of a into column col of the rows from the given one on.
func (l *Levels) write(rows [][]float64, from int, a []complex128, col int) {
	if rows == nil {
		return
	}
	c := l.slope.coord
	Coordinates(c, a, l.Dim)
	for i, r := range rows[from : from+l.k.dd] {
		if r != nil {
			r[col] = c[i]
		}
	}
}
