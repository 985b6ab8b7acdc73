package design

import (
	"cmp"
	"context"
	"math"
	"math/cmplx"
	"slices"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/robust"
	"holdfast/filter"
)

// The flux channel of an invented rack, beside the drive of rack "B".
const fluxChannel = `
[[channel]]
name = "q1 flux"
kind = "baseband"
full_scale = "20 MHz"
amplitude_limit = "80 %"
slew_limit = "25 %/sample"
band = "100 MHz"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "0.1 %", fast = "8 ns" }
latency = "1.3 ns"
[channel.line]
delay = "2.4 ns"
lowpass = { family = "single-pole", corner = "250 MHz" }
tails = [ { amplitude = "2 %", time = "40 ns", known_to = "20 %" } ]
`

// curved are the inputs of a device whose first site has a bias with a map, keys of both given, and what else there is.
func curved(t *testing.T, site, bias, more, rest string) Inputs {
	t.Helper()
	rack := textFile(t, "skerry/rack-b.toml")
	_, channel, _ := strings.Cut(rack, "\n[[channel]]")
	if strings.Contains(more, "q2 drive") {
		rack += "\n[[channel]]" + strings.Replace(channel, "q1 drive", "q2 drive", 1)
	}
	return inputsOf(t, rack+fluxChannel,
		"format = 1\nname = \"tuned (invented)\"\n[[site]]\nname = \"q1\"\n"+site+"\n[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n"+bias+"\n"+more, rest)
}

const (
	driven1   = "[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n"
	tunedLoop = "loop = { highest = \"5.2 GHz\", bias = 0.23, full_scale = 0.004, asymmetry = 0.3 }" // some 25 MHz at full scale
	bentSpin  = "polynomial = [1, 0.4, -0.3]"
	turnX     = "[target]\nsite = \"q1\"\ngate = \"X90\"\n"
)

// Errors that ride on the bias, as Complete leaves them in a brief.
var (
	fluxAmplitude = brief.Error{Name: "flux amplitude", Kind: brief.Amplitude, Channels: []string{"q1 flux"}, Size: 0.02, Weight: 1, Order: 1}
	fluxTail      = brief.Error{Name: "flux tail", Kind: brief.Line, Channels: []string{"q1 flux"}, Parameter: "tails[0].amplitude", Size: 0.2, Weight: 1, Order: 1}
)

// A walk is what an outsider makes of a record: the fields that arrive by the line's poles, the maps by their definitions, and the gate by tiny
// exponentials of fourth order without commutators (Blanes and Moan 2006, Appl. Numer. Math. 56, 1519), each summed as a series.
type walk struct {
	m       *Model
	samples [][]complex128
	step    float64 // ns, in the window; larger ones follow it
}

// walked reads the codes of a pulse.
func walked(p *Pulse, step float64) *walk {
	w := &walk{m: &p.Record.Model, step: step}
	full := math.Pow(2, float64(w.m.Bits-1))
	for i, c := range w.m.Channels {
		var x []complex128
		codes := p.Channels[i].Codes
		for k := 0; k < len(codes); k += 2 {
			if c.Kind == "baseband" {
				x = append(x, complex(float64(codes[k])/full, 0), complex(float64(codes[k+1])/full, 0))
			} else {
				x = append(x, complex(float64(codes[k])/full, float64(codes[k+1])/full))
			}
		}
		w.samples = append(w.samples, x)
	}
	return w
}

func (l *LineModel) line() filter.Line {
	out := filter.Line{Direct: complex(l.Direct[0], l.Direct[1])}
	for i := range l.Poles {
		out.Terms = append(out.Terms, filter.Term{Pole: complex(l.Poles[i][0], l.Poles[i][1]), Power: l.Powers[i], Residue: complex(l.Residues[i][0], l.Residues[i][1])})
	}
	return out
}

