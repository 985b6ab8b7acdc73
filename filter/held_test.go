package filter

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"
)

// must fails the test on an error from a constructor.
func must(t testing.TB, l Line, err error) Line {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func bessel(t testing.TB, order int, corner float64) Line {
	t.Helper()
	l, err := Bessel(order, corner)
	return must(t, l, err)
}

func pole(t testing.TB, tau float64) Line {
	t.Helper()
	l, err := SinglePole(tau)
	return must(t, l, err)
}

func tails(t testing.TB, list ...Tail) Line {
	t.Helper()
	l, err := Tails(list)
	return must(t, l, err)
}

func cascade(t testing.TB, sections ...Line) Line {
	t.Helper()
	l, err := Cascade(sections...)
	return must(t, l, err)
}

// rackB is the line of the demo profile (invented): delay, Bessel low-pass, one tail.
func rackB(t testing.TB) Line {
	t.Helper()
	d, err := Delay(3.2)
	return cascade(t, must(t, d, err), bessel(t, 2, 0.2), tails(t, Tail{-0.015, 30}))
}

// line unwraps what a constructor returned: line(t)(Butterworth(4, 0.2)).
func line(t testing.TB) func(Line, error) Line {
	return func(l Line, err error) Line {
		t.Helper()
		return must(t, l, err)
	}
}

// zoo is the set of lines that every identity is tested on.
func zoo(t testing.TB) map[string]Line {
	t.Helper()
	one := pole(t, 0.8)
	return map[string]Line{
		"through":           Through(),
		"single pole":       one,
		"nearly still pole": pole(t, 1e9),
		"very fast pole":    pole(t, 1e-4),
		"bessel 2":          bessel(t, 2, 0.2),
		"bessel 8":          bessel(t, 8, 0.31),
		"tails":             tails(t, Tail{-0.015, 30}, Tail{0.04, 300}, Tail{0.01, 1e6}),
		"rack B":            rackB(t),
		"two equal poles":   cascade(t, one, one),
		"five equal poles":  cascade(t, one, one, one, one, one),
		"bessels near":      cascade(t, bessel(t, 5, 0.2), bessel(t, 3, 0.31), bessel(t, 5, 0.201)),
		"bessel twice":      cascade(t, bessel(t, 4, 0.2), bessel(t, 4, 0.2), tails(t, Tail{0.02, 20})),
		"nearly equal":      cascade(t, pole(t, 1), pole(t, 1.0001), pole(t, 1.01), tails(t, Tail{0.3, 1.001})),
		"butterworth 8":     line(t)(Butterworth(8, 0.2)),
		"damped 8":          line(t)(CriticallyDamped(8, 0.2)),
		"gaussian 7":        line(t)(GaussianLike(7, 0.2)),
		"allpass":           line(t)(FractionalDelay(0.7)),
		"AC-coupled":        cascade(t, bessel(t, 2, 0.2), line(t)(ACCoupling(40))),
		"corner slope":      line(t)(line(t)(Butterworth(3, 0.2)).CornerSlope()),
		"delay slope":       line(t)(cascade(t, pole(t, 0.9), tails(t, Tail{-0.1, 30})).DelaySlope()),
		"resonator":         line(t)(Resonator(-0.05, 0.2)),
		"resonance":         cascade(t, bessel(t, 3, 0.3), line(t)(Resonance(0.04, 0.01, 0.3-0.1i))),
		"asymmetric": {Delay: 2, Direct: 0.2 - 0.1i, Terms: []Term{
			{-0.4 + 2i, 1, 0.1 + 0.3i}, {-0.4 + 2i, 3, -0.2 + 0.05i}, {-1.5 - 0.2i, 2, 0.7i}, {-0.01, 1, 0.002}}},
		"high quality": {Terms: []Term{{-1e-3 + 2i, 1, 0.01}, {-1e-3 - 2i, 1, 0.01}, {-0.02 + 1i, 2, 0.001i}}},
	}
}

func randomSamples(rng *rand.Rand, n int) []complex128 {
	x := make([]complex128, n)
	for k := range x {
		x[k] = complex(rng.NormFloat64(), rng.NormFloat64())
	}
	return x
}

// grid holds edges, instants just beside them, random times, some before arrival
// and some long after n samples of h ns.
func grid(rng *rand.Rand, n int, h float64) []float64 {
	times := []float64{-5 * h, -0.3 * h, 0}
	for k := range n {
		edge := float64(k) * h
		times = append(times, edge, edge+1e-9*h, edge+h*rng.Float64()/2, edge+h*(0.5+rng.Float64()/2.1))
	}
	end := float64(n) * h
	times = append(times, end, end+0.1*h, end+0.1*h, end+7*h, 3*end, 50*end, 1e4*end)
	slices.Sort(times)
	return times
}

// slowImpulse is int_a^b of the impulse response of l without its direct part,
// transcribed from the definition with the antiderivative of v^{m-1}/(m-1)! e^{pv},
// e^{pv} sum_{j<m} (-1)^{m-1-j} v^j/j! p^{-(m-j)}.
// It loses digits where |p|b is small.
func slowImpulse(l Line, a, b float64) complex128 {
	sum := complex128(0)
	for _, t := range l.Terms {
		anti := func(v float64) complex128 {
			s := complex128(0)
			for j := 0; j < t.Power; j++ {
				sign := 1.0
				if (t.Power-1-j)%2 == 1 {
					sign = -1
				}
				s += complex(sign*math.Pow(v, float64(j))/math.Gamma(float64(j+1)), 0) / cmplx.Pow(t.Pole, complex(float64(t.Power-j), 0))
			}
			return s * cmplx.Exp(t.Pole*complex(v, 0))
		}
		sum += t.Residue * (anti(b) - anti(a))
	}
	return sum
}

// slowHeld is the convolution of the held input with the impulse response,
// sample by sample.
func slowHeld(l Line, x []complex128, h, t float64) complex128 {
	u := complex128(0)
	for k, v := range x {
		from, to := float64(k)*h, float64(k+1)*h
		if t < from {
			break
		}
		if t < to {
			u += v * (l.Direct + slowImpulse(l, 0, t-from))
		} else {
			u += v * slowImpulse(l, t-to, t-from)
		}
	}
	return u
}

// The definition, transcribed slowly, agrees with Held and with Weights at every
// kind of time. Lines on which the slow form itself loses digits (its
// antiderivative cancels when |p|h is tiny, powers make it worse) get the room
// that this loss needs.
func TestHeldIsTheConvolution(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	room := map[string]float64{"nearly still pole": 1e-6, "tails": 1e-12, "bessel 8": 1e-12, "five equal poles": 1e-11, "nearly equal": 1e-9, "bessel twice": 1e-10, "bessels near": 1e-6}
	for name, l := range zoo(t) {
		tol := 2e-13
		if r, ok := room[name]; ok {
			tol = r
		}
		for _, h := range []float64{1, 0.4, 2.5} {
			x := randomSamples(rng, 23)
			times := grid(rng, len(x), h)
			got := l.Held(x, h, times, nil)
			w := make([]complex128, len(x))
			for i, at := range times {
				want := slowHeld(l, x, h, at)
				if d := cmplx.Abs(got[i] - want); !(d <= tol) {
					t.Fatalf("%s, h %g, t %g: held %v, convolution %v, off by %g", name, h, at, got[i], want, d)
				}
				l.Weights(at, h, w)
				sum := complex128(0)
				for k := range x {
					sum += w[k] * x[k]
				}
				if d := cmplx.Abs(got[i] - sum); !(d <= 2e-13+1e-15*size(l)) { // roundings grow with the cancelling terms
					t.Fatalf("%s, h %g, t %g: held %v, weights %v, off by %g", name, h, at, got[i], sum, d)
				}
			}
		}
	}
}

// <Lx, y> = <x, L'y>, relative to |Lx||y|, for more and for fewer times than samples.
func TestTransposeIsTheAdjoint(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	inner := func(a, b []complex128) complex128 {
		s := complex128(0)
		for i := range a {
			s += cmplx.Conj(a[i]) * b[i]
		}
		return s
	}
	norm := func(a []complex128) float64 { return math.Sqrt(real(inner(a, a))) }
	for name, l := range zoo(t) {
		for _, n := range []int{0, 1, 2, 57, 400} {
			for _, times := range [][]float64{nil, {0.5}, grid(rng, 57, 1), grid(rng, 3, 0.7)} {
				const h = 0.7 // so that the grid of h = 1 falls anywhere
				x, y := randomSamples(rng, n), randomSamples(rng, len(times))
				lx := l.Held(x, h, times, nil)
				lty := l.HeldTranspose(y, h, times, n, nil)
				a, b := inner(lx, y), inner(x, lty)
				scale := norm(x) * norm(y) // every line here has a gain of order one
				if d := cmplx.Abs(a - b); !(d <= 1e-13*scale) {
					t.Fatalf("%s, %d samples, %d times: <Lx,y> %v, <x,L'y> %v, off by %g of %g", name, n, len(times), a, b, d, scale)
				}
			}
		}
	}
}

// An ascending grid built by adding steps lands beside the edges by roundings; the
// jump of a direct gain must not move to the wrong sample.
func TestEdgeBelongsToTheNewSample(t *testing.T) {
	l := tails(t, Tail{-0.2, 30})
	for _, h := range []float64{1, 0.1, 1 / 2.4, 0.8333333333333334} {
		x := make([]complex128, 600)
		for k := range x {
			x[k] = complex(float64(k%2), 0)
		}
		at := 0.0
		var times []float64
		for range x {
			times = append(times, at)
			at += h
		}
		u := l.Held(x, h, times, nil)
		for k := range x {
			want := slowHeld(l, x, h, (float64(k)+1e-12)*h)
			if !(cmplx.Abs(u[k]-want) <= 1e-10) {
				t.Fatalf("h %g, edge %d: %v, want %v", h, k, u[k], want)
			}
		}
	}
	if got := Through().Held([]complex128{1}, 1, []float64{-1e-15}, nil)[0]; got != 1 {
		t.Errorf("a rounding before arrival: %v, want 1", got)
	}
	u := Through().Held([]complex128{1, 2}, 1, []float64{-1e-6, 1 - 3e-9, 1 - 1e-14, 2}, nil)
	for i, want := range []complex128{0, 1, 2, 0} {
		if u[i] != want {
			t.Errorf("time %d: %v, want %v", i, u[i], want)
		}
	}
}

// The continuous output's component at w is the samples' times G(iw) h sinc(fh)
// e^{-iwh/2} (package comment). Gauss-Legendre with 5 nodes on
// panels of h/8, until the slowest pole has died away.
func TestSpectrumOfTheOutput(t *testing.T) {
	nodes := []float64{0, 0.5384693101056831, -0.5384693101056831, 0.9061798459386640, -0.9061798459386640}
	weights := []float64{0.5688888888888889, 0.4786286704993665, 0.4786286704993665, 0.2369268850561891, 0.2369268850561891}
	rng := rand.New(rand.NewPCG(5, 6))
	const h = 0.8
	for _, name := range []string{"single pole", "bessel 2", "bessel 8", "rack B", "five equal poles", "bessel twice", "nearly equal", "asymmetric", "through"} {
		l := zoo(t)[name]
		x := randomSamples(rng, 17)
		end := float64(len(x))*h + 40*l.SlowestTime() + 1
		panels := int(math.Ceil(end / (h / 8)))
		var times, weight []float64
		for i := range panels {
			a := float64(i) * h / 8
			for _, j := range []int{4, 2, 0, 1, 3} {
				times = append(times, a+h/16*(1+nodes[j]))
				weight = append(weight, h/16*weights[j])
			}
		}
		u := l.Held(x, h, times, nil)
		for _, w := range []float64{0, 0.3, -0.3, 1.7, -2.9, 2 * math.Pi / h, 9} {
			got, in := complex128(0), complex128(0)
			for i, v := range u {
				got += v * complex(weight[i], 0) * cmplx.Exp(complex(0, -w*times[i]))
			}
			for k, v := range x {
				in += v * cmplx.Exp(complex(0, -w*float64(k)*h))
			}
			sinc := 1.0
			if w != 0 {
				sinc = math.Sin(w*h/2) / (w * h / 2)
			}
			arrival := cmplx.Exp(complex(0, w*l.Delay)) // times count from arrival
			want := in * l.Response(w) * arrival * complex(h*sinc, 0) * cmplx.Exp(complex(0, -w*h/2))
			if d := cmplx.Abs(got - want); !(d <= 1e-11) {
				t.Errorf("%s, w %g: %v, want %v, off by %g", name, w, got, want, d)
			}
			if w != 0 && math.Abs(math.Abs(sinc)-HoldDroop(w/(2*math.Pi), h)) > 1e-15 {
				t.Errorf("w %g: hold droop %g, want %g", w, HoldDroop(w/(2*math.Pi), h), sinc)
			}
		}
	}
}

// A constant input gives the step response, and that tends to the DC gain.
func TestStepAndSteadyGain(t *testing.T) {
	for name, l := range zoo(t) {
		n := 50
		x := make([]complex128, n)
		for k := range x {
			x[k] = 1
		}
		for i, at := range []float64{0, 0.01, 0.5, 1, 7.3, 49.99} {
			u := l.Held(x, 1, []float64{at}, nil)[0]
			if d := cmplx.Abs(u - l.Step(at)); !(d <= 3e-13) {
				t.Errorf("%s, time %d: held ones %v, step %v", name, i, u, l.Step(at))
			}
		}
		sum := l.Direct
		for _, term := range l.Terms {
			sum += term.Residue / cmplx.Pow(-term.Pole, complex(float64(term.Power), 0))
		}
		for _, late := range []float64{100 * l.SlowestTime(), 1e15 * (1 + l.SlowestTime()), math.MaxFloat64, math.Inf(1)} {
			if d := cmplx.Abs(l.Step(late) - l.DC()); !(d <= 1e-12) || !(cmplx.Abs(l.DC()-sum) <= 1e-12) {
				t.Errorf("%s: step ends at %v at %g, DC %v, sum of residues %v", name, l.Step(late), late, l.DC(), sum)
			}
		}
		if l.Step(-1e-3) != 0 {
			t.Errorf("%s: response before arrival", name)
		}
		if l.Step(0) != l.Direct {
			t.Errorf("%s: step starts at %v, direct gain %v", name, l.Step(0), l.Direct)
		}
	}
	one := pole(t, 2.5)
	for _, at := range []float64{1e-12, 1e-6, 0.3, 2.5, 17, 90} {
		if got, want := real(one.Step(at)), -math.Expm1(-at/2.5); !(math.Abs(got-want) <= 4e-16*want) {
			t.Errorf("single pole at %g: %g, want %g", at, got, want)
		}
	}
}

// Equal poles have the closed form of the gamma distribution,
// 1 - e^{-v} sum_{j<m} v^j/j!, whose series e^{-v} sum_{j>=m} v^j/j! is
// accurate for small v.
func TestEqualPolesStep(t *testing.T) {
	for _, m := range []int{2, 3, 8, 20, MaxPower} {
		sections := make([]Line, m)
		for i := range sections {
			sections[i] = pole(t, 2)
		}
		l := cascade(t, sections...)
		if len(l.Terms) != 1 || l.Terms[0].Power != m {
			t.Fatalf("%d equal poles: terms %v", m, l.Terms)
		}
		for _, v := range []float64{1e-3, 0.1, 1, 5, float64(m), float64(m) + 1.5, 40, 200, 800, 1e5} {
			want, term := 0.0, math.Exp(-v)
			for j := 0; j < m+3000 && v < 600; j++ {
				if j >= m {
					want += term
				}
				term *= v / float64(j+1)
			}
			if v >= 600 {
				want = 1
			}
			if got := real(l.Step(2 * v)); !(math.Abs(got-want) <= 1e-13*want) {
				t.Errorf("%d equal poles at %g: %g, want %g", m, v, got, want)
			}
		}
	}
}

// Integration by parts links neighbours,
// p Q_m + Q_{m-1} = s^{m-1}/(m-1)! e^{ps}; tested on both sides of the switch
// between series and closed form and for poles near either axis.
func TestHeldIntegralsRecurrence(t *testing.T) {
	for _, p := range []complex128{-1, -1 + 0.5i, -0.1 - 3i, -1e-3 + 1i, -2 + 40i} {
		for _, s := range []float64{1e-6, 0.1, 1, 3, 8.9, 9.1, 33, 300} {
			c := chain{pole: p, rate: -real(p), n: MaxPower}
			var q, g state
			c.integrals(s, &q)
			c.growth(s, &g)
			for m := 1; m < c.n; m++ {
				a := complex(c.rate, 0)
				left := p*q[m] + a*q[m-1]
				right := a * g[m]
				scale := cmplx.Abs(p*q[m]) + cmplx.Abs(a*q[m-1]) + cmplx.Abs(right)
				if d := cmplx.Abs(left - right); !(d <= 1e-13*scale) {
					t.Errorf("p %v, s %g, m %d: %v, want %v, off by %g of %g", p, s, m+1, left, right, d/scale, scale)
				}
			}
		}
	}
}

func TestExpm1(t *testing.T) {
	for _, z := range []complex128{1e-20 - 1e-18i, -1e-9 + 1e-10i, -0.3 + 0.2i, -5 + 11i, -30, -1 + 3.14159i, -800 + 3i} {
		want := cmplx.Exp(z) - 1
		if cmplx.Abs(z) < 1e-3 { // Taylor
			want = z * (1 + z/2*(1+z/3*(1+z/4)))
		}
		if d := cmplx.Abs(expm1(z) - want); !(d <= 4e-16*cmplx.Abs(want)) {
			t.Errorf("expm1(%v) = %v, want %v", z, expm1(z), want)
		}
	}
}

// What remains is the integral of the field: against quadrature after the last
// sample, between instants (int_t - int_t' = int_t^t'), and against the weights.
func TestRemaining(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	const h = 0.9
	for name, l := range zoo(t) {
		x := randomSamples(rng, 19)
		w := make([]complex128, len(x))
		scale := 1 + l.SlowestTime()
		for _, at := range []float64{-3, 0, 0.4, 5.3, 9, 19 * h, 19*h + 0.2, 40, 300, 1e7} {
			got := l.Remaining(x, h, at)
			l.RemainingWeights(at, h, w)
			sum := complex128(0)
			for k := range x {
				sum += w[k] * x[k]
			}
			if d := cmplx.Abs(got - sum); !(d <= 1e-12*scale) {
				t.Errorf("%s at %g: remaining %v, by weights %v", name, at, got, sum)
			}
			// Simpson on [at, at+2], cut at the sample edges.
			cuts := []float64{at}
			for k := 0; k <= len(x); k++ {
				if e := float64(k) * h; e > at+1e-9 && e < at+2-1e-9 {
					cuts = append(cuts, e)
				}
			}
			cuts = append(cuts, at+2)
			area := complex128(0)
			for i := 1; i < len(cuts); i++ {
				const n = 600
				a, b := cuts[i-1], cuts[i]
				times := make([]float64, n+1)
				for j := range times {
					times[j] = a + (b-a)*float64(j)/n
				}
				times[n] = b - 3e-9*h // before the jump
				u := l.Held(x, h, times, nil)
				part := u[0] + u[n]
				for j := 1; j < n; j++ {
					part += u[j] * complex(float64(2+2*(j%2)), 0)
				}
				area += part * complex((b-a)/n/3, 0)
			}
			if name == "very fast pole" {
				continue // faster than this quadrature
			}
			if d := cmplx.Abs(got - l.Remaining(x, h, at+2) - area); !(d <= 3e-8+1e-15*scale) {
				t.Errorf("%s: between %g and %g remaining falls by %v, quadrature %v", name, at, at+2, got-l.Remaining(x, h, at+2), area)
			}
		}
	}
}

// With the fast poles long dead, the slow weights are the weights; and they are
// the weights of the line that has only the slow terms.
func TestSlowWeights(t *testing.T) {
	l := rackB(t)
	n := 40
	all, slow, part := make([]complex128, n), make([]complex128, n), make([]complex128, n)
	l.Weights(float64(n)+60, 1, all)
	l.SlowWeights(float64(n)+60, 1, 5, slow)
	for k := range all {
		if !(cmplx.Abs(all[k]-slow[k]) <= 1e-17) || slow[k] == 0 {
			t.Errorf("late weight %d: %v, slow %v", k, all[k], slow[k])
		}
	}
	var only Line
	for _, term := range l.Terms {
		if real(term.Pole) > -0.2 {
			only.Terms = append(only.Terms, term)
		}
	}
	only.Weights(float64(n), 1, part)
	l.SlowWeights(float64(n), 1, 5, slow)
	l.Weights(float64(n), 1, all)
	differ := false
	for k := range part {
		if slow[k] != part[k] {
			t.Errorf("weight %d: %v, of the slow terms %v", k, slow[k], part[k])
		}
		differ = differ || cmplx.Abs(all[k]-slow[k]) > 1e-3
	}
	if !differ || len(only.Terms) != 1 {
		t.Errorf("rack B has %d slow terms; fast ones matter: %v", len(only.Terms), differ)
	}
	l.SlowWeights(float64(n), 1, 31, slow)
	for k, v := range slow {
		if v != 0 {
			t.Errorf("weight %d of no term: %v", k, v)
		}
	}
}

// Shifting the input by samples shifts the output, and running four times as fast
// changes nothing: ways to move a problem without changing its answer.
func TestHeldMetamorphic(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 10))
	for name, l := range zoo(t) {
		x := randomSamples(rng, 31)
		times := grid(rng, 31, 1)[2:]
		u := l.Held(x, 1, times, nil)
		late := make([]float64, len(times))
		for i := range times {
			late[i] = times[i] + 4
		}
		shifted := l.Held(append(make([]complex128, 4), x...), 1, late, nil)
		fast := Line{Direct: l.Direct}
		quick := make([]float64, len(times))
		for _, term := range l.Terms {
			for range term.Power {
				term.Residue *= 4
			}
			term.Pole *= 4
			fast.Terms = append(fast.Terms, term)
		}
		for i := range times {
			quick[i] = times[i] / 4
		}
		scaled := fast.Held(x, 0.25, quick, nil)
		for i := range u {
			if !(cmplx.Abs(u[i]-shifted[i]) <= 1e-12+1e-13*l.FastestRate()) { // t + 4 is rounded
				t.Fatalf("%s at %g: %v, shifted %v", name, times[i], u[i], shifted[i])
			}
			if !(cmplx.Abs(u[i]-scaled[i]) <= 1e-14*(1+cmplx.Abs(u[i]))) {
				t.Fatalf("%s at %g: %v, four times as fast %v", name, times[i], u[i], scaled[i])
			}
		}
	}
}

