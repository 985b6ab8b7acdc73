package hardware

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"holdfast/filter"
)

// shareTolerance is the project's: no limit broken by more than 1e-12 of full scale.
const shareTolerance = 1e-12

func rackB(t *testing.T) *Profile {
	t.Helper()
	p, err := Load("../testdata/skerry/rack-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// randomProfile has one channel with a line of up to four sections: Bessel 1 to 8 with corners from 50 MHz to 1 GHz, tails of
// both signs from 2 ns to 10 us. The last result says what it is.
func randomProfile(t *testing.T, rng *rand.Rand) (*Profile, string) {
	t.Helper()
	for range 20 { // sections whose poles lie too close for filter to join them are drawn again
		if p, words, err := drawProfile(t, rng); err == nil {
			return p, words
		}
	}
	t.Fatal("twenty lines in a row that cannot be joined")
	return nil, ""
}

func drawProfile(t *testing.T, rng *rand.Rand) (*Profile, string, error) {
	t.Helper()
	p := &Profile{Name: "random", SamplePeriod: 0.4 + rng.Float64(), Bits: 8 + rng.IntN(9), Block: 1, Shortest: 1, Longest: maxSamples}
	c := Channel{Name: "a", AmplitudeLimit: 0.5 + rng.Float64()/2, SlewLimit: 0.1 + rng.Float64(), Band: math.Inf(1)}
	words := fmt.Sprintf("h %.3f, %d bit", p.SamplePeriod, p.Bits)
	var sections []filter.Line
	for range 1 + rng.IntN(2) {
		order, corner := 1+rng.IntN(8), 0.05*math.Pow(20, rng.Float64())
		l, err := filter.Bessel(order, corner)
		if err != nil {
			t.Fatal(err)
		}
		sections = append(sections, l)
		words += fmt.Sprintf(", Bessel %d at %.4g GHz", order, corner)
		if rng.IntN(5) == 0 { // repeated poles
			sections = append(sections, l, l)
			words += " three times"
			break
		}
	}
	var tails []filter.Tail
	for range rng.IntN(4) {
		tail := filter.Tail{Amplitude: 0.06*rng.Float64() - 0.03, Time: 2 * math.Pow(5000, rng.Float64())}
		tails = append(tails, tail)
		words += fmt.Sprintf(", tail %.4g at %.4g ns", tail.Amplitude, tail.Time)
	}
	l, err := filter.Tails(tails)
	if err != nil {
		t.Fatal(err)
	}
	if c.Line, err = filter.Cascade(append(sections, l)...); err != nil {
		return nil, "", err
	}
	if rng.IntN(2) == 0 {
		c.GuardLead, c.GuardTrail = rng.IntN(3), rng.IntN(6)
	}
	c.RingOut = RingOut{Limit: 1e-4 * math.Pow(100, rng.Float64()), Fast: math.Pow(10, 6*rng.Float64()-2)}
	words += fmt.Sprintf(", guards %d %d, ring-out %.3g (fast %.3g ns)", c.GuardLead, c.GuardTrail, c.RingOut.Limit, c.RingOut.Fast)
	p.Channels = []Channel{c}
	return p, words, nil
}

// allAfter lists instants after the span, dense on every time scale of the line.
func allAfter(l filter.Line, end float64) []float64 {
	times := []float64{end}
	for _, term := range l.Terms {
		for i := range 500 {
			times = append(times, end+30/-real(term.Pole)*math.Pow(float64(i+1)/500, 2))
		}
	}
	slices.Sort(times)
	return times
}

// mostAfter is the largest quadrature at any of those instants.
func mostAfter(p *Profile, x []complex128) float64 {
	l := p.Channels[0].Line
	most := 0.0
	for _, v := range l.Held(x, p.SamplePeriod, allAfter(l, float64(len(x))*p.SamplePeriod), nil) {
		most = max(most, math.Abs(real(v)), math.Abs(imag(v)))
	}
	return most
}

// reach is how far one can go from x along d inside the set, in units of d, and the row that stops it (nil: the disc).
func reach(s *Set, x, d []complex128) (float64, *Row) {
	far, stop := math.Inf(1), (*Row)(nil)
	for k := range x {
		// |x + a d|^2 = Disc^2
		a, b, c := real(d[k]*cmplx.Conj(d[k])), real(d[k]*cmplx.Conj(x[k])), s.Disc*s.Disc-real(x[k]*cmplx.Conj(x[k]))
		if a > 0 {
			far = min(far, max(0, c)/(b+math.Sqrt(b*b+a*max(0, c))))
		}
	}
	for i := range s.Rows {
		r := &s.Rows[i]
		var at, by complex128
		for j, w := range r.Weights {
			at += w * x[r.First+j]
			by += w * d[r.First+j]
		}
		for _, q := range [][2]float64{{real(at), real(by)}, {imag(at), imag(by)}} {
			if q[1] < 0 {
				q[0], q[1] = -q[0], -q[1]
			}
			if far*q[1] > r.Bound-q[0] {
				far, stop = max(0, (r.Bound-q[0])/q[1]), r
			}
		}
	}
	return far, stop
}

// wander walks at random through the set, from zero, and ends on its boundary.
func wander(s *Set, rng *rand.Rand, steps int) []complex128 {
	x, d := make([]complex128, s.Samples), make([]complex128, s.Samples)
	for step := range steps {
		for k := s.Lead; k < s.Samples-s.Trail; k++ {
			d[k] = complex(rng.NormFloat64(), rng.NormFloat64())
		}
		far, _ := reach(s, x, d)
		if step < steps-1 {
			far *= rng.Float64()
		}
		for k := range x {
			x[k] += complex(far, 0) * d[k]
		}
	}
	return x
}

// climb goes from x along the weights g of some functional and slides along every row that it meets: a point where
// many rows bind and the functional is nearly as large as the set lets it be.
func climb(s *Set, x []complex128, g []complex128) []complex128 {
	x = slices.Clone(x)
	for k := range x { // one quadrature alone: the rows are real there
		x[k] = complex(real(x[k]), 0)
	}
	var met [][]complex128
	start := 0.0
	for range s.Samples {
		d := make([]complex128, s.Samples)
		for k := s.Lead; k < s.Samples-s.Trail; k++ {
			d[k] = complex(real(g[k]), 0)
		}
		for range 2 {
			for _, m := range met {
				a := inner(m, d)
				for k := range d {
					d[k] -= a * m[k]
				}
			}
		}
		size := norm(d)
		if start == 0 {
			start = size
		}
		if !(size > 1e-9*start) {
			break
		}
		for k := range d {
			d[k] /= complex(size, 0)
		}
		far, stop := reach(s, x, d)
		for k := range x {
			x[k] += complex(far, 0) * d[k]
		}
		if stop == nil {
			break
		}
		m := make([]complex128, s.Samples)
		copy(m[stop.First:], stop.Weights)
		for range 2 {
			for _, o := range met {
				a := inner(o, m)
				for k := range m {
					m[k] -= a * o[k]
				}
			}
		}
		size = norm(m)
		for k := range m {
			m[k] = complex(real(m[k])/size, 0)
		}
		met = append(met, m)
	}
	return x
}

func TestNoRingOutBetweenTheRows(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 5))
	rows, nearest, unreserved := 0, 0.0, 0
	for range 60 {
		p, words := randomProfile(t, rng)
		c := &p.Channels[0]
		n := 12 + rng.IntN(40)
		s, err := p.Playable(0, n)
		if err != nil {
			t.Fatalf("%s: %v", words, err)
		}
		rows = max(rows, len(s.Rows))
		end := float64(n) * p.SamplePeriod
		instants := []float64{0}
		for _, r := range s.Rows {
			if r.Limit != Slew && r.At > 0 {
				instants = append(instants, r.At)
			}
		}
		if !s.Reserved {
			unreserved++
		}
		weights := make([]complex128, n)
		for trial := range 12 {
			x := wander(s, rng, 1+rng.IntN(8))
			if trial%3 > 0 {
				// Towards the largest ring-out just in the middle between two rows.
				i := rng.IntN(len(instants))
				at := instants[i] * 1.02
				if i+1 < len(instants) {
					at = (instants[i] + instants[i+1]) / 2
				}
				c.Line.Weights(end+at, p.SamplePeriod, weights)
				x = climb(s, x, weights)
			}
			most := mostAfter(p, x)
			if !(most <= c.RingOut.Limit+shareTolerance) {
				t.Errorf("%s, %d samples: ring-out %g; limit %g", words, n, most, c.RingOut.Limit)
			}
			nearest = max(nearest, most/c.RingOut.Limit)
			list, err := p.CheckSamples(0, x)
			if err != nil {
				t.Fatal(err)
			}
			found := 0.0
			for _, r := range list {
				if !r.OK {
					t.Errorf("%s, %d samples: %+v", words, n, r)
				}
				if r.Limit == RingOutFast || r.Limit == RingOutTail {
					found = max(found, r.Found)
				}
			}
			// The search in time finds what the dense grid finds, and at most what a step of that grid can hide more.
			if !(found >= most*(1-1e-12)) || !(found <= most*1.01) {
				t.Errorf("%s, %d samples: the check finds a ring-out of %g; the dense grid %g", words, n, found, most)
			}
			if codes, err := QuantiseAll(x, p.Bits); err != nil {
				t.Errorf("%s: %v", words, err)
			} else if list, err = p.CheckCodes(0, codes); err != nil {
				t.Error(err)
			} else {
				for _, r := range list {
					if !r.OK && (s.Reserved || r.Limit != RingOutFast && r.Limit != RingOutTail) {
						t.Errorf("%s, %d samples, codes: %+v", words, n, r)
					}
				}
			}
		}
	}
	t.Logf("at most %d rows; the largest ring-out met is %.5f of its limit; %d sets without room for rounding", rows, nearest, unreserved)
	// The reserve is half a per cent: the climb must come that near, or it tests nothing.
	if !(nearest >= 0.995) {
		t.Errorf("the largest ring-out met is %g of its limit; needed: 0.995 for the test to say something", nearest)
	}
	if rows > 400 {
		t.Errorf("%d rows; needed: at most 400 for a search to bear", rows)
	}
	if unreserved == 0 || unreserved == 60 {
		t.Errorf("%d of 60 sets without room for rounding; needed: some, for the test to see both kinds", unreserved)
	}
}

