package replay

import (
	"context"
	"math"
	"testing"
)

// swung is a spin with a drive that plays x, n samples of 1 ns, behind a line without memory or with it, and errors.
func swung(x []complex128, errors ...Class) *Model {
	return &Model{
		SamplePeriod: 1, Samples: len(x), Bits: 14, Ends: "settled", WindowStart: 3.2, Dim: 2, CodeSpace: []int{0, 1},
		Static: make([]complex128, 4), Target: []complex128{1, 0, 0, 1},
		Channels: []Channel{{
			Name: "drive", Kind: "quadrature", FullScale: 0.25, Delay: 3.2, Direct: 0, Poles: []complex128{-1.1, -0.03}, Powers: []int{1, 1}, Residues: []complex128{1.1 * 1.02, -0.03 * 0.02},
			Operators: [][]complex128{{0, 0.5, 0.5, 0}, {0, -0.5i, 0.5i, 0}}, MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: x,
		}},
		Errors: errors,
	}
}

func turnZ() []complex128 { return []complex128{0.5, 0, 0, -0.5} }

// TestNoiseOfFreeEvolution: without drive F = sin²(wT/2)/w² (Cywinski, Lutchyn, Nave, Das Sarma 2008, Phys. Rev. B 77, 174509), and the average gate
// infidelity two thirds of the sum of weights times F.
func TestNoiseOfFreeEvolution(t *testing.T) {
	const T = 24
	n := Noise{Frequencies: []float64{1e-4, 0.05, 0.31}, Weights: []float64{1e-6, 2e-6, 5e-5}}
	v, err := swung(make([]complex128, T), Class{Name: "dephasing", Kind: "static", Operator: turnZ(), Noise: n}).Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	want := 0.0
	for i, w := range n.Frequencies {
		want += 2. / 3 * n.Weights[i] * math.Pow(math.Sin(w*T/2)/w, 2)
	}
	if got := v.Errors[0].NoiseInfidelity; got == nil || !(math.Abs(*got/want-1) <= 1e-6) {
		t.Errorf("noise leaves %v, want %v", got, want)
	}
	if v.Errors[1].NoiseInfidelity != nil {
		t.Errorf("noise of %s", v.Errors[1].Name)
	}
}

// TestSlowNoise: noise that hardly moves is a constant error of that variance: 1 - F_avg = 2/3 W |A|²/2, with |A| the susceptibility times
// sqrt(T int |V|² dt), of a detuning and of the amplitude.
func TestSlowNoise(t *testing.T) {
	x := make([]complex128, 24)
	for k := range 20 {
		x[k] = complex(0.6*math.Sin(0.3*float64(k)), 0.3*math.Cos(0.2*float64(k)))
	}
	slow := Noise{Frequencies: []float64{1e-6}, Weights: []float64{1e-8}}
	m := swung(x, Class{Name: "detuning", Kind: "static", Operator: turnZ(), Noise: slow}, Class{Name: "amplitude", Kind: "amplitude", Noise: slow})
	v, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	e, err := newEngine(context.Background(), m)
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range []*probe{newStatic(turnZ(), 2), e.newAmplitude(nil, "")} {
		o := &probed{probe: p}
		e.weigh(o, e.plans[0])
		a := v.Errors[i].Susceptibility * o.onCode
		want := 2. / 3 * 1e-8 * a * a / 2
		if got := v.Errors[i].NoiseInfidelity; got == nil || !(want > 1e-11 && math.Abs(*got/want-1) <= 1e-5) {
			t.Errorf("%s: slow noise leaves %v, want %v", v.Errors[i].Name, *got, want)
		}
	}
	// Of a fast one, both phases by exact gates: on a line that passes all at once the arriving field is the samples', held, and so is the wave on
	// samples that are cut small.
	fast := Noise{Frequencies: []float64{0.4}, Weights: []float64{1e-8}}
	flat := swung(x)
	flat.Ends = "window"
	flat.Channels[0].Poles, flat.Channels[0].Powers, flat.Channels[0].Residues, flat.Channels[0].Direct = nil, nil, nil, 1
	flat.Errors = []Class{{Name: "amplitude", Kind: "amplitude", Noise: fast}}
	if v, err = flat.Judge(context.Background(), 1e-4); err != nil {
		t.Fatal(err)
	}
	const parts = 64 // of a sample
	fine := *flat
	fine.SamplePeriod, fine.Samples = 1./parts, len(x)*parts
	wavy := func(size float64, wave func(float64) float64) *Model {
		y := make([]complex128, len(x)*parts)
		for k := range y {
			y[k] = x[k/parts] * complex(1+size*wave(0.4*(float64(k)+0.5)/parts), 0)
		}
		return fine.WithSamples(len(y), y)
	}
	// infidelity of the noisy gate to the quiet one: the target is what the quiet one does
	quiet, err := newEngine(context.Background(), wavy(0, math.Cos))
	if err != nil {
		t.Fatal(err)
	}
	var u []complex128
	if err := quiet.run(context.Background(), []gate{{}}, func(_ *labour, _ int, w []complex128) { u = append([]complex128(nil), w...) }); err != nil {
		t.Fatal(err)
	}
	want := 0.0
	for _, wave := range []func(float64) float64{math.Cos, math.Sin} {
		const size = 1e-3
		m := wavy(size, wave)
		m.Target = u
		_, window, _, err := m.Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		want += 1e-8 * window.Infidelity / (size * size)
	}
	if got := *v.Errors[0].NoiseInfidelity; !(math.Abs(got/want-1) <= 1e-3) {
		t.Errorf("noise of the amplitude leaves %v, want %v", got, want)
	}
}

