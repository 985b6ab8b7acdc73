package hardware

import (
	"fmt"
	"math"
	"math/cmplx"

	"holdfast/filter"
)

// After the span the input is zero and what arrives is a sum of decaying terms. With t counted from the end of the
// span and z the states of the line then (filter's scaled chains: z_m' = p z_m + a z_{m-1}, a = -Re p),
//
//	v(t) = sum_q rho_q(t) z_q,   z_q = sum_k Z_qk x_k,   rho from a chain: e^{pt} (a t)^j/j!
//
// The limit holds at every instant t >= 0: L(t) is RingOut.Limit up to RingOut.Fast and RingOut.Tail later. Rows can only stand at
// finitely many instants t_0 = 0 < t_1 < ..., so each has the bound L - E, with the reserve E = betweenShare L, and the instants lie close
// enough for E to cover what lies between. Where the two parts differ an instant is put at RingOut.Fast, and its bound is that of
// the smaller; so no interval between two rows lies in both parts.
//
// # Between two instants
//
// Let M = sup |v|/L over t >= 0 and both quadratures, and suppose that the rows are kept. On [t_i, t_i + D], a part of the time in which
// L is one number, split v = alive + dead, where the dead poles together cannot exceed eta after t_i. A function stays within D^2/8 sup|v”|
// of its chord, so there
//
//	|v| <= L - E + 2 eta + D^2/8 sup |alive''|.                                                 (1)
//
// By Taylor, sup |alive”| <= sum_{j<J} D^j/j! |alive^(2+j)(t_i)| + D^J/J! sup |alive^(2+J)|. The last supremum is
// bounded pole by pole and a priori, from |x_k| <= A (the amplitude limit, which rounded samples keep too):
//
//	|e^{pt} (a t)^j/j! z| <= (j/e)^j/j! |z|,   |z_q| <= A sum_k |Z_qk|.                           (2)
//
// The others are functionals f of x. For any instants s_i >= 0 and numbers beta,
//
//	|f x| <= sum |beta_i| L(s_i) M + A sum_k |f_k - sum_i beta_i w_k(s_i)|,                       (3)
//
// with w(s) the weights of v(s): the ring-out that is allowed bounds its own derivatives, and where that says little the amplitude limit
// does. Exponentials with Q states have Q dimensions, so Q instants serve; those are picked greedily, and each
// partial choice is tried. Together (1) reads |v| <= L - E + g + h M with g, h >= 0, and D is chosen such that
// g + h <= E. Were M > 1, then where |v| = M L (or as near to it as one likes)
//
//	M L <= L - E + g + h M <= L - E + (g + h) M <= L - E + E M,   so   (M - 1)(L - E) <= 0,
//
// against the assumption. Hence M <= 1.
//
// # The end
//
// Rows stop at the first instant after which at most one real, simple pole is alive: then alive only shrinks, and
// |v(t)| <= |v(t_i)| + 2 eta. Or no pole at all: |v| <= eta. Where that comes before RingOut.Fast and the later limit is the
// smaller one, RingOut.Fast is the next instant.
//
// # Rounding
//
// Codes are x + e with |e| <= LSB/2 in each quadrature, which moves w.x by at most LSB/2 sum(|Re w| + |Im w|) in each. That
// is taken off each bound, and the derivation above then holds for the rounded samples. A drive that compresses makes of e at most
// its gain K times as much in each quadrature (see stretch); A is then what it reaches at the amplitude limit. Of a baseband channel
// samples and weights are real. With an envelope "box" |x_k| reaches the corner, and A is sqrt 2 times the limit.
const (
	// betweenShare is E/L. Half a per cent of the limit costs nothing that a user would notice and
	// keeps the rows of a common line at some tens.
	betweenShare = 0.005
	// deadShare of E is what the dead poles may use: eta <= E/8, and (1) has it twice.
	deadShare = 1.0 / 8
	// taylorTerms is J.
	taylorTerms = 8
	// trimShare of E may be lost by leaving out the smallest weights at the start of a row.
	trimShare = 1e-3
	// maxInstants ends the search in a hopeless case with an error. The worst of the lines in the tests needs some hundred.
	maxInstants = 5000
	// exactNorms is the number of free samples up to which sum_k |f_k| is summed; beyond it sqrt(n) |f|_2 is used, which is larger.
	exactNorms = 2048
)

