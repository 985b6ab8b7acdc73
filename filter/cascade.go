package filter

import (
	"fmt"
	"math"
	"math/cmplx"
)

// How Cascade treats poles of different sections that lie close together.
//
// Two simple poles a distance d apart, in units of their decay rate, have
// residues of size 1/d that nearly cancel, which costs the digits of 1/d; three
// cost those of 1/d^2. Poles closer than a gap are therefore expanded about a
// common centre c instead,
//
//	1/(s-p)^m = sum_k C(m+k-1, k) (p-c)^k / (s-c)^{m+k},
//
// a series in (p-c)/rate on and right of the imaginary axis, cut where its terms
// fall under cutoff. Just beyond the first gap a pair costs one digit and a half; just
// within it the series needs about ten powers. Poles with powers cost more digits
// beyond the gap: where too many are lost the wider gaps, whose series need some
// twenty powers, are tried in turn.
const (
	mergeGap  = 0.03
	widerGap  = 0.1
	widestGap = 0.25
	cutoff    = 1e-18
	// cascadeTolerance is the largest mismatch between the product of the
	// sections' responses and the response of the result, as a share of the
	// largest response, and the largest size of rounding errors that the terms
	// can cause together; a product that exceeds it is refused.
	cascadeTolerance = 1e-10
)

// An expansion is one pole with its scaled residues, out[m-1] = r_m/rate^m.
type expansion struct {
	pole complex128
	rate float64
	out  []complex128
}

// A section is a line without its delay, poles expanded.
type section struct {
	direct complex128
	poles  []expansion
}

// Cascade returns the product of the sections, as when their lines are
// connected in series: delays add, the rest becomes one sum of partial
// fractions. Equal poles give powers above one; so do nearly equal poles, which
// are expanded about a common centre. No section at all gives [Through].
//
// The result is compared with the product of the sections' responses at many
// frequencies. An error is returned when they differ by more than 1e-10 of the
// largest response, when rounding in the cancelling terms could reach that size,
// when a pole would need a power above MaxPower, when there would be more than
// MaxTerms terms, or when a section fails [Line.Check].
func Cascade(sections ...Line) (Line, error) {
	allReal := true
	delay := 0.0
	for i, l := range sections {
		if err := l.Check(); err != nil {
			return Line{}, fmt.Errorf("filter: section %d of the cascade: %w", i, err)
		}
		allReal = allReal && l.Real()
		delay += l.Delay
	}
	if !(delay <= longestTime) {
		return Line{}, fmt.Errorf("filter: delays of a cascade add to %g ns; allowed: 0 to %g ns", delay, longestTime)
	}
	if len(sections) == 1 { // nothing to multiply: keep every bit
		l := sections[0]
		l.Terms = append([]Term(nil), l.Terms...)
		return l, nil
	}
	var first error
	for _, gap := range [...]float64{mergeGap, widerGap, widestGap} {
		l, err := join(sections, gap, allReal)
		if err == nil {
			l.Delay = delay
			return l, nil
		}
		if first == nil {
			first = err
		}
	}
	return Line{}, first
}

// join is Cascade without the delays, with poles closer than gap merged.
func join(sections []Line, gap float64, allReal bool) (Line, error) {
	parts := make([]section, len(sections))
	total := 0
	for i, l := range sections {
		parts[i] = expand(l)
		total += len(parts[i].poles)
	}
	if total > MaxTerms/2 {
		return Line{}, fmt.Errorf("filter: %d poles in a cascade; allowed: at most %d", total, MaxTerms/2)
	}
	merge(parts, gap, allReal)
	product := section{direct: 1}
	for _, p := range parts {
		product = multiply(product, p)
	}
	l := product.line()
	if allReal {
		l.symmetrise()
	}
	if err := l.Check(); err != nil {
		return Line{}, fmt.Errorf("filter: the sections cannot be joined into one line: %w", err)
	}
	if err := verify(l, sections); err != nil {
		return Line{}, err
	}
	return l, nil
}

func expand(l Line) section {
	s := section{direct: l.Direct}
	var c chain
	for i := range l.Terms {
		if c.load(l.Terms, i) {
			s.poles = append(s.poles, expansion{c.pole, c.rate, append([]complex128(nil), c.out[:c.n]...)})
		}
	}
	return s
}