// The derivation's own functionals: the field after the span against filter's weights, each derivative against central
// differences of the one before, with simple, repeated and complex poles.
func TestAfterglow(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 4))
	bessel, err := filter.Bessel(3, 0.2)
	if err != nil {
		t.Fatal(err)
	}
	thrice, err := filter.Cascade(bessel, bessel, bessel)
	if err != nil {
		t.Fatal(err)
	}
	odd := filter.Line{Terms: []filter.Term{{Pole: -0.3 + 1i, Power: 1, Residue: 0.2 - 0.4i}, {Pole: -0.3 + 1i, Power: 2, Residue: 1i},
		{Pole: -0.02, Power: 1, Residue: 0.01i}}}
	s := &Set{Samples: 14, Lead: 1, Trail: 2}
	for _, line := range []filter.Line{bessel, thrice, odd} {
		const h = 0.7
		g := afterglowOf(line, s, h, 1, RingOut{Limit: 1e-3, Fast: 3})
		weights := func(at float64, order int) []complex128 {
			w := make([]complex128, s.Samples)
			for j, f := range g.functional(at, order, nil) {
				for k, b := range g.basis[j] {
					w[s.Lead+k] += f * b
				}
			}
			return w
		}
		for range 20 {
			at := 8 * rng.Float64()
			want := make([]complex128, s.Samples)
			line.Weights(float64(s.Samples)*h+at, h, want)
			got := weights(at, 0)
			for k := s.Lead; k < s.Samples-s.Trail; k++ {
				if !(cmplx.Abs(got[k]-want[k]) <= 1e-12) {
					t.Fatalf("weight %d at %g ns is %v; filter's %v", k, at, got[k], want[k])
				}
			}
			for order := 1; order <= 4; order++ {
				const d = 1e-4
				up, down, got := weights(at+d, order-1), weights(at-d, order-1), weights(at, order)
				for k := range got {
					want := (up[k] - down[k]) / (2 * d)
					// d^2/6 of two derivatives more, each at most some |p|, about 3 per ns, times larger.
					if !(cmplx.Abs(got[k]-want) <= 1e-6*math.Pow(3, float64(order))) {
						t.Fatalf("derivative %d of weight %d at %g ns is %v; by differences %v", order, k, at, got[k], want)
					}
				}
			}
			// No sample within full scale exceeds the ceiling of all chains together, from here on.
			ceiling := 0.0
			for i := range g.chains {
				ceiling += g.chains[i].ceiling(at, 0)
			}
			for _, later := range []float64{0, 0.3, 1, 3, 10} {
				if sum := sumAbs(weights(at+later, 0)); !(sum <= ceiling) {
					t.Fatalf("%g at %g ns exceeds the ceiling %g from %g ns on", sum, at+later, ceiling, at)
				}
			}
		}
	}
}