// ringOutRows gives the rows that keep the ring-out limit of a channel at every instant after the span, and says whether
// rounding is reserved for. One more row bounds the amplitude of the slow tail (poles slower than RingOut.Fast)
// at the end of the span, so that a search does not play ringing off against the tail.
//
// most is A, and gain K.
func ringOutRows(p *Profile, c *Channel, s *Set, most, gain float64) (rows []Row, reserved bool, err error) {
	end := float64(s.Samples) * p.SamplePeriod
	w := make([]complex128, s.Samples)
	var limits []float64 // of each row
	add := func(name Limit, at, limit, bound float64) {
		e := betweenShare * limit
		free := w[s.Lead : s.Samples-s.Trail]
		first, lost := 0, 0.0
		for first < len(free) && lost+cmplx.Abs(free[first]) <= trimShare*e {
			lost += cmplx.Abs(free[first])
			first++
		}
		row := Row{Limit: name, At: at, First: s.Lead + first, Bound: bound - lost, Weights: append([]complex128(nil), free[first:]...)}
		// What no playable code can reach needs no row.
		if most*sumAbs(row.Weights) > row.Bound {
			rows = append(rows, row)
			limits = append(limits, limit)
		}
	}
	g := afterglowOf(c.Line, s, p.SamplePeriod, most, c.RingOut)
	instants, err := g.instants()
	if err != nil {
		return nil, false, err
	}
	later := c.RingOut.After(math.Inf(1))
	for _, t := range instants {
		c.Line.Weights(end+t, p.SamplePeriod, w)
		name, limit := RingOutFast, c.RingOut.After(t)
		if t > c.RingOut.Fast {
			name = RingOutTail
		} else if t == c.RingOut.Fast && later < limit {
			name, limit = RingOutTail, later
		}
		add(name, t, limit, limit-betweenShare*limit)
	}
	if slow := c.Line.SlowestTime() > c.RingOut.Fast; slow && g.fastestTime() <= c.RingOut.Fast {
		c.Line.SlowWeights(end, p.SamplePeriod, c.RingOut.Fast, w)
		limit := max(c.RingOut.Limit, later)
		add(RingOutTail, 0, limit, limit)
	}
	// The reserve is for all rows or for none, so that Reserved has one meaning.
	reserve := make([]float64, len(rows))
	reserved = true
	for i, row := range rows {
		for _, v := range row.Weights {
			reserve[i] += gain * LeastStep(p.Bits) / 2 * (math.Abs(real(v)) + math.Abs(imag(v)))
		}
		reserved = reserved && reserve[i] <= roundingShare*limits[i]
	}
	if reserved {
		for i := range rows {
			rows[i].Bound -= reserve[i]
		}
	}
	return rows, reserved, nil
}

// An afterglow is what a line gives after the span, as functionals of the free samples.
type afterglow struct {
	real   bool    // the line
	most   float64 // A: no |x[k]| exceeds it
	allows RingOut // L
	free   int     // number of free samples
	chains []glowChain
	// In the coordinates of an orthonormal basis of the states' functionals:
	picks []pick
	basis [][]complex128 // its rows: functionals over the free samples
}

// A glowChain is one pole with its scaled states.
type glowChain struct {
	pole   complex128
	rate   float64        // -Re pole
	out    []complex128   // v = sum out[m] z[m]
	states [][]complex128 // coordinates of each z[m] in the basis
	size   []float64      // A sum_k |Z_k| of each
}

// A pick is one instant of the greedy choice: the weights of v there, in coordinates, minus their part along earlier
// picks, normalised; and how the earlier ones combine.
type pick struct {
	allowed float64 // L(s_i)
	unit    []complex128
	row     []complex128 // weights(s_i) = sum_{j<=i} row[j] unit_j
}