// rate is what a baseband channel drives for a share that arrives, rad/ns.
func (c *ModelChannel) rate(s float64) float64 {
	switch {
	case c.MapPolynomial != nil:
		sum := 0.0
		for k, v := range c.MapPolynomial {
			sum += v * math.Pow(s, float64(k+1))
		}
		return c.FullScale * sum
	case c.MapLoop != nil:
		g := func(f float64) float64 {
			return math.Pow(math.Pow(math.Cos(math.Pi*f), 2)+math.Pow(c.MapLoop[3]*math.Sin(math.Pi*f), 2), 0.25)
		}
		return c.MapLoop[0] * (g(c.MapLoop[1]+c.MapLoop[2]*s) - g(c.MapLoop[1]))
	}
	return c.FullScale * s
}

// A disturbance is an error of the record with its size.
type disturbance struct {
	e      *ModelError
	lambda float64
}

// fields gives the matrices of the Hamiltonian at some times, ns from the start of the window, without the static part.
func (w *walk) fields(times []float64, by disturbance) [][]complex128 {
	d := w.m.Dim
	list := make([][]complex128, len(times))
	for i := range list {
		list[i] = make([]complex128, d*d)
	}
	add := func(i int, f float64, op [][]Complex) {
		for r := range d {
			for c := range d {
				list[i][r*d+c] += complex(f, 0) * complex(op[r][c][0], op[r][c][1])
			}
		}
	}
	end := float64(w.m.Samples) * w.m.SamplePeriod
	arriving := func(c *ModelChannel, l *LineModel, x []complex128) []complex128 {
		at := make([]float64, len(times))
		for i, t := range times {
			at[i] = t + w.m.WindowStart - c.Delay
		}
		return l.line().Held(x, w.m.SamplePeriod, at, nil)
	}
	for _, r := range w.m.Rotating {
		for i, t := range times {
			add(i, math.Cos(r.Frequency*t), r.Cosine)
			add(i, math.Sin(r.Frequency*t), r.Sine)
		}
	}
	for k := range w.m.Channels {
		c := &w.m.Channels[k]
		u := arriving(c, &c.LineModel, w.samples[k])
		var v []complex128
		if by.e != nil && by.e.Kind == brief.Line && by.e.Channel == c.Name {
			v = arriving(c, by.e.LineModel, w.samples[k])
		}
		for i, t := range times {
			s := u[i]
			if inside := t >= 0 && t < end; by.e != nil && inside {
				switch {
				case v != nil:
					s += complex(by.lambda, 0) * v[i]
				case by.e.Kind == brief.Amplitude && (by.e.Channels == nil || slices.Contains(by.e.Channels, c.Name)):
					s *= complex(1+by.lambda, 0)
				}
			}
			if c.Kind == "baseband" {
				add(i, c.rate(real(s)), c.Operators[0])
				continue
			}
			add(i, c.FullScale*real(s), c.Operators[0])
			add(i, c.FullScale*imag(s), c.Operators[1])
			for _, p := range c.Paths {
				turned := s * cmplx.Rect(1, -p.Frequency*t)
				add(i, c.FullScale*real(turned), p.Operators[0])
				add(i, c.FullScale*imag(turned), p.Operators[1])
			}
		}
	}
	for i, t := range times {
		if by.e != nil && by.e.Kind == brief.Static && t >= 0 && t < end {
			add(i, by.lambda, by.e.Operator)
		}
	}
	return list
}

// edges are where fields may jump or bend, and where steps are to end: those of the samples of every channel and of the window, and
// after it ever longer steps, until what the lines bring has died.
func (w *walk) edges(settled bool) []float64 {
	end := float64(w.m.Samples) * w.m.SamplePeriod
	list := []float64{0, end}
	slowest := 0.0
	for _, c := range w.m.Channels {
		for k := range w.m.Samples + 1 {
			if t := c.Delay - w.m.WindowStart + float64(k)*w.m.SamplePeriod; (t > 0 || settled) && t < end {
				list = append(list, t)
			}
		}
		for _, p := range c.Poles {
			slowest = math.Max(slowest, -1/p[0])
		}
	}
	for t, h := end, w.m.SamplePeriod; settled && t < end+25*slowest; t, h = t+h, math.Min(1.1*h, 4) {
		list = append(list, t+h)
	}
	slices.Sort(list)
	return list
}