// A row is left out only where nothing that the amplitude limit allows can reach it. Behind a single pole the worst
// is to hold the limit: v = A e^{-g/2} (1 - e^{-(n-g)/2}) after n samples with g trailing guards, tau = 2 samples.
func TestRowsThatNothingCanReach(t *testing.T) {
	line, err := filter.SinglePole(2)
	if err != nil {
		t.Fatal(err)
	}
	worst := 0.9 * math.Exp(-3.0/2) * (1 - math.Exp(-9.0/2))
	for _, test := range []struct {
		share float64
		rows  int
	}{{0.5, 1}, {0.99, 1}, {1.001, 1}, {1.01, 0}, {2, 0}} {
		p := &Profile{Name: "by hand", SamplePeriod: 1, Bits: 14, Block: 1, Shortest: 1, Longest: 100}
		p.Channels = []Channel{{Name: "a", AmplitudeLimit: 0.9, SlewLimit: math.Inf(1), GuardTrail: 3, Line: line,
			RingOut: RingOut{Limit: test.share * worst, Fast: 8}}}
		s, err := p.Playable(0, 12)
		if err != nil {
			t.Fatal(err)
		}
		if len(s.Rows) != test.rows {
			t.Errorf("limit at %g of the worst: %d rows; needed: %d", test.share, len(s.Rows), test.rows)
		}
	}
}

