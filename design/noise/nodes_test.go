package noise

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"
)

// A sequence is free evolution of length T with instantaneous pi pulses, under V = Z/2. Its filter function is F = F_c(wT)/(2 w^2), F_c as in
// Cywinski, Lutchyn, Nave, Das Sarma 2008, Phys. Rev. B 77, 174509.
type sequence struct {
	name   string
	pulses []float64 // in shares of T
}

func echo() sequence { return sequence{"echo", []float64{0.5}} }

func cpmg(n int) sequence {
	s := sequence{name: fmt.Sprintf("CPMG-%d", n)}
	for j := range n {
		s.pulses = append(s.pulses, (float64(j)+0.5)/float64(n))
	}
	return s
}

// udd gives the pulses of Uhrig 2007, Phys. Rev. Lett. 98, 100504: at sin^2(pi j/(2n+2)).
func udd(n int) sequence {
	s := sequence{name: fmt.Sprintf("UDD-%d", n)}
	for j := 1; j <= n; j++ {
		sin := math.Sin(math.Pi * float64(j) / float64(2*n+2))
		s.pulses = append(s.pulses, sin*sin)
	}
	return s
}

func sequences() []sequence { return []sequence{{name: "free"}, echo(), cpmg(2), cpmg(4), udd(5)} }

// edges gives the ends of the pieces between pulses.
func (q sequence) edges() []float64 { return append(append([]float64{0}, q.pulses...), 1) }

// filter gives F(w) of a gate of length T: ||Z/2||_F^2/2 = 1/4 times the square of int_0^T y(t) e^{iwt} dt, y the sign that the pulses turn; each
// piece is integrated about its middle.
func (q sequence) filter(w, T float64) float64 {
	var toggled complex128
	edges, sign := q.edges(), 1.0
	for j := range len(edges) - 1 {
		middle, width := (edges[j]+edges[j+1])/2, edges[j+1]-edges[j]
		toggled += complex(sign*width*sinc(w*T*width/2), 0) * cmplx.Rect(1, w*T*middle)
		sign = -sign
	}
	h := cmplx.Abs(toggled)
	return T * T * h * h / 4
}

// sinc gives sin(x)/x.
func sinc(x float64) float64 {
	if math.Abs(x) < 1e-4 {
		return 1 - x*x/6
	}
	return math.Sin(x) / x
}

// cywinski gives F_c = 2 w^2 F.
func (q sequence) cywinski(z float64) float64 { return 2 * z * z * q.filter(z, 1) }

// bound gives B of Rule.Remainder: V_I has norm 1/sqrt 2 at both ends and jumps by twice that at each pulse.
func (q sequence) bound() float64 {
	total := (2 + 2*float64(len(q.pulses))) * math.Sqrt(0.5)
	return total * total / 2
}

// driven gives F of Z/2 under a resonant field along X that makes so many turns: V_I turns in a plane, and each circular part
// contributes (1/8) |int e^{i(w -+ Omega)t} dt|^2.
func driven(w, T, turns float64) float64 {
	omega := 2 * math.Pi * turns / T
	a, b := T*sinc((w-omega)*T/2), T*sinc((w+omega)*T/2)
	return (a*a + b*b) / 8
}

// near fails unless got is want within a relative tolerance.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: got %.12g, want %.12g within %g: off by %.3g", what, got, want, tolerance, got/want-1)
	}
}