// gate gives U of the record's pulse with an error, for one kind of ends, in the frame of the undriven device, which for settled ends is to be
// diagonal.
func (w *walk) gate(settled bool, by disturbance) []complex128 {
	d := w.m.Dim
	static := make([]complex128, d*d)
	for r := range d {
		for c := range d {
			static[r*d+c] = complex(w.m.Static[r][c][0], w.m.Static[r][c][1])
		}
	}
	end := float64(w.m.Samples) * w.m.SamplePeriod
	edges := w.edges(settled)
	var times, steps []float64
	for i, a := range edges[:len(edges)-1] {
		b := edges[i+1]
		if b-a < 1e-9 {
			continue
		}
		h := w.step
		if a >= end {
			h *= 1 + math.Min((a-end)/20, 20)
		}
		n := math.Ceil((b - a) / h)
		h = (b - a) / n
		for k := range int(n) {
			at := a + float64(k)*h
			times = append(times, at+(0.5-math.Sqrt(3)/6)*h, at+(0.5+math.Sqrt(3)/6)*h)
			steps = append(steps, h)
		}
	}
	fields := w.fields(times, by)
	u := make([]complex128, d*d)
	for i := range d {
		u[i*d+i] = 1
	}
	x := [2]complex128{complex(0.25+math.Sqrt(3)/6, 0), complex(0.25-math.Sqrt(3)/6, 0)}
	h := make([]complex128, d*d)
	for j, s := range steps {
		for part := range 2 {
			for i := range h {
				h[i] = complex(0, -s) * (static[i]/2 + x[part]*fields[2*j][i] + x[1-part]*fields[2*j+1][i])
			}
			u = expTimes(h, u, d)
		}
	}
	turn := func(by float64, i int) complex128 { return cmplx.Exp(complex(0, by) * static[i*d+i]) }
	for i := range d {
		for k := range d {
			u[i*d+k] *= turn(edges[len(edges)-1]-end, i) * turn(0-edges[0], k)
		}
	}
	return u
}

// expTimes gives exp(a) u by its series.
func expTimes(a, u []complex128, d int) []complex128 {
	sum, term := slices.Clone(u), u
	for n := 1; n < 40; n++ {
		next, size := make([]complex128, d*d), 0.0
		for i := range d {
			for k := range d {
				for j := range d {
					next[i*d+j] += a[i*d+k] * term[k*d+j] / complex(float64(n), 0)
				}
			}
		}
		for i, v := range next {
			sum[i] += v
			size = math.Max(size, cmplx.Abs(v))
		}
		if term = next; size < 1e-18 {
			break
		}
	}
	return sum
}

// infidelity is the average gate infidelity of U on the code space, at the recorded free angles.
func (w *walk) infidelity(u []complex128) float64 {
	d, c := w.m.Dim, len(w.m.CodeSpace)
	angle := func(list []float64, i int) complex128 {
		if len(list) == 0 {
			return 1
		}
		return cmplx.Rect(1, -list[0]/2*float64(1-2*i))
	}
	var trace complex128
	inside := 0.0
	for i, p := range w.m.CodeSpace {
		for k, q := range w.m.CodeSpace {
			v := angle(w.m.FreeZAfter, i) * u[p*d+q] * angle(w.m.FreeZBefore, k)
			trace += cmplx.Conj(complex(w.m.Target[i][k][0], w.m.Target[i][k][1])) * v
			inside += real(v * cmplx.Conj(v))
		}
	}
	return 1 - (inside+real(trace*cmplx.Conj(trace)))/float64(c*(c+1))
}