// merge replaces poles of different sections that lie within gap of each other, directly or through others, by their common centre. A group whose series would
// not converge within MaxPower powers is left as it is.
func merge(parts []section, gap float64, allReal bool) {
	type place struct{ part, pole int }
	var poles []complex128 // distinct ones
	var where [][]place
	index := map[complex128]int{}
	for i, s := range parts {
		for j, e := range s.poles {
			k, ok := index[e.pole]
			if !ok {
				k = len(poles)
				index[e.pole] = k
				poles = append(poles, e.pole)
				where = append(where, nil)
			}
			where[k] = append(where[k], place{i, j})
		}
	}
	group := make([]int, len(poles))
	for i := range group {
		group[i] = i
	}
	for i, p := range poles {
		for j, q := range poles[:i] {
			alone := len(where[i]) == 1 && len(where[j]) == 1 && where[i][0].part == where[j][0].part
			if !alone && cmplx.Abs(p-q) <= gap*min(-real(p), -real(q)) {
				from, to := group[i], group[j]
				for k := range group {
					if group[k] == from {
						group[k] = to
					}
				}
			}
		}
	}
	var centres []complex128
	for g := range poles {
		var members []int
		sum := complex128(0)
		for k := range poles {
			if group[k] == g {
				members = append(members, k)
				sum += poles[k]
			}
		}
		if len(members) < 2 {
			continue
		}
		centre := sum / complex(float64(len(members)), 0)
		if allReal { // keep conjugate groups exact mirror images
			if math.Abs(imag(centre)) <= realTolerance*-real(centre) {
				centre = complex(real(centre), 0)
			}
			for _, c := range centres {
				if cmplx.Abs(centre-cmplx.Conj(c)) <= realTolerance*cmplx.Abs(c) {
					centre = cmplx.Conj(c)
				}
			}
		}
		moved := map[place]expansion{}
		ok := true
		for _, k := range members {
			for _, at := range where[k] {
				e, fits := parts[at.part].poles[at.pole].about(centre)
				ok = ok && fits
				moved[at] = e
			}
		}
		if !ok {
			continue
		}
		centres = append(centres, centre)
		for at, e := range moved { // distinct places: order does not matter
			parts[at.part].poles[at.pole] = e
		}
	}
	for i := range parts {
		parts[i].join()
	}
}

// about expands e about the centre c and reports whether MaxPower powers suffice.
func (e expansion) about(c complex128) (expansion, bool) {
	rate := -real(c)
	d := (e.pole - c) / complex(rate, 0)
	out := make([]complex128, MaxPower)
	length := 0
	largest := 0.0
	for _, v := range e.out {
		largest = max(largest, cmplx.Abs(v))
	}
	scale := complex128(1)
	for i, v := range e.out {
		m := i + 1
		scale *= complex(e.rate/rate, 0)
		v *= scale
		for k := 0; cmplx.Abs(v) > cutoff*largest; k++ {
			if m+k > MaxPower {
				return e, false
			}
			out[m+k-1] += v
			length = max(length, m+k)
			v *= d * complex(float64(m+k)/float64(k+1), 0)
		}
	}
	return expansion{c, rate, out[:length]}, true
}

// join adds up expansions about the same pole, which merging can leave in a
// section.
func (s *section) join() {
	index := map[complex128]int{}
	kept := s.poles[:0:0]
	for _, e := range s.poles {
		j, ok := index[e.pole]
		if !ok {
			index[e.pole] = len(kept)
			kept = append(kept, e)
			continue
		}
		for m, v := range e.out {
			if m == len(kept[j].out) {
				kept[j].out = append(kept[j].out, 0)
			}
			kept[j].out[m] += v
		}
	}
	s.poles = kept
}

// find returns the expansion of s about p, nil when p is no pole of it.
func (s section) find(p complex128) []complex128 {
	for _, e := range s.poles {
		if e.pole == p {
			return e.out
		}
	}
	return nil
}