func afterglowOf(line filter.Line, s *Set, period, most float64, allows RingOut) *afterglow {
	g := &afterglow{real: line.Real(), most: most, allows: allows, free: s.Samples - s.Lead - s.Trail}
	end := float64(s.Samples) * period
	w := make([]complex128, s.Samples)
	for i, t := range line.Terms {
		var c *glowChain
		for j := range g.chains {
			if g.chains[j].pole == t.Pole {
				c = &g.chains[j]
			}
		}
		if c == nil {
			g.chains = append(g.chains, glowChain{pole: line.Terms[i].Pole, rate: -real(t.Pole)})
			c = &g.chains[len(g.chains)-1]
		}
		for len(c.out) < t.Power {
			c.out = append(c.out, 0)
		}
		r := t.Residue
		for range t.Power {
			r /= complex(c.rate, 0)
		}
		c.out[t.Power-1] += r
	}
	for i := range g.chains {
		c := &g.chains[i]
		for m := range c.out {
			scale := complex(1, 0)
			for range m + 1 {
				scale *= complex(c.rate, 0)
			}
			state := filter.Line{Terms: []filter.Term{{Pole: c.pole, Power: m + 1, Residue: scale}}}
			state.Weights(end, period, w)
			z := append([]complex128(nil), w[s.Lead:s.Samples-s.Trail]...)
			c.size = append(c.size, most*sumAbs(z))
			c.states = append(c.states, g.coordinates(z))
		}
	}
	for i := range g.chains { // all states in the full number of coordinates
		for m, v := range g.chains[i].states {
			g.chains[i].states[m] = append(v, make([]complex128, len(g.basis)-len(v))...)
		}
	}
	g.choose()
	return g
}

// fastestTime is the shortest time constant 1/|Re p|, ns.
func (g *afterglow) fastestTime() float64 {
	shortest := math.Inf(1)
	for _, c := range g.chains {
		shortest = min(shortest, 1/c.rate)
	}
	return shortest
}

// coordinates gives z in the basis, which grows when z is outside it. z is consumed. A remainder under 1e-15 of z is
// rounding: it would be a direction of noise.
func (g *afterglow) coordinates(z []complex128) []complex128 {
	before := norm(z)
	x := make([]complex128, len(g.basis))
	for range 2 { // twice is enough: Parlett, The Symmetric Eigenvalue Problem (1980), section 6.9
		for j, b := range g.basis {
			a := inner(b, z)
			x[j] += a
			for k := range z {
				z[k] -= a * b[k]
			}
		}
	}
	if rest := norm(z); rest > 1e-15*before {
		for k := range z {
			z[k] /= complex(rest, 0)
		}
		g.basis = append(g.basis, z)
		x = append(x, complex(rest, 0))
	}
	return x
}

// functional gives, in coordinates, the derivative of the given order of v (of the chains for which keep is true) at t.
func (g *afterglow) functional(t float64, order int, keep []bool) []complex128 {
	f := make([]complex128, len(g.basis))
	for i := range g.chains {
		if keep != nil && !keep[i] {
			continue
		}
		c := &g.chains[i]
		for m, r := range c.grown(c.derived(order), t) {
			for k, v := range c.states[m] {
				f[k] += r * v
			}
		}
	}
	return f
}

// derived gives the outputs of the derivative of the given order: d/dt sum o_m z_m = sum (p o_m + a o_{m+1}) z_m.
func (c *glowChain) derived(order int) []complex128 {
	o := append([]complex128(nil), c.out...)
	for range order {
		for m := range o {
			o[m] *= c.pole
			if m+1 < len(o) {
				o[m] += complex(c.rate, 0) * o[m+1]
			}
		}
	}
	return o
}

// grown gives the functional of the states at 0 that outputs o of the states at t are: z_m(t) = e^{pt} sum_j (a t)^j/j! z_{m-j}.
func (c *glowChain) grown(o []complex128, t float64) []complex128 {
	rho := make([]complex128, len(o))
	decay := cmplx.Exp(c.pole * complex(t, 0))
	for m := range o {
		power := decay
		for j := 0; j <= m; j++ {
			if j > 0 {
				power *= complex(c.rate*t/float64(j), 0)
			}
			rho[m-j] += o[m] * power
		}
	}
	return rho
}