// An asymmetric line turns I into Q and its poles turn: rows in both quadratures keep it too.
func TestRingOutOfAComplexLine(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 9))
	nearest := 0.0
	for range 20 {
		p := &Profile{Name: "complex", SamplePeriod: 1, Bits: 14, Block: 1, Shortest: 1, Longest: 100}
		c := Channel{Name: "a", AmplitudeLimit: 1, SlewLimit: math.Inf(1), RingOut: RingOut{Limit: 2e-3, Fast: 5}, GuardTrail: rng.IntN(3)}
		for range 1 + rng.IntN(4) {
			pole := complex(-0.05-rng.Float64(), 2*rng.Float64()-1)
			c.Line.Terms = append(c.Line.Terms, filter.Term{Pole: pole, Power: 1, Residue: complex(rng.NormFloat64(), rng.NormFloat64()) / 4})
		}
		c.Line.Terms = append(c.Line.Terms, filter.Term{Pole: c.Line.Terms[0].Pole, Power: 2, Residue: 0.1i})
		p.Channels = []Channel{c}
		s, err := p.Playable(0, 24)
		if err != nil {
			t.Fatal(err)
		}
		for range 20 {
			x := wander(s, rng, 1+rng.IntN(10))
			most := mostAfter(p, x)
			nearest = max(nearest, most/c.RingOut.Limit)
			if !(most <= c.RingOut.Limit+shareTolerance) {
				t.Errorf("%+v: ring-out %g; limit %g", c.Line, most, c.RingOut.Limit)
			}
		}
	}
	if !(nearest >= 0.99) {
		t.Errorf("the largest ring-out met is %g of its limit; needed: 0.99 for the test to say something", nearest)
	}
}