// TestSpreadOfSizes: the mean and the worst over sizes are those of gates with the error in the static part.
func TestSpreadOfSizes(t *testing.T) {
	x := make([]complex128, 24)
	for k := range 20 {
		x[k] = complex(0.5, 0.1*float64(k%3))
	}
	s := Spread{Way: "average", Values: []float64{-0.02, 0.01, 0.03}, Shares: []float64{0.5, 0.2, 0.3}}
	at := func(d float64) float64 {
		m := swung(x)
		m.Ends = "window"
		m.Static = []complex128{complex(d/2, 0), 0, 0, complex(-d/2, 0)}
		_, window, _, err := m.Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		return window.Infidelity
	}
	mean, worst := 0.0, 0.0
	for i, d := range s.Values {
		mean, worst = mean+s.Shares[i]*at(d), math.Max(worst, at(d))
	}
	for way, want := range map[string]float64{"average": mean, "worst": worst} {
		s.Way = way
		m := swung(x, Class{Name: "detuning", Kind: "static", Operator: turnZ(), Spread: s})
		m.Ends = "window"
		v, err := m.Judge(context.Background(), 1e-4)
		if err != nil {
			t.Fatal(err)
		}
		if got := v.Errors[0].SpreadInfidelity; got == nil || v.Errors[0].Spread != way || !(math.Abs(*got-want) <= 1e-12) {
			t.Errorf("%s: %v, want %v", way, got, want)
		}
	}
}

// TestCurveSeries: the series of a map is the map of the series.
func TestCurveSeries(t *testing.T) {
	s := make([]complex128, seriesLength)
	for n, v := range []float64{0.3, -0.5, 0.2, 0.4, -0.1} {
		s[n] = complex(v, 0)
	}
	at := func(list []complex128, y float64) (sum float64) {
		power := 1.0
		for _, v := range list {
			sum, power = sum+real(v)*power, power*y
		}
		return sum
	}
	for _, c := range []*Channel{
		{FullScale: 0.3, MapPolynomial: []float64{0.7, -0.4, 1.5}},
		{FullScale: 0.3, MapLoop: []float64{30, 0.23, 0.15, 0.2}},
	} {
		list := append([]complex128(nil), s...)
		c.curve(list, make([]float64, 4*seriesLength))
		for y := 0.0; y <= 0.5; y += 0.1 {
			x := at(s, y)
			want := 0.7*x - 0.4*x*x + 1.5*x*x*x
			if c.MapLoop != nil {
				want = 30 / 0.3 * (loopAt(0.23+0.15*x, 0.2) - loopAt(0.23, 0.2))
			}
			if got := at(list, y); !(math.Abs(got-want) <= 1e-12*(1+math.Abs(want))) {
				t.Errorf("%v at %v: %v, want %v", c.MapLoop, y, got, want)
			}
		}
		// the bound of the slope is one
		steep := c.steepest()
		for x := -1.2; x < 1.19; x += 0.01 {
			low, high := []complex128{complex(x, 0)}, []complex128{complex(x+0.01, 0)}
			c.curve(low, make([]float64, 4))
			c.curve(high, make([]float64, 4))
			if slope := math.Abs(real(high[0]-low[0])) / 0.01; slope > steep {
				t.Errorf("slope %v at %v, bound %v", slope, x, steep)
			}
		}
	}
}