// susceptibility is what central differences of exact gates leave of an error, by its definition.
func (w *walk) susceptibility(settled bool, e *ModelError) float64 {
	d, code := w.m.Dim, w.m.CodeSpace
	cut := func(m []complex128) float64 { // square of the norm, without the trace, on the code space
		var trace complex128
		for _, p := range code {
			trace += m[p*d+p] / complex(float64(len(code)), 0)
		}
		sum := 0.0
		for _, p := range code {
			for _, q := range code {
				v := m[p*d+q]
				if p == q {
					v -= trace
				}
				sum += real(v * cmplx.Conj(v))
			}
		}
		return sum
	}
	end := float64(w.m.Samples) * w.m.SamplePeriod
	l := 2e-3 / end // turns by so much
	u := w.gate(settled, disturbance{})
	up, down := w.gate(settled, disturbance{e, l}), w.gate(settled, disturbance{e, -l})
	a := make([]complex128, d*d)
	for i := range d {
		for k := range d {
			for j := range d {
				a[i*d+k] += 1i * cmplx.Conj(u[j*d+i]) * (up[j*d+k] - down[j*d+k]) / complex(2*l, 0)
			}
		}
	}
	var times []float64
	const n = 20000
	for i := range n {
		times = append(times, end*(float64(i)+0.5)/n)
	}
	more, less := w.fields(times, disturbance{e, l}), w.fields(times, disturbance{e, -l})
	size := 0.0
	for i := range times {
		for k := range more[i] {
			more[i][k] = (more[i][k] - less[i][k]) / complex(2*l, 0)
		}
		size += cut(more[i]) * end / n
	}
	return math.Sqrt(cut(a) / (end * size))
}

// TestCurved designs gates on spins and ladders with a bias that has a map: what the record claims, an outsider finds.
func TestCurved(t *testing.T) {
	for _, c := range []struct {
		name, site, bias, more, rest string
		riding                       []brief.Error
		inRecord                     []float64
		windowAlone                  bool // the undriven device is not diagonal: no walk outside of the window
	}{
		{"polynomial", `zero = "upper"`, bentSpin, driven1, "span = \"88 ns\"\nstarts = 20\n" + turnX + "[[error]]\ndetuning = \"q1\"\n", []brief.Error{fluxAmplitude, fluxTail}, []float64{1, 0.4, -0.3}, false},
		{"loop", `detuning = "3 MHz"`, tunedLoop, driven1, "span = \"80 ns\"\nstarts = 20\n" + turnX + "[[error]]\ndetuning = \"q1\"\n[[error]]\noffset = \"q1 flux\"\nname = \"offset\"\n", []brief.Error{fluxAmplitude}, []float64{2 * math.Pi * 5.2, 0.23, 0.004, 0.3}, false},
		{"loop on a ladder", "levels = 3\nanharmonicity = \"-220 MHz\"", tunedLoop, driven1, "span = \"72 ns\"\nstarts = 20\nrefine = false\n" + turnX + "free_z = \"after\"\n[[error]]\ndetuning = \"q1\"\n", []brief.Error{fluxAmplitude}, []float64{2 * math.Pi * 5.2, 0.23, 0.004, 0.3}, false},
		{"window", `zero = "lower"`, "axis = \"X\"\npolynomial = [0.5, 1]", driven1, "span = \"72 ns\"\nends = \"window\"\nstarts = 20\nrefine = false\n" + turnX + "[[error]]\ndetuning = \"q1\"\n", nil, []float64{0.5, 1}, false},
		// about one axis the amplitude is held off by the map alone, whose rate falls where what arrives grows
		{"bias alone", `zero = "upper"`, "axis = \"X\"\npolynomial = [1, 0, -2]", "", "span = \"144 ns\"\nstarts = 30\nhold = \"nothing\"\n" + turnX, []brief.Error{fluxAmplitude}, []float64{1, 0, -2}, false},
		{"register", "frequency = \"5.1 GHz\"", tunedLoop, driven1 + "[[site]]\nname = \"q2\"\nfrequency = \"5.15 GHz\"\nzero = \"upper\"\n[[drive]]\nsite = \"q2\"\nchannel = \"q2 drive\"\n" +
			"[[coupling]]\nkind = \"exchange\"\nbetween = [\"q1\", \"q2\"]\nstrength = \"1 MHz\"\n[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q2\"\nshare = \"4 %\"\nphase = \"40 deg\"\n",
			"span = \"72 ns\"\nhold = \"nothing\"\nends = \"window\"\n[target]\ngates = { q1 = \"X90\", q2 = \"identity\" }\n", nil, []float64{2 * math.Pi * 5.2, 0.23, 0.004, 0.3}, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			in := curved(t, c.site, c.bias, c.more, c.rest)
			in.Brief.Errors = append(in.Brief.Errors, c.riding...)
			p, err := Run(context.Background(), in, nil)
			if err != nil {
				t.Fatal(err)
			}
			if p.Status != Found {
				t.Fatal(p.Summary())
			}
			r := &p.Record
			flux := slices.IndexFunc(r.Model.Channels, func(m ModelChannel) bool { return m.Name == "q1 flux" })
			for i, m := range r.Model.Channels {
				if got := append(slices.Clone(m.MapPolynomial), m.MapLoop...); i == flux && !slices.Equal(got, c.inRecord) || i != flux && got != nil {
					t.Errorf("map %v of %s in the record", got, m.Name)
				}
			}
			largest := 0.0
			for _, x := range p.Channels[flux].Exact {
				largest = math.Max(largest, cmplx.Abs(x))
			}
			if !(largest > 0.05) {
				t.Errorf("the bias plays %.3g at most, too little to test its map", largest)
			}
			w := walked(p, 0.02)
			settled := in.Brief.Ends == brief.Settled
			got := w.infidelity(w.gate(settled, disturbance{}))
			t.Logf("%s; plays %.2g of the bias; infidelity before rounding %.2g, claimed %.3g, found %.3g", p.Summary(), largest, r.Search.Before, r.Claim.Infidelity, got)
			if !(r.Search.Before <= 1e-10) {
				t.Errorf("infidelity %.3g before rounding", r.Search.Before)
			}
			if !(math.Abs(got-r.Claim.Infidelity) <= 1e-10) {
				t.Errorf("infidelity %.6g, the record claims %.6g", got, r.Claim.Infidelity)
			}
			if !c.windowAlone {
				if other := w.infidelity(w.gate(!settled, disturbance{})); !(math.Abs(other-r.Claim.InfidelityOtherEnds) <= 1e-9) {
					t.Errorf("infidelity %.6g at the other ends, the record claims %.6g", other, r.Claim.InfidelityOtherEnds)
				}
			}
			for i := range r.Model.Errors {
				e := &r.Model.Errors[i]
				s := w.susceptibility(settled, e)
				t.Logf("%s: susceptibility claimed %.6g, found %.6g", e.Name, e.Susceptibility, s)
				if !(math.Abs(s-e.Susceptibility) <= 5e-7) {
					t.Errorf("%s: susceptibility %.7g, the record claims %.7g", e.Name, s, e.Susceptibility)
				}
			}
		})
	}
}