// The rows do not depend on where the profile draws the line between fast and slow, but for the one row of the
// slow tail, and the limit binds at the very first instant in any case.
func TestRingOutBindsWhateverFastIs(t *testing.T) {
	p := rackB(t)
	c := &p.Channels[0]
	want := -1
	for _, fast := range []float64{0, 0.01, 8, 29, 31, 1e6} {
		c.RingOut.Fast = fast
		s, err := p.Playable(0, 64)
		if err != nil {
			t.Fatal(err)
		}
		count, first := 0, false
		for _, r := range s.Rows {
			if r.Limit != Slew && !(r.Limit == RingOutTail && r.At == 0 && fast > 0) {
				count++
				first = first || r.At == 0
			}
			if r.Limit == RingOutFast && r.At > fast || r.Limit == RingOutTail && r.At < fast && r.At > 0 {
				t.Errorf("fast %g: row %q at %g", fast, r.Limit, r.At)
			}
		}
		if want < 0 {
			want = count
		}
		if count != want || !first {
			t.Errorf("fast %g: %d rows at instants; with fast 0 %d", fast, count, want)
		}
	}
	if want < 15 || want > 100 {
		t.Errorf("rack B has %d instants; needed: 15 to 100", want)
	}
}

// The slow tail's own row: by hand for the rack's line. The poles are known, so the tail's amplitude at the end of the span
// is sum_k x_k times the residue's share.
func TestTailRow(t *testing.T) {
	p := rackB(t)
	s, err := p.Playable(0, 16)
	if err != nil {
		t.Fatal(err)
	}
	row := s.Rows[len(s.Rows)-1]
	if row.Limit != RingOutTail || row.At != 0 || row.First != 0 || len(row.Weights) != 12 {
		t.Fatalf("last row %q at %g, samples %d to %d", row.Limit, row.At, row.First, row.First+len(row.Weights))
	}
	residue := complex128(0)
	for _, term := range p.Channels[0].Line.Terms {
		if imag(term.Pole) == 0 {
			residue = term.Residue
		}
	}
	sum := 0.0
	for k, w := range row.Weights {
		// int over sample k of r e^{-(16-v)/30} dv
		want := real(residue) * 30 * (math.Exp(-float64(16-k-1)/30) - math.Exp(-float64(16-k)/30))
		if !(math.Abs(real(w)-want) <= 1e-12*math.Abs(want)) {
			t.Errorf("weight %d is %v; by hand %g", k, w, want)
		}
		sum += math.Abs(want)
	}
	if want := 1e-3 - sum/2/8192; !(math.Abs(row.Bound-want) <= 1e-15) {
		t.Errorf("bound %g; by hand %g", row.Bound, want)
	}
}

func TestDiscAndSlewByHand(t *testing.T) {
	p := rackB(t)
	p.Channels[0].GuardLead = 3
	p.Channels[0].RingOut.Limit = math.Inf(1)
	s, err := p.Playable(0, 16)
	if err != nil {
		t.Fatal(err)
	}
	if want := 0.95 - 0.7072/8192; !(math.Abs(s.Disc-want) <= 1e-15) {
		t.Errorf("disc %v; by hand %v", s.Disc, want)
	}
	// Free samples 3..11: ten steps, the first from zero and the last to zero.
	if len(s.Rows) != 10 {
		t.Fatalf("%d rows; needed: 10", len(s.Rows))
	}
	for i, r := range s.Rows {
		want := Row{Limit: Slew, At: float64(3 + i), First: 2 + i, Weights: []complex128{-1, 1}, Bound: 0.25 - 1.0/8192}
		switch i {
		case 0:
			want.First, want.Weights = 3, []complex128{1}
		case 9:
			want.Weights = []complex128{-1}
		}
		if r.Limit != want.Limit || r.At != want.At || r.First != want.First || !slices.Equal(r.Weights, want.Weights) ||
			!(math.Abs(r.Bound-want.Bound) <= 1e-15) {
			t.Errorf("row %d is %+v; by hand %+v", i, r, want)
		}
	}
	// Full scale and no limit: the largest code must not be passed by rounding.
	p.Channels[0].AmplitudeLimit, p.Channels[0].SlewLimit = 1, 2
	if s, err = p.Playable(0, 16); err != nil {
		t.Fatal(err)
	}
	if len(s.Rows) != 0 {
		t.Errorf("%d rows for a slew limit that cannot be broken", len(s.Rows))
	}
	i, _, err := Quantise(complex(s.Disc, 0), 14)
	if err != nil || i > 8191 || i < 8190 {
		t.Errorf("the disc's edge has code %d, %v; needed: 8190 or 8191", i, err)
	}
}