// TestFluctuationsRefused: what makes no sense of spreads, noises and maps.
func TestFluctuationsRefused(t *testing.T) {
	x := make([]complex128, 8)
	static := func(change func(*Class)) *Model {
		c := Class{Name: "e", Kind: "static", Operator: turnZ()}
		change(&c)
		return swung(x, c)
	}
	bias := func(change func(*Channel)) *Model {
		m := swung(x)
		c := &m.Channels[0]
		c.Kind, c.Operators = "baseband", c.Operators[:1]
		change(c)
		return m
	}
	for key, m := range map[string]*Model{
		"error[0].spread":                       static(func(c *Class) { c.Spread = Spread{"median", []float64{1}, []float64{1}} }),
		"error[0].spread_values":                static(func(c *Class) { c.Spread = Spread{"worst", []float64{1, 2}, []float64{1}} }),
		"error[0].spread_shares":                static(func(c *Class) { c.Spread = Spread{"worst", []float64{1, 2}, []float64{0.5, 0.6}} }),
		"error[0].noise_frequencies_rad_per_ns": static(func(c *Class) { c.Noise = Noise{[]float64{-1}, []float64{1}} }),
		"error[0].noise_weights":                static(func(c *Class) { c.Noise = Noise{[]float64{1}, []float64{math.NaN()}} }),
		"channel[0].map_polynomial":             bias(func(c *Channel) { c.MapPolynomial = []float64{11} }),
		"channel[0].map_loop":                   bias(func(c *Channel) { c.MapLoop = []float64{30, 0.4, 0.2, 0} }),
	} {
		if f := m.validate(); f == nil || f.key != key {
			t.Errorf("%s: %v", key, f)
		}
	}
	if f := bias(func(c *Channel) { c.MapLoop = []float64{30, 0.2, 0.1, 0.1} }).validate(); f != nil {
		t.Errorf("a loop: %v", f)
	}
	quadrature := swung(x)
	quadrature.Channels[0].MapPolynomial = []float64{1, 0.1}
	if f := quadrature.validate(); f == nil || f.key != "channel[0].map_polynomial" {
		t.Errorf("a map of a quadrature channel: %v", f)
	}
	shifted := swung(x, Class{Name: "e", Kind: "amplitude", Noise: Noise{[]float64{0.1}, []float64{1e-6}}})
	if f := shifted.validate(); f != nil {
		t.Errorf("noise of the amplitude: %v", f)
	}
	shifted.Channels[0].Shift, shifted.Channels[0].ShiftOperator = 0.01, turnZ()
	if f := shifted.validate(); f == nil || f.key != "error[0].noise_frequencies_rad_per_ns" {
		t.Errorf("noise of the amplitude of a channel with a shift: %v", f)
	}
	mapped := bias(func(c *Channel) { c.MapPolynomial = []float64{1, 0.1} })
	mapped.Errors = []Class{{Name: "e", Kind: "amplitude", Channels: []string{"drive"}}}
	if f := mapped.validate(); f == nil || f.key != "error[0].channels" {
		t.Errorf("the amplitude of a mapped channel: %v", f)
	}
}