// made ends the test unless a constructor has worked.
func made(t *testing.T) func(s *Spectrum, err error) *Spectrum {
	return func(s *Spectrum, err error) *Spectrum {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
}

func TestFilterConventions(t *testing.T) {
	// CALC: the closed forms evaluated independently.
	for _, c := range []struct {
		q       sequence
		z, want float64
	}{
		{sequence{}, 0.5, 1.2241743811e-1}, {sequence{}, 1, 4.5969769413e-1}, {echo(), 0.5, 1.9328750478e-3}, {echo(), 1, 2.9972058307e-2},
		{cpmg(2), 1, 4.7323522307e-4}, {cpmg(4), 1, 2.8426596191e-5},
	} {
		near(t, c.q.name, c.q.cywinski(c.z), c.want, 1e-9)
	}
	// The closed forms of Cywinski et al. 2008, and the order n + 1 to which Uhrig's amplitude vanishes.
	for _, z := range []float64{0.3, 2, 7.7, 40.3} {
		near(t, "free", sequence{}.cywinski(z), 2*math.Pow(math.Sin(z/2), 2), 1e-11)
		near(t, "echo", echo().cywinski(z), 8*math.Pow(math.Sin(z/4), 4), 1e-9)
		for _, n := range []int{2, 4} {
			m := float64(n)
			near(t, fmt.Sprint("CPMG ", n), cpmg(n).cywinski(z), 8*math.Pow(math.Sin(z/4/m), 4)*math.Pow(math.Sin(z/2)/math.Cos(z/2/m), 2), 1e-6)
		}
	}
	if order := math.Log2(udd(5).cywinski(1)/udd(5).cywinski(0.5)) / 2; !(math.Abs(order-6) <= 0.1) {
		t.Errorf("the amplitude of UDD with 5 pulses vanishes as the power %.2f", order)
	}
}

// adaptive integrates f from a to b by Simpson's rule, halved where that changes anything.
func adaptive(f func(float64) float64, a, b, tolerance float64) float64 {
	var step func(a, b, fa, fm, fb, whole, tolerance float64, depth int) float64
	step = func(a, b, fa, fm, fb, whole, tolerance float64, depth int) float64 {
		m := (a + b) / 2
		fl, fr := f((a+m)/2), f((m+b)/2)
		left, right := (m-a)/6*(fa+4*fl+fm), (b-m)/6*(fm+4*fr+fb)
		if d := left + right - whole; depth > 14 || math.Abs(d) <= 15*tolerance {
			return left + right + d/15
		}
		return step(a, m, fa, fl, fm, left, tolerance/2, depth+1) + step(m, b, fm, fr, fb, right, tolerance/2, depth+1)
	}
	fa, fm, fb := f(a), f((a+b)/2), f(b)
	return step(a, b, fa, fm, fb, (b-a)/6*(fa+4*fm+fb), tolerance, 0)
}

// exact integrates (1/pi) S F over the band of S, which must end, in pieces that are neither longer than two periods of F nor than a factor of two.
func exact(s *Spectrum, filter func(w float64) float64, T float64) float64 {
	f := func(w float64) float64 { return s.S(w) * filter(w) / math.Pi }
	sum, low, high := 0.0, s.Low(), s.High()
	if low == 0 { // S is flat there
		low = min(high, 1e-3/T)
		sum += adaptive(f, 0, low, 1e-16)
	}
	for a := low; a < high; {
		b := min(high, 2*a, a+4*math.Pi/T)
		for _, point := range s.w { // kinks
			if point > a && point < b {
				b = point
			}
		}
		sum += adaptive(f, a, b, 1e-10*f((a+b)/2)*(b-a)+1e-16)
		a = b
	}
	return sum
}

// ornstein gives the sum in closed form for Lorentzian noise: <phi^2>/4 with the correlation sigma^2 exp(-|t|/tau), integrated over pairs of pieces.
func ornstein(q sequence, sigma, tau, T float64) float64 {
	edges, sum := q.edges(), 0.0
	for i := range len(edges) - 1 {
		for j := range i + 1 {
			a, b, c, d := edges[j]*T/tau, edges[j+1]*T/tau, edges[i]*T/tau, edges[i+1]*T/tau
			if i == j {
				x := d - c
				pair := x + math.Expm1(-x)
				if x < 1e-2 {
					pair = x * x / 2 * (1 - x/3*(1-x/4*(1-x/5*(1-x/6*(1-x/7)))))
				}
				sum += 2 * pair
				continue
			}
			sign := 2.0
			if (i-j)%2 == 1 {
				sign = -2
			}
			sum += sign * math.Exp(b-c) * math.Expm1(a-b) * math.Expm1(c-d)
		}
	}
	return sigma * sigma * tau * tau * sum / 4
}

func sum(r Rule, f func(w float64) float64) float64 {
	total := 0.0
	for k, w := range r.Frequency {
		total += r.Weight[k] * f(w)
	}
	return total
}

// checkRule fails unless r is what the type says.
func checkRule(t *testing.T, r Rule, n int) {
	t.Helper()
	if len(r.Frequency) != len(r.Weight) || len(r.Weight) == 0 || len(r.Weight) > n {
		t.Errorf("%d frequencies and %d weights of at most %d", len(r.Frequency), len(r.Weight), n)
	}
	last := 0.0
	for k, w := range r.Frequency {
		if !(w > last && w <= r.Cut) || !(r.Weight[k] > 0 && r.Weight[k] < math.Inf(1)) {
			t.Errorf("node %d at %g after %g with weight %g, cut at %g", k, w, last, r.Weight[k], r.Cut)
		}
		last = w
	}
	if !(r.Remainder >= 0 && r.Remainder < math.Inf(1)) {
		t.Errorf("remainder %g", r.Remainder)
	}
}

// A phase phi of the noise leaves 1 - F_pro = <sin^2(phi/2)>, <phi^2>/4 to first order, with <phi^2> known in closed form.
func TestClosedForms(t *testing.T) {
	const T, sigma, n = 50.0, 2e-3, 512
	free := func(w float64) float64 { return sequence{}.filter(w, T) }
	for _, tau := range []float64{1, 20, 50, 700, 1e9} {
		s := made(t)(Lorentzian(sigma, tau))
		x := T / tau
		if tau < 1e9 {
			near(t, fmt.Sprint("free evolution, tau ", tau), sum(s.Nodes(T, n), free), sigma*sigma*tau*tau/2*(x+math.Expm1(-x)), 1e-6)
			near(t, fmt.Sprint("echo, tau ", tau), sum(s.Nodes(T, n), func(w float64) float64 { return echo().filter(w, T) }),
				sigma*sigma*tau*tau/2*(x-3+4*math.Exp(-x/2)-math.Exp(-x)), 1e-5)
		} else { // quasi-static
			near(t, "free evolution, still noise", sum(s.Nodes(T, n), free), sigma*sigma*T*T/4*(1-x/3), 1e-10)
		}
	}
	// White noise of level S dephases at the rate S/2 whatever the pulses: <phi^2> = S T, but for what lies above the limit, (2/pi)/(w_c T) of it for each
	// pair of like ends in the mean.
	s := made(t)(White(3e-6, 0, 1e6/T))
	for _, q := range sequences() {
		missing := 2 / math.Pi / 1e6 * (1 + 2*float64(len(q.pulses)))
		near(t, q.name+", white", sum(s.Nodes(T, n), func(w float64) float64 { return q.filter(w, T) }), 3e-6*T/4*(1-missing), 1e-5)
	}
}

// The comment of Nodes states these figures.
func TestAccuracy(t *testing.T) {
	const T = 80.0
	spectra := []*Spectrum{made(t)(PowerLaw(1e-6, 1, 1, 1e-9, 20000/T)), made(t)(White(1e-6, 0, 20000/T)),
		made(t)(Lorentzian(1e-3, T/20)), made(t)(Lorentzian(1e-3, T)), made(t)(Lorentzian(1e-3, 1e4*T))}
	nodes := []int{8, 16, 32, 64, 128}
	simple, pulsed := []float64{7e-2, 8e-3, 2e-4, 3e-5, 4e-6}, []float64{0.8, 8e-2, 2e-2, 1e-2, 2e-4}
	check := func(name string, s *Spectrum, filter func(w float64) float64, want float64, allowed []float64) {
		t.Helper()
		for i, n := range nodes {
			r := s.Nodes(T, n)
			checkRule(t, r, n)
			near(t, fmt.Sprintf("%s, %d nodes", name, n), sum(r, filter), want, allowed[i])
		}
	}
	for i, s := range spectra {
		for j, q := range sequences() {
			filter := func(w float64) float64 { return q.filter(w, T) }
			want := 0.0
			if s.tau > 0 {
				want = ornstein(q, s.sigma, s.tau, T)
			} else {
				want = exact(s, filter, T)
			}
			allowed := simple
			if j >= 2 {
				allowed = pulsed
			}
			check(fmt.Sprintf("spectrum %d, %s", i, q.name), s, filter, want, allowed)
		}
		if s.tau == 0 {
			filter := func(w float64) float64 { return driven(w, T, 1) }
			check(fmt.Sprintf("spectrum %d, driven", i), s, filter, exact(s, filter, T), simple)
		}
	}
	for i, n := range nodes {
		high := 2 * float64(n) / T
		for _, s := range []*Spectrum{made(t)(PowerLaw(1e-6, 1, 1, 1e-9, high)), made(t)(White(1e-6, 0, high))} {
			for _, q := range sequences() {
				filter := func(w float64) float64 { return q.filter(w, T) }
				r := s.Nodes(T, n)
				checkRule(t, r, n)
				if r.Remainder != 0 || r.Cut != high {
					t.Errorf("remainder %g, cut at %g of %g", r.Remainder, r.Cut, high)
				}
				near(t, fmt.Sprintf("%s to %g, %d nodes", q.name, high, n), sum(r, filter), exact(s, filter, T), []float64{4e-7, 1e-7, 1e-7, 1e-7, 1e-7}[i])
			}
		}
	}
}

// rough gives a spectrum through points that jump.
func rough(t *testing.T, n int, low, high float64) *Spectrum {
	t.Helper()
	random := rand.New(rand.NewPCG(7, 1))
	var w, s []float64
	for i := range n {
		w = append(w, low*math.Pow(high/low, (float64(i)+0.8*random.Float64())/float64(n)))
		s = append(s, 1e-6*math.Exp(6*random.Float64()))
	}
	return made(t)(Tabulated(w, s))
}

func TestRoughSpectra(t *testing.T) {
	const T = 40.0
	bump := made(t)(Tabulated([]float64{1 / T, 19.9 / T, 20 / T, 20.1 / T, 60 / T}, []float64{1e-9, 1e-9, 1, 1e-9, 1e-9}))
	cliff := made(t)(Tabulated([]float64{1 / T, 10 / T, 10.5 / T, 60 / T}, []float64{1, 1, 1e-30, 1e-30}))
	for i, s := range []*Spectrum{rough(t, 30, 0.01/T, 50/T), rough(t, 3000, 0.01/T, 50/T), bump, cliff,
		made(t)(White(1, 30/T, 31/T)), made(t)(White(1, 5000/T, 5020/T)), made(t)(PowerLaw(1, 1, 2, 0.3/T, 40/T)), made(t)(PowerLaw(1, 1, -2, 0.3/T, 40/T))} {
		for _, q := range sequences() {
			filter := func(w float64) float64 { return q.filter(w, T) }
			r := s.Nodes(T, 48)
			checkRule(t, r, 48)
			tolerance := 2e-6
			if s == bump {
				tolerance = 3e-5 // UDD has a zero beside it
			}
			near(t, fmt.Sprintf("spectrum %d, %s", i, q.name), sum(r, filter), exact(s, filter, T), tolerance)
		}
		r := s.Nodes(T, 48)
		near(t, fmt.Sprintf("spectrum %d, variance", i), sum(r, func(float64) float64 { return 1 }), s.Variance(), 1e-11)
		near(t, fmt.Sprintf("spectrum %d, second moment", i), sum(r, func(w float64) float64 { return w * w }), s.moment(2, 0, s.High())/math.Pi, 1e-11)
	}
}

func TestFewNodesSuffice(t *testing.T) {
	const T = 40.0
	for _, c := range []struct {
		high  float64
		nodes int
	}{{4, 6}, {20, 16}, {70, 47}, {300, 191}} {
		s := made(t)(White(1, 0.1/T, c.high/T))
		r := s.Nodes(T, 500)
		checkRule(t, r, c.nodes)
		if len(r.Weight) != c.nodes || r.Remainder != 0 {
			t.Errorf("%d nodes to %g/T, remainder %g", len(r.Weight), c.high, r.Remainder)
		}
		for _, q := range sequences() {
			filter := func(w float64) float64 { return q.filter(w, T) }
			near(t, fmt.Sprintf("%s to %g/T", q.name, c.high), sum(r, filter), exact(s, filter, T), 1e-9)
		}
	}
}

// The comment of Nodes states these figures too.
func TestSteepNoise(t *testing.T) {
	const T = 80.0
	for _, c := range []struct{ exponent, tolerance float64 }{{1.5, 1e-5}, {2, 1e-5}, {3, 1e-3}, {4, 0.021}} {
		s := made(t)(PowerLaw(1e-6, 1, c.exponent, 1e-5, 20000/T))
		for _, q := range []sequence{echo(), cpmg(2)} {
			filter := func(w float64) float64 { return q.filter(w, T) }
			near(t, fmt.Sprintf("1/f^%g, %s", c.exponent, q.name), sum(s.Nodes(T, 64), filter), exact(s, filter, T), c.tolerance)
		}
	}
}

func TestSlowNoise(t *testing.T) {
	const T = 40.0
	s := made(t)(White(2, 0, 0.05/T))
	r := s.Nodes(T, 8)
	if len(r.Weight) != 1 || r.Remainder != 0 || r.Cut != s.High() {
		t.Fatalf("%d nodes, remainder %g, cut at %g", len(r.Weight), r.Remainder, r.Cut)
	}
	near(t, "weight", r.Weight[0], s.Variance(), 1e-14)
	near(t, "frequency", r.Frequency[0], s.High()/math.Sqrt(3), 1e-14)
	// Noise that is slow almost alone: what the fast nodes weigh is not lost beside the slow one.
	slow := made(t)(Lorentzian(1e-3, 1e12))
	r = slow.Nodes(T, 16)
	checkRule(t, r, 16)
	near(t, "slow weight", r.Weight[0], 1e-6, 1e-9)
	fast := 0.0
	for _, v := range r.Weight[1:] {
		fast += v
	}
	if low, high := 0.99*slow.moment(0, 0.1/T, r.Cut/2)/math.Pi, 1.01*slow.moment(0, 0.1/T, math.Inf(1))/math.Pi; !(fast >= low && fast <= high) {
		t.Errorf("the fast nodes weigh %g; wanted %g to %g", fast, low, high)
	}
}

func TestRemainder(t *testing.T) {
	const T = 40.0
	for _, exponent := range []float64{-2, -1, 0, 1} {
		s := made(t)(PowerLaw(1e-6, 1, exponent, 1e-4, 3000/T))
		for _, q := range sequences() {
			filter := func(w float64) float64 { return q.filter(w, T) }
			want := exact(s, filter, T)
			for _, n := range []int{2, 3, 5, 8, 13, 21, 40, 100} {
				r := s.Nodes(T, n)
				checkRule(t, r, n)
				if off := math.Abs(sum(r, filter) - want); !(off <= 1.01*q.bound()*r.Remainder+0.05*want) {
					t.Errorf("exponent %g, %s, %d nodes: wrong by %g; the bound says %g", exponent, q.name, n, off, q.bound()*r.Remainder)
				}
			}
		}
	}
	// By its definition.
	s := made(t)(White(3, 0, 500/T))
	r := s.Nodes(T, 32)
	middle := (0.1/T + r.Cut) / 2
	lost := func(w float64) float64 {
		u := max(0, min(1, (w-middle)/(r.Cut-middle)))
		return 3 / math.Pi * (u - math.Sin(2*math.Pi*u)/(2*math.Pi)) / (w * w)
	}
	near(t, "remainder", r.Remainder, adaptive(lost, middle, r.Cut, 1e-12)+adaptive(lost, r.Cut, 500/T, 1e-12), 1e-9)
	near(t, "cut", r.Cut, (0.1+31*2.8)/T, 1e-12)
}

func TestNodesAreTheSameTwice(t *testing.T) {
	s := rough(t, 500, 1e-4, 10)
	a, b := s.Nodes(30, 64), s.Nodes(30, 64)
	if !slices.Equal(a.Frequency, b.Frequency) || !slices.Equal(a.Weight, b.Weight) || a.Remainder != b.Remainder {
		t.Error("two calls differ")
	}
}

func TestNodesScale(t *testing.T) {
	// Frequencies go as 1/T, weights as the variance.
	a := made(t)(PowerLaw(1, 1, 1, 1e-3, 50)).Nodes(10, 24)
	b := made(t)(PowerLaw(5, 1000, 1, 1, 5e4)).Nodes(0.01, 24)
	for k := range a.Weight {
		near(t, "frequency", b.Frequency[k], 1000*a.Frequency[k], 1e-9)
		near(t, "weight", b.Weight[k], 5000*a.Weight[k], 1e-9)
	}
}

func TestNodesRefuse(t *testing.T) {
	s := made(t)(White(1, 0, 1))
	for _, c := range []struct {
		T float64
		n int
	}{{0, 8}, {-1, 8}, {math.NaN(), 8}, {math.Inf(1), 8}, {1, 1}, {1, 1 << 15}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("no panic for %v", c)
				}
			}()
			s.Nodes(c.T, c.n)
		}()
	}
}

// Every corner of the ranges gives a rule.
func TestNodesAtExtremes(t *testing.T) {
	neighbours := math.Nextafter(1, 2)
	for _, s := range []*Spectrum{
		made(t)(White(1e60, 0, 1e6)), made(t)(White(1e-60, 0, 1e-21)), made(t)(White(1, 1, neighbours)), made(t)(White(1, 0.999e6, 1e6)),
		made(t)(PowerLaw(1e-30, 1, 4, 1e-10, 1e6)), made(t)(PowerLaw(1e-20, 1, -4, 1e-9, 1e6)), made(t)(PowerLaw(1, 1, 1, 1, neighbours)),
		made(t)(Lorentzian(1e20, 1e20)), made(t)(Lorentzian(1e-20, 1e20)), made(t)(Lorentzian(1e20, 1e-20)), made(t)(Lorentzian(1e-20, 1e-20)),
		made(t)(Tabulated([]float64{1, neighbours, 10, 1e6}, []float64{1e-60, 1e60, 1e-60, 1e60})),
	} {
		for _, T := range []float64{1e-6, 1e-3, 1, 1e3, 1e9} {
			for _, n := range []int{2, 9, 70} {
				checkRule(t, s.Nodes(T, n), n)
			}
		}
	}
}