// Any rounding within the reserves keeps the codes' limits, at every resolution, on the edge of the set too.
func TestCodesOfTheBoundary(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 1))
	for bits := 2; bits <= 16; bits++ {
		p := rackB(t)
		p.Bits = bits
		c := &p.Channels[0]
		c.SlewLimit = max(c.SlewLimit, 1.7*LeastStep(bits))
		for _, amplitude := range []float64{1, 0.95} {
			c.AmplitudeLimit = amplitude
			for range 30 {
				s, err := p.Playable(0, 24)
				if err != nil {
					t.Fatal(err)
				}
				x := wander(s, rng, 1+rng.IntN(4))
				codes, err := QuantiseAll(x, bits)
				if err != nil {
					t.Fatal(err)
				}
				list, err := p.CheckCodes(0, codes)
				if err != nil {
					t.Fatal(err)
				}
				for _, r := range list {
					if !r.OK && (s.Reserved || r.Limit != RingOutFast && r.Limit != RingOutTail) {
						t.Errorf("%d bit: %+v", bits, r)
					}
				}
			}
		}
	}
}

func TestEmptySetsNameTheLimit(t *testing.T) {
	for _, test := range []struct {
		change  func(p *Profile, c *Channel)
		samples int
		want    string
	}{
		{func(*Profile, *Channel) {}, 12, `a span of 12 samples; rack B, position 3 plays multiples of 8`},
		{func(*Profile, *Channel) {}, 0, `a span of 0 samples; rack B, position 3 plays 8 to 65536`},
		{func(*Profile, *Channel) {}, 65544, `a span of 65544 samples; rack B, position 3 plays 8 to 65536`},
		{func(_ *Profile, c *Channel) { c.GuardLead = 4 }, 8,
			`channel "q1 drive" can play nothing in 8 samples: guard: 4 samples at zero before and 4 after leave no free one`},
		{func(p *Profile, c *Channel) { p.Bits, c.AmplitudeLimit = 2, 0.3 }, 8,
			`channel "q1 drive" can play nothing in 8 samples: amplitude_limit: 30 % is within the rounding of 2 bit`},
		{func(p *Profile, c *Channel) { p.Bits, c.SlewLimit = 4, 0.125 }, 8,
			`channel "q1 drive" can play nothing in 8 samples: slew_limit: 12.5 %/sample is within the rounding of 4 bit`},
		{func(_ *Profile, c *Channel) { c.RingOut.Limit = 1e-300 }, 8,
			`channel "q1 drive" can play nothing in 8 samples: ring_out: the line rings too fast for a limit of 1e-300 of full scale`},
	} {
		p := rackB(t)
		test.change(p, &p.Channels[0])
		s, err := p.Playable(0, test.samples)
		if err == nil || err.Error() != test.want {
			t.Errorf("got %v, %v; needed: %s", s, err, test.want)
		}
	}
	if _, err := rackB(t).Playable(1, 8); err == nil || !strings.Contains(err.Error(), "no channel 1") {
		t.Errorf("a channel that is not there: %v", err)
	}
}

func TestIdealSetHasNoRows(t *testing.T) {
	p, err := Load("../testdata/ideal/ideal.toml")
	if err != nil {
		t.Fatal(err)
	}
	for _, n := range []int{1, 192, maxSamples} {
		s, err := p.Playable(0, n)
		if err != nil || len(s.Rows) != 0 || s.Lead+s.Trail != 0 || !(math.Abs(s.Disc-(1-1.7072/32768)) <= 1e-15) {
			t.Errorf("%d samples: %+v, %v", n, s, err)
		}
	}
	// A ring-out limit without a line binds nothing: the last sample's hold ends with the span.
	p.Channels[0].RingOut = RingOut{Limit: 1e-3}
	if s, err := p.Playable(0, 8); err != nil || len(s.Rows) != 0 {
		t.Errorf("straight through: %+v, %v", s, err)
	}
}