func TestHeldAllocatesNothing(t *testing.T) {
	for _, name := range []string{"rack B", "nearly equal", "through"} {
		l := zoo(t)[name]
		rng := rand.New(rand.NewPCG(11, 12))
		x := randomSamples(rng, 50)
		times := grid(rng, 50, 1)
		u := make([]complex128, len(times))
		w := make([]complex128, len(x))
		for what, f := range map[string]func(){
			"Held":             func() { u = l.Held(x, 1, times, u) },
			"HeldTranspose":    func() { w = l.HeldTranspose(u, 1, times, len(x), w) },
			"Weights":          func() { l.Weights(51.5, 1, w) },
			"SlowWeights":      func() { l.SlowWeights(51.5, 1, 2, w) },
			"Remaining":        func() { u[0] = l.Remaining(x, 1, 51.5) },
			"RemainingWeights": func() { l.RemainingWeights(51.5, 1, w) },
			"Step":             func() { u[0] = l.Step(3.3) },
		} {
			if n := testing.AllocsPerRun(20, f); n != 0 {
				t.Errorf("%s: %s allocates %g times", name, what, n)
			}
		}
	}
}

func TestCallerBugsPanic(t *testing.T) {
	l := rackB(t)
	for name, f := range map[string]func(){
		"period":     func() { l.Held(nil, 0, nil, nil) },
		"nan period": func() { l.Weights(1, math.NaN(), nil) },
		"descending": func() { l.Held(nil, 1, []float64{2, 1}, nil) },
		"nan time":   func() { l.HeldTranspose(make([]complex128, 1), 1, []float64{math.NaN()}, 3, nil) },
		"lengths":    func() { l.HeldTranspose(make([]complex128, 2), 1, []float64{1}, 3, nil) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s: no panic", name)
				}
			}()
			f()
		}()
	}
}