// TestCurvedSpread: finite errors of a mapped bias, and offsets of one whose map falls at rest, as the record has them and as an outsider finds.
func TestCurvedSpread(t *testing.T) {
	in := curved(t, `zero = "upper"`, "axis = \"X\"\npolynomial = [-0.6, 0.5]", "", "span = \"80 ns\"\nstarts = 4\nrefine = false\n"+turnX+
		"[[error]]\noffset = \"q1 flux\"\nspread = \"average\"\nvalues = [\"-1 %\", \"2 %\"]\n"+
		"[require]\ninfidelity = 1e-2\nsusceptibility = 1\n[[require.margin]]\nerror = \"offset I\"\nsize = \"1 %\"\n")
	wide := fluxAmplitude
	wide.Spread, wide.Values = brief.Average, []float64{-0.2, 0.05, 0.3}
	in.Brief.Errors = append(in.Brief.Errors, wide)
	p, err := Run(context.Background(), in, nil)
	if err != nil {
		t.Fatal(err)
	}
	if x := slices.MaxFunc(p.Channels[0].Exact, func(a, b complex128) int { return cmp.Compare(cmplx.Abs(a), cmplx.Abs(b)) }); !(cmplx.Abs(x) > 0.3) {
		t.Fatalf("the bias plays %v at most", x)
	}
	w := walked(p, 0.02)
	full := 2 * math.Pi * 0.02
	slope := -0.6 * full
	for i := range p.Record.Model.Errors[:2] {
		e := &p.Record.Model.Errors[i]
		want := wide.Values
		if i == 0 {
			want = []float64{-0.01 * slope, 0.02 * slope}
		}
		mean := 0.0
		for k, x := range e.SpreadValues {
			if !(math.Abs(x-want[k]) <= 1e-14) {
				t.Errorf("%s: size %v in the record, want %v", e.Name, x, want[k])
			}
			mean += w.infidelity(w.gate(true, disturbance{e, x})) / float64(len(want))
		}
		t.Logf("%s: %v, mean infidelity claimed %.6g, found %.6g", e.Name, e.SpreadValues, *e.SpreadInfidelity, mean)
		if len(e.SpreadValues) != len(want) || !(math.Abs(mean-*e.SpreadInfidelity) <= 1e-9) {
			t.Errorf("%s: %d sizes of mean infidelity %v, the record claims %v", e.Name, len(e.SpreadValues), mean, *e.SpreadInfidelity)
		}
	}
	q, err := newTask(in, brief.Slepian)
	if err != nil {
		t.Fatal(err)
	}
	if got, want := q.spin.Held[0].Size, -slope*in.Brief.Errors[0].Size; !(want > 0) || !(math.Abs(got-want) <= 1e-14) {
		t.Errorf("offset of size %v, want %v", got, want)
	}
	if got, want := p.Record.Require.Margins[0].Rate, -0.01*slope; !(math.Abs(got-want) <= 1e-14) {
		t.Errorf("margin of %v, want %v", got, want)
	}
}