// The search in time ends where nothing bends: long after a pulse, and on a tail that does not change in double precision.
// Without a bound on the work this takes hours.
func TestRingOutOfAFlatTail(t *testing.T) {
	p := rackB(t)
	x := make([]complex128, maxSamples)
	x[3] = 0.1
	if list, err := p.CheckSamples(0, x); err != nil || !Kept(list) {
		t.Errorf("%v, %v", list, err)
	}
	bessel, err := filter.Bessel(4, 0.2)
	if err != nil {
		t.Fatal(err)
	}
	tail, err := filter.Tails([]filter.Tail{{Amplitude: 0.4, Time: 1e9}})
	if err != nil {
		t.Fatal(err)
	}
	if p.Channels[0].Line, err = filter.Cascade(bessel, tail); err != nil {
		t.Fatal(err)
	}
	list, err := p.CheckSamples(0, x[:64])
	if err != nil {
		t.Fatal(err)
	}
	// One sample of 0.1 leaves 0.4 x 0.1 x 1 ns/1 s behind; filter joins sections to 1e-10 of the response, here far better.
	if got := list[len(list)-1].Found; !(math.Abs(got-4e-11) <= 1e-16) {
		t.Errorf("the tail is %g; by hand 4e-11", got)
	}
}

func TestPlayableIsDeterministic(t *testing.T) {
	p := rackB(t)
	a, err := p.Playable(0, 96)
	if err != nil {
		t.Fatal(err)
	}
	b, _ := p.Playable(0, 96)
	if fmt.Sprintf("%v", a) != fmt.Sprintf("%v", b) {
		t.Error("two calls differ")
	}
}

// The checker's readings, from samples that break one limit each by a known amount.
func TestReadings(t *testing.T) {
	p := rackB(t)
	x := make([]complex128, 16)
	find := func(list []Reading, l Limit) Reading {
		for _, r := range list {
			if r.Limit == l {
				return r
			}
		}
		t.Fatalf("no reading %q", l)
		return Reading{}
	}
	for _, test := range []struct {
		set     map[int]complex128
		limit   Limit
		found   float64
		allowed float64
		ok      bool
	}{
		{nil, Length, 16, 65536, true},
		{nil, Guards, 0, 0, true},
		{map[int]complex128{12: 3e-12i}, Guards, 3e-12, 0, false},
		{map[int]complex128{11: 3e-12i}, Guards, 0, 0, true},
		{map[int]complex128{5: complex(0.57, -0.76)}, Amplitude, 0.95, 0.95, true},
		{map[int]complex128{5: complex(0.57, -0.761)}, Amplitude, math.Hypot(0.57, 0.761), 0.95, false},
		{map[int]complex128{5: -1}, LargestOne, 8191, 8191, true},
		{map[int]complex128{5: 1}, LargestOne, 8192, 8191, false},
		{map[int]complex128{0: 0.25}, Slew, 0.25, 0.25, true},
		{map[int]complex128{0: 0.2501i}, Slew, 0.2501, 0.25, false},
		{map[int]complex128{7: 0.25, 8: -0.1}, Slew, 0.35, 0.25, false},
		{map[int]complex128{14: -0.25, 15: -0.5}, Slew, 0.5, 0.25, false}, // the step back to zero
	} {
		clear(x)
		for k, v := range test.set {
			x[k] = v
		}
		list, err := p.CheckSamples(0, x)
		if err != nil {
			t.Fatal(err)
		}
		r := find(list, test.limit)
		headroom := 0.0
		if test.allowed != 0 {
			headroom = 1 - test.found/test.allowed
		}
		if !(math.Abs(r.Found-test.found) <= 1e-15*max(1, test.found)) || r.Allowed != test.allowed || r.OK != test.ok ||
			!(math.Abs(r.Headroom-headroom) <= 1e-14) || Kept(list) && !test.ok {
			t.Errorf("%v: %+v; needed: found %g, OK %v", test.set, r, test.found, test.ok)
		}
	}
	for _, x := range [][]complex128{{complex(math.NaN(), 0)}, {cmplx.Inf()}, make([]complex128, maxSamples+1)} {
		if list, err := p.CheckSamples(0, x); err == nil {
			t.Errorf("%d samples pass: %v", len(x), list)
		}
	}
	if list, err := p.CheckCodes(0, []int16{1, 2, 3}); err == nil {
		t.Errorf("half a pair passes: %v", list)
	}
	list, err := p.CheckCodes(0, make([]int16, 2*12))
	if err != nil || find(list, Length).OK {
		t.Errorf("12 samples where blocks are 8: %v, %v", list, err)
	}
	list, err = p.CheckCodes(0, append([]int16{9000, 0}, make([]int16, 30)...))
	if err != nil || find(list, LargestOne).OK || find(list, LargestOne).Found != 9000 {
		t.Errorf("code 9000 at 14 bit: %v, %v", list, err)
	}
}