// ceiling bounds the derivative of the given order of one chain at every instant from t on, a priori: (2).
func (c *glowChain) ceiling(t float64, order int) float64 {
	o := c.derived(order)
	sum, peak := 0.0, 1.0 // peak is (j/e)^j / j!
	for j := range o {
		if j > 0 {
			peak = math.Exp(float64(j)*(math.Log(float64(j))-1) - lgamma(j+1))
		}
		for m, r := range c.grown(o[j:], t) {
			sum += peak * cmplx.Abs(r) * c.size[m]
		}
	}
	return sum
}

func lgamma(n int) float64 {
	v, _ := math.Lgamma(float64(n))
	return v
}

// choose picks instants greedily, each time the one whose weights are farthest from the span of those before, from a
// grid that is geometric from a hundredth of the fastest pole's time to fifteen of the slowest's.
func (g *afterglow) choose() {
	if len(g.basis) == 0 {
		return
	}
	fastest, slowest := 0.0, math.Inf(1)
	for _, c := range g.chains {
		fastest, slowest = max(fastest, cmplx.Abs(c.pole)), min(slowest, c.rate)
	}
	var grid [][]complex128
	var at []float64
	for t := 0.0; t <= 15/slowest; t = max(0.01/fastest, 1.15*t) {
		grid = append(grid, g.functional(t, 0, nil))
		at = append(at, t)
	}
	whole := append([][]complex128(nil), grid...)
	for i := range grid {
		grid[i] = append([]complex128(nil), grid[i]...)
	}
	largest := 0.0
	for range g.basis {
		best, chosen := 0.0, -1
		for i, v := range grid {
			if n := norm(v); n > best {
				best, chosen = n, i
			}
		}
		largest = max(largest, best)
		if chosen < 0 || best <= 1e-13*largest {
			return
		}
		unit := grid[chosen]
		rest := append([]complex128(nil), whole[chosen]...)
		var row []complex128
		for range 2 {
			for j, p := range g.picks {
				a := inner(p.unit, rest)
				for k := range rest {
					rest[k] -= a * p.unit[k]
				}
				if j == len(row) {
					row = append(row, 0)
				}
				row[j] += a
			}
		}
		n := norm(rest)
		for k := range unit {
			unit[k] = rest[k] / complex(n, 0)
		}
		g.picks = append(g.picks, pick{allowed: g.allows.After(at[chosen]), unit: unit, row: append(row, complex(n, 0))})
		grid[chosen] = nil // its memory is the unit now
		for _, v := range grid {
			if v == nil {
				continue
			}
			a := inner(unit, v)
			for k := range v {
				v[k] -= a * unit[k]
			}
		}
	}
}

// bound bounds |f x| by (3) when no ring-out exceeds its limit: the least over the first 0, 1, 2... picks.
func (g *afterglow) bound(f []complex128) float64 {
	rest := append([]complex128(nil), f...)
	best := g.most * g.oneNorm(rest)
	var along []complex128
	for i, p := range g.picks {
		a := inner(p.unit, rest)
		for k := range rest {
			rest[k] -= a * p.unit[k]
		}
		along = append(along, a)
		// f = sum_j along_j unit_j + rest = sum_j beta_j weights(s_j) + rest: back substitution.
		c := append([]complex128(nil), along...)
		betas := 0.0
		for j := i; j >= 0; j-- {
			beta := c[j] / g.picks[j].row[j]
			if g.real {
				betas += cmplx.Abs(beta) * g.picks[j].allowed
			} else {
				betas += (math.Abs(real(beta)) + math.Abs(imag(beta))) * g.picks[j].allowed
			}
			for l := 0; l < j; l++ {
				c[l] -= beta * g.picks[j].row[l]
			}
		}
		// The remainder by the cheap norm: it is small wherever it matters.
		best = min(best, betas+g.most*math.Sqrt(float64(g.free))*norm(rest))
	}
	return best
}