// regular returns the first n coefficients of s without its terms in p, in
// powers of (s-p)/rate:
//
//	1/(s-q)^m = sum_k (-1)^k C(m+k-1, k) (s-p)^k / (p-q)^{m+k}.
func (s section) regular(p complex128, rate float64, n int) []complex128 {
	b := make([]complex128, n)
	b[0] = s.direct
	for _, e := range s.poles {
		if e.pole == p {
			continue
		}
		own := complex(e.rate, 0) / (p - e.pole)
		per := complex(-rate, 0) / (p - e.pole)
		front := complex128(1)
		for i, v := range e.out {
			front *= own
			v *= front
			for k := range b {
				b[k] += v
				v *= per * complex(float64(i+1+k)/float64(k+1), 0)
			}
		}
	}
	return b
}

// multiply returns the partial fractions of a b, whose poles are equal or well
// apart: at each pole, singular part times Laurent series.
func multiply(a, b section) section {
	c := section{direct: a.direct * b.direct}
	at := func(p complex128, rate float64) {
		sa, sb := a.find(p), b.find(p)
		n := len(sa) + len(sb)
		ra, rb := a.regular(p, rate, n), b.regular(p, rate, n)
		out := make([]complex128, n)
		for i, v := range sa {
			for j, w := range sb {
				out[i+j+1] += v * w
			}
			for k := 0; k <= i; k++ {
				out[i-k] += v * rb[k]
			}
		}
		for j, w := range sb {
			for k := 0; k <= j; k++ {
				out[j-k] += w * ra[k]
			}
		}
		largest := 0.0
		for _, v := range out {
			largest = max(largest, cmplx.Abs(v))
		}
		for n > 0 && cmplx.Abs(out[n-1]) <= 10*cutoff*largest {
			n--
		}
		if n > 0 {
			c.poles = append(c.poles, expansion{p, rate, out[:n]})
		}
	}
	for _, e := range a.poles {
		at(e.pole, e.rate)
	}
	for _, e := range b.poles {
		if a.find(e.pole) == nil {
			at(e.pole, e.rate)
		}
	}
	return c
}

// line returns the terms with unscaled residues.
func (s section) line() Line {
	l := Line{Direct: s.direct}
	for _, e := range s.poles {
		for i, r := range e.out {
			for range i + 1 {
				r *= complex(e.rate, 0)
			}
			if r != 0 {
				l.Terms = append(l.Terms, Term{e.pole, i + 1, r})
			}
		}
	}
	return l
}

// symmetrise makes a line that is real but for roundings exactly so.
func (l *Line) symmetrise() {
	l.Direct = complex(real(l.Direct), 0)
	for i, t := range l.Terms {
		if imag(t.Pole) == 0 {
			l.Terms[i].Residue = complex(real(t.Residue), 0)
			continue
		}
		for j, o := range l.Terms[:i] {
			if o.Power == t.Power && o.Pole == cmplx.Conj(t.Pole) {
				r := (o.Residue + cmplx.Conj(t.Residue)) / 2
				l.Terms[j].Residue, l.Terms[i].Residue = r, cmplx.Conj(r)
				break
			}
		}
	}
}

// verify compares l with its factors, from steady to ten times the fastest pole.
func verify(l Line, sections []Line) error {
	sum := cmplx.Abs(l.Direct) // bounds |G| and the response to |x| <= 1, term by term
	frequencies := []float64{0}
	for _, t := range l.Terms {
		r := t.Residue
		for range t.Power {
			r /= complex(real(t.Pole), 0)
		}
		sum += cmplx.Abs(r)
		frequencies = append(frequencies, imag(t.Pole))
		for _, f := range []float64{0.1, 0.3, 1, 3, 10} {
			frequencies = append(frequencies, f*cmplx.Abs(t.Pole), -f*cmplx.Abs(t.Pole))
		}
	}
	largest, worst := 0.0, 0.0
	for _, w := range frequencies {
		want := complex128(1)
		for _, s := range sections {
			want *= s.response(w)
		}
		largest = max(largest, cmplx.Abs(want))
		worst = max(worst, cmplx.Abs(l.response(w)-want)) // keeps a NaN
	}
	const ulp = 0x1p-52
	worst = max(worst, sum*ulp)
	if !(worst <= cascadeTolerance*largest) {
		return fmt.Errorf("filter: the sections' poles lie too close together to join them into one line: their terms cancel so far that %.1g of the response is lost; allowed: %g", worst/largest, cascadeTolerance)
	}
	return nil
}