func benchmarkLines(b *testing.B) map[string]Line {
	return map[string]Line{"rackB": rackB(b), "fiveEqualPoles": zoo(b)["five equal poles"]}
}

// 96 samples, four instants in each.
func benchmarkGrid() (x []complex128, times []float64) {
	x = randomSamples(rand.New(rand.NewPCG(1, 1)), 96)
	for i := range 4 * 96 {
		times = append(times, (float64(i)+0.3)/4)
	}
	return x, times
}

func BenchmarkHeld(b *testing.B) {
	for name, l := range benchmarkLines(b) {
		b.Run(name, func(b *testing.B) {
			x, times := benchmarkGrid()
			u := make([]complex128, len(times))
			b.ReportAllocs()
			for b.Loop() {
				u = l.Held(x, 1, times, u)
			}
			b.ReportMetric(cmplx.Abs(u[100]), "u100")
		})
	}
}

func BenchmarkHeldTranspose(b *testing.B) {
	for name, l := range benchmarkLines(b) {
		b.Run(name, func(b *testing.B) {
			x, times := benchmarkGrid()
			y := l.Held(x, 1, times, nil)
			b.ReportAllocs()
			for b.Loop() {
				x = l.HeldTranspose(y, 1, times, len(x), x)
			}
			b.ReportMetric(cmplx.Abs(x[50]), "x50")
		})
	}
}

func BenchmarkWeights(b *testing.B) {
	l := rackB(b)
	w := make([]complex128, 112)
	b.ReportAllocs()
	for b.Loop() {
		l.Weights(112.3, 1, w)
	}
	b.ReportMetric(cmplx.Abs(w[111]), "w111")
}

func ExampleLine_Held() {
	// Two samples of 1 ns through a pole of 1 ns.
	l, err := SinglePole(1)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, u := range l.Held([]complex128{1, 1}, 1, []float64{0, 1, 2, 3}, nil) {
		fmt.Printf("%.4f\n", real(u))
	}
	// Output:
	// 0.0000
	// 0.6321
	// 0.8647
	// 0.3181
}