// Ring-out readings against closed forms: what one sample leaves behind a single pole and a tail.
func TestRingOutReadings(t *testing.T) {
	p := &Profile{Name: "by hand", SamplePeriod: 1, Bits: 14, Block: 1, Shortest: 1, Longest: 100}
	c := Channel{Name: "a", AmplitudeLimit: 1, SlewLimit: math.Inf(1), RingOut: RingOut{Limit: 0.1, Fast: 4}}
	pole := func(tau float64) filter.Term {
		return filter.Term{Pole: complex(-1/tau, 0), Power: 1, Residue: complex(1/tau, 0)}
	}
	// v(t) = -0.9 (1 - e^-1/2) e^-t/2 + (1 - e^-1/20) e^-t/20 of one full sample: it starts below zero, crosses, has its peak
	// where both slopes cancel and decays.
	fast, slow := pole(2), pole(20)
	fast.Residue *= -0.9
	c.Line = filter.Line{Terms: []filter.Term{fast, slow}}
	p.Channels = []Channel{c}
	a, b := 0.9*(1-math.Exp(-0.5)), 1-math.Exp(-1.0/20)
	peak := math.Log(10*a/b) / (1.0/2 - 1.0/20)
	v := func(t float64) float64 { return math.Abs(b*math.Exp(-t/20) - a*math.Exp(-t/2)) }
	for _, test := range []struct{ at, fast, tail float64 }{
		{4, v(0), max(v(4), v(peak))},
		{0, v(0), v(0)},
		{peak - 1e-3, v(0), v(peak)},
		{60, v(0), v(60)},
		{1e5, v(0), 0},
	} {
		p.Channels[0].RingOut.Fast = test.at
		// I alone, Q alone: each is judged.
		for _, x := range []complex128{1, 1i, -1, complex(0.5, 1)} {
			list, err := p.CheckSamples(0, []complex128{0, x})
			if err != nil {
				t.Fatal(err)
			}
			got := list[len(list)-2:]
			if !(math.Abs(got[0].Found-test.fast) <= 1e-12) || !(math.Abs(got[1].Found-test.tail) <= 1e-12) {
				t.Errorf("fast until %g: %g and %g; by hand %g and %g", test.at, got[0].Found, got[1].Found, test.fast, test.tail)
			}
		}
	}
}

func BenchmarkPlayable(b *testing.B) {
	p, err := Load("../testdata/skerry/rack-b.toml")
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if s, err := p.Playable(0, 112); err != nil || len(s.Rows) == 0 {
			b.Fatal(err)
		}
	}
}

func BenchmarkCheckSamples(b *testing.B) {
	p, err := Load("../testdata/skerry/rack-b.toml")
	if err != nil {
		b.Fatal(err)
	}
	x := make([]complex128, 112)
	x[50] = 0.2
	for b.Loop() {
		if list, err := p.CheckSamples(0, x); err != nil || !Kept(list[:5]) {
			b.Fatal(list, err)
		}
	}
}