// oneNorm is sum_k |f_k| over the free samples, or a little more for very long spans.
func (g *afterglow) oneNorm(f []complex128) float64 {
	if g.free > exactNorms {
		return math.Sqrt(float64(g.free)) * norm(f)
	}
	sum := 0.0
	for k := range g.free {
		v := complex128(0)
		for j, b := range g.basis {
			v += f[j] * b[k]
		}
		sum += cmplx.Abs(v)
	}
	return sum
}

// instants places the rows: from 0, each as late as (1) allows.
func (g *afterglow) instants() ([]float64, error) {
	var list []float64
	alive := make([]bool, len(g.chains))
	fast, later := g.allows.Fast, g.allows.After(math.Inf(1))
	for t := 0.0; ; {
		list = append(list, t)
		// L from here on, and whether it changes later.
		limit, changes := g.allows.Limit, later != g.allows.Limit
		if t >= fast {
			limit, changes = later, false
		}
		e := betweenShare * limit
		eta, living, lasting := g.split(t, deadShare*e, alive)
		if living == 0 || lasting {
			if changes && later < limit {
				t = fast
				continue
			}
			return list, nil
		}
		if len(list) >= maxInstants {
			return nil, fmt.Errorf("the line rings on in too many ways for a limit of %g of full scale", limit)
		}
		var taylor [taylorTerms + 1]float64
		for j := range taylorTerms {
			taylor[j] = g.bound(g.functional(t, 2+j, alive))
		}
		for i := range g.chains {
			if alive[i] {
				taylor[taylorTerms] += g.chains[i].ceiling(t, 2+taylorTerms)
			}
		}
		excess := func(d float64) float64 {
			sum, power := 0.0, d*d/8
			for j, v := range taylor {
				if j > 0 {
					power *= d / float64(j)
				}
				sum += power * v
			}
			return sum - (e - 2*eta)
		}
		// The excess grows with d: double, then halve the bracket. A thousandth in d is near enough.
		lo := t * 1e-9
		if lo == 0 {
			lo = 1e-9
		}
		if excess(lo) > 0 {
			return nil, fmt.Errorf("the line rings too fast for a limit of %g of full scale", limit)
		}
		hi := 2 * lo
		for excess(hi) <= 0 && hi < 1e18 {
			lo, hi = hi, 2*hi
		}
		for hi-lo > 1e-3*lo {
			if mid := (lo + hi) / 2; excess(mid) <= 0 {
				lo = mid
			} else {
				hi = mid
			}
		}
		if t += lo; changes {
			t = min(t, fast)
		}
	}
}

// split marks as dead, from the weakest on, the chains that together stay under most after t, and says how much that
// is, how many live, and whether what lives is a single real and simple pole.
func (g *afterglow) split(t, most float64, alive []bool) (eta float64, living int, lasting bool) {
	sizes := make([]float64, len(g.chains))
	for i := range g.chains {
		alive[i] = true
		sizes[i] = g.chains[i].ceiling(t, 0)
	}
	living = len(g.chains)
	for living > 0 {
		weakest := -1
		for i := range sizes {
			if alive[i] && (weakest < 0 || sizes[i] < sizes[weakest]) {
				weakest = i
			}
		}
		if eta+sizes[weakest] > most {
			break
		}
		eta += sizes[weakest]
		alive[weakest] = false
		living--
	}
	if living == 1 {
		for i := range g.chains {
			if alive[i] {
				lasting = imag(g.chains[i].pole) == 0 && len(g.chains[i].out) == 1
			}
		}
	}
	return eta, living, lasting
}

func inner(a, b []complex128) complex128 {
	sum := complex128(0)
	for k, v := range a {
		sum += cmplx.Conj(v) * b[k]
	}
	return sum
}

func norm(a []complex128) float64 {
	sum := 0.0
	for _, v := range a {
		sum += real(v)*real(v) + imag(v)*imag(v)
	}
	return math.Sqrt(sum)
}

func sumAbs(a []complex128) float64 {
	sum := 0.0
	for _, v := range a {
		sum += cmplx.Abs(v)
	}
	return sum
}