// TestCurvedGrid: steps follow the steepest slope that may be played, and no cell stands for a curved ring-out.
func TestCurvedGrid(t *testing.T) {
	for _, c := range []struct {
		bias string
		full float64 // MHz per share, at 80 % of full scale
	}{
		{"", 20}, {bentSpin, 20 * (1 + 2*0.4*0.4444444444444444 - 3*0.3*0.4444444444444444*0.4444444444444444)}, {"polynomial = [0, 0, -1]", 20 * 3 * 0.64}, {"polynomial = [2]", 40},
	} {
		in := curved(t, `zero = "upper"`, c.bias, "", "span = \"72 ns\"\nhold = \"nothing\"\n[target]\nsite = \"q1\"\ngate = \"Z90\"\n")
		q, err := newTask(in, brief.Slepian)
		if err != nil {
			t.Fatal(err)
		}
		if got, want := q.fastest(), 2e-3*math.Pi*c.full; !(math.Abs(got/want-1) <= 1e-5) {
			t.Errorf("%q: steps for %v rad/ns, want %v", c.bias, got, want)
		}
		if q.fine.cell == (c.bias != "") {
			t.Errorf("%q: last cell %v", c.bias, q.fine.cell)
		}
		for s := -0.8; s <= 0.8; s += 0.05 {
			if c.bias == "" {
				break
			}
			value, slope, curvature := q.spin.Maps[0](s)
			rate, dr, ddr := in.Device.Biases[0].Rate(s, in.Profile.Channels[1].FullScale)
			for i, v := range [][2]float64{{value, rate}, {slope, dr}, {curvature, ddr}} {
				if !(math.Abs(v[0]*q.fastest()-v[1]) <= 1e-14) || i < 2 && !(math.Abs(v[0]) <= 1+1e-5) {
					t.Errorf("%q: derivative %d at %v is %v of %v, want %v", c.bias, i, s, v[0], q.fastest(), v[1])
				}
			}
		}
	}
}

// TestCurvedOrder: halving the steps divides the error by sixteen, as of a straight map; what the record claims is off by a small part of what
// replay is asked to agree with, for the steepest of maps too.
func TestCurvedOrder(t *testing.T) {
	for _, bias := range []string{"", bentSpin, tunedLoop, "polynomial = [0, 0, 0, 0, 0, 0, 0, 1]", "polynomial = [1, -2, 0, 4, 0, -3, 0, 2]", "loop = { highest = \"5.2 GHz\", full_scale = 0.06 }"} {
		in := curved(t, `zero = "upper"`, bias, driven1, "span = \"88 ns\"\n"+turnX+"[[error]]\ndetuning = \"q1\"\n")
		in.Brief.Errors = append(in.Brief.Errors, fluxAmplitude)
		q, err := newTask(in, brief.Slepian)
		if err != nil {
			t.Fatal(err)
		}
		x := q.sampled(q.start(1).c)
		figures := func(share float64) (list []float64) {
			a, err := q.axis(share, true)
			if err != nil {
				t.Fatal(err)
			}
			u, _ := q.controls(&a, x)
			g := q.evaluator(a.Grid, robust.Response{}, q.spin.Held, 0).(*robust.Gate)
			f := g.Figures(u, make([][]float64, 2))
			gate := g.Unitary(u)
			return append(gate[:], f.Susceptibility...)
		}
		exact := figures(claimShare / 4)
		off := func(share float64) (gate, shares float64) {
			for i, v := range figures(share) {
				if d := math.Abs(v - exact[i]); i < 4 {
					gate = math.Max(gate, d)
				} else {
					shares = math.Max(shares, d)
				}
			}
			return gate, shares
		}
		g1, s1 := off(stepShare)
		g2, s2 := off(fineShare)
		g8, s8 := off(claimShare)
		t.Logf("%q, %d steps: gate off by %.2g, %.2g, %.2g, susceptibilities by %.2g, %.2g, %.2g", bias, len(q.coarse.Steps), g1, g2, g8, s1, s2, s8)
		if !(g2 <= g1/12) || !(g8 <= g1/2000) || !(g8 <= 1e-8) || !(s8 <= 1e-7) {
			t.Errorf("%q: gate off by %.2g, %.2g, %.2g, susceptibilities by %.2g, %.2g, %.2g", bias, g1, g2, g8, s1, s2, s8)
		}
	}
}

// TestCurvedRefused: what a map does not go with, in a sentence.
func TestCurvedRefused(t *testing.T) {
	pair := driven1 + "[[site]]\nname = \"q2\"\n"
	reach := []brief.Error{{Name: "reach", Kind: brief.Crosstalk, Channels: []string{"q1 flux"}, Weight: 1}}
	for _, c := range []struct {
		shift      float64
		bias, more string
		riding     []brief.Error
		rest, want string
	}{
		{1e-3, bentSpin, driven1, nil, "[[error]]\ndetuning = \"q1\"\n", "device.toml: channel \"q1 flux\": found a polynomial or a loop beside the shift of the channel in "},
		{0, bentSpin, pair, reach, "", `error "reach": found channel "q1 flux", whose bias has a polynomial or a loop; allowed: a channel without (what reaches another site has a map of its own)`},
		{0, "polynomial = [0, 1]", driven1, nil, "[[error]]\noffset = \"q1 flux\"\n", `error "offset I": found channel "q1 flux", whose bias is flat where nothing is played; allowed: a channel of which an offset does something to first order`},
		{0, "loop = { highest = \"5.2 GHz\", bias = 1, full_scale = 0.1 }", driven1, nil, "[[error]]\noffset = \"q1 flux\"\n", `error "offset I": found channel "q1 flux", whose bias is flat where nothing is played`},
	} {
		in := curved(t, "", c.bias, c.more, "span = \"72 ns\"\n"+turnX+c.rest)
		in.Profile.Channels[1].Shift = c.shift
		in.Brief.Errors = append(in.Brief.Errors, c.riding...)
		if _, err := Run(context.Background(), in, nil); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%q: %v, want %s", c.bias, err, c.want)
		}
	}
	// without a map all of these go on
	for _, rest := range []string{"[[error]]\ncrosstalk = \"q1 flux\"\nsite = \"q2\"\n", "[[error]]\noffset = \"q1 flux\"\n"} {
		in := curved(t, "", "", pair, "span = \"72 ns\"\n"+turnX+rest)
		in.Profile.Channels[1].Shift = 1e-3
		if _, err := newTask(in, brief.Slepian); err != nil {
			t.Error(err)
		}
	}
}
