package datasheet

import (
	"math"

	"holdfast/design/replay"
	"holdfast/hardware"
)

// demoSheet is a sheet of invented figures in the likeness of a pulse on a rack
// with a two-pole line and a slow tail. It tests the page, not the physics.
func demoSheet() *Sheet {
	const n, free, lsb = 112, 108, 1.0 / 8192
	x := make([]complex128, n)
	for k := range free {
		t := (float64(k) + 0.5) / free
		w := math.Sin(math.Pi * t)
		i := w * (0.36 + 0.34*math.Cos(4*math.Pi*t) - 0.3*math.Cos(8*math.Pi*t) + 0.06*math.Sin(10*math.Pi*t))
		q := w * (0.46*math.Sin(2*math.Pi*t) + 0.3*math.Sin(6*math.Pi*t) - 0.12*math.Cos(6*math.Pi*t))
		x[k] = complex(math.Round(i/lsb)*lsb, math.Round(q/lsb)*lsb)
	}
	s := &Sheet{
		Name: "X90 held against any static error", Target: "X90 on q1", Span: n, Ends: "settled", Held: []string{"any static error"},
		Instrument: "rack B", SamplePeriod: 1, Bits: 14, WindowStart: 3.2, T1: 60e3, T2: 40e3,
		Channels: []Channel{{
			Name: "q1 drive", FullScale: 40, FullScaleLevel: 0.5, Band: 0.1, GuardTrail: 4, AmplitudeLimit: 0.95, RingOutLimit: 0.001,
			Samples: x, Arrives: demoArrivals(x),
			Line: func(mhz float64) complex128 {
				f := mhz / 200
				return 1 / complex(1-0.618*f*f, 1.36*f)
			},
			LineFacts:   []string{"Delay of 3.2 ns.", "Bessel low-pass of order 2, corner 200 MHz.", "Settling tail of -1.5 % with 30 ns."},
			LineFigures: []Row{{"transition time, 10 to 90 %", "1.73 ns"}, {"overshoot", "0.39 %"}, {"settles to 0.1 %", "81.2 ns"}},
		}},
		Basis:      []Row{{"family", "Slepian, ±100 MHz"}, {"coefficients", "20 per quadrature"}},
		Search:     []Row{{"seed", "1"}, {"starts tried", "3 of 60"}, {"stopped", "converged"}, {"evaluations", "412"}},
		Provenance: []Row{{"program", "holdfast 0.1"}, {"inputs", "profile.toml, device.toml, brief.toml"}},
		Files:      []Row{{"q1-drive.npy", "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08"}},
		Cautions:   []string{"The channel gives up to 0.5 V at full code before any amplifier."},
	}
	for k := range 20 {
		s.CoefficientsI = append(s.CoefficientsI, math.Round(1e6*math.Cos(float64(3*k)))/1e6)
		s.CoefficientsQ = append(s.CoefficientsQ, math.Round(1e6*math.Sin(float64(5*k)))/1e6)
	}
	s.Verdict = demoVerdict()
	s.Rivals = []Rival{
		{Name: "square", Span: 16, Infidelity: 4.1e-6, BreaksRingOut: true, RingOut: 0.0062, PairInfidelity: 3.1e-4,
			Samples: []complex128{.2232, .4464, .6696, .8929, .8929, .8929, .8929, .6696, .4464, .2232, 0, 0, 0, 0, 0, 0},
			Errors:  demoErrors(1, 1, 1.6e-6, 1.1e-3)},
		{Name: "raised cosine", Span: 24, Infidelity: 2.2e-6, BreaksRingOut: true, RingOut: 0.0041, PairInfidelity: 1.4e-4,
			Samples: []complex128{.0124, .1087, .2835, .5, .7165, .8913, .9876, .9876, .8913, .7165, .5, .2835, .1087, .0124, 0, 0},
			Errors:  demoErrors(1, 0.97, 2.2e-6, 2.5e-3)},
	}
	return s
}

// demoArrivals is the held input through one pole of 0.8 ns and a tail.
func demoArrivals(x []complex128) []Arrival {
	var out []Arrival
	var u, tail complex128
	for step := range int(154/0.25) + 1 {
		t := 1.2 + 0.25*float64(step)
		in := complex128(0)
		if k := int(math.Floor(t - 3.2)); k >= 0 && k < len(x) {
			in = x[k]
		}
		u += (in - u) * 0.27
		tail += (in - tail) * (0.25 / 30)
		out = append(out, Arrival{t, u - 0.015*(in-tail)})
	}
	return out
}

// demoErrors has one curve per error: quadratic for plain pulses, quartic where
// held.
func demoErrors(susceptibility, scale, floor, rate float64) []replay.Error {
	var out []replay.Error
	for _, e := range []struct {
		name, kind, unit string
		end              float64
	}{{"any static error", "any", "MHz", 3}, {"detuning", "static", "MHz", 10}, {"amplitude", "amplitude", "%", 20},
		{"X", "static", "MHz", 10}, {"Y", "static", "MHz", 10}, {"Z", "static", "MHz", 10}} {
		r := rate
		if e.unit == "%" {
			r /= 30
		}
		c := replay.Error{Name: e.name, Kind: e.kind, Unit: e.unit, Susceptibility: susceptibility * scale}
		for k := -20; k <= 20; k++ {
			v := e.end * float64(k) / 20
			c.Curve = append(c.Curve, replay.Point{Value: v, Infidelity: math.Min(0.6, floor+r*v*v)})
		}
		c.High = math.Round(1e4*math.Sqrt((1e-4-floor)/r)) / 1e4
		c.Low = -c.High
		out = append(out, c)
	}
	return out
}

func demoVerdict() *replay.Verdict {
	v := &replay.Verdict{
		Name: "X90 held against any static error", Ends: "settled",
		Settled: replay.Figures{Infidelity: 2.71e-9}, Window: replay.Figures{Infidelity: 6.13e-6},
		TailAngle: 0.00612, Pair: replay.Pair{Infidelity: 1.24e-5, Phase: 90}, Decoherence: 1.2444e-3,
		Agreement: replay.Agreement{Infidelity: 3e-14, Susceptibility: 2e-8, TailAngle: 1e-9, OK: true},
		Requirements: []replay.Requirement{
			{Name: "infidelity", Found: 2.71e-9, Allowed: 1e-4, Met: true},
			{Name: "susceptibility to any static error", Found: 1.24e-6, Allowed: 1e-3, Met: true},
			{Name: "margin against detuning", Unit: "MHz", Found: 2.84, Allowed: 1, Margin: true, Met: true},
		},
		Warnings: []string{"Amplitude is not among the errors that the pulse is held against."},
	}
	for _, l := range []hardware.Reading{
		{Limit: "amplitude", Unit: "of full scale", Found: 0.8713, Allowed: 0.95, Headroom: 0.08284, OK: true},
		{Limit: "slew", Unit: "of full scale per sample", Found: 0.24878, Allowed: 0.25, Headroom: 0.00488, OK: true},
		{Limit: "ring-out (fast)", Unit: "of full scale", Found: 0.000931, Allowed: 0.001, Headroom: 0.069, OK: true},
		{Limit: "ring-out (tail)", Unit: "of full scale", Found: 0.00064, Allowed: 0.001, Headroom: 0.36, OK: true},
		{Limit: "guards", Unit: "of full scale", Found: 0, Allowed: 0, Headroom: 0, OK: true},
		{Limit: "length", Unit: "samples", Found: 112, Allowed: 65536, Headroom: 0.99829, OK: true},
	} {
		v.Limits = append(v.Limits, replay.Limit{Channel: "q1 drive", Reading: l})
	}
	for _, e := range demoErrors(1, 1, 0, 1) {
		e.Curve = nil
		e.Susceptibility = 1.24e-6
		quartic, end := 4e-5, 10.0
		switch e.Kind {
		case "amplitude":
			quartic, end, e.Susceptibility = 0, 20, 0.83
		case "any":
			e.Held, end, quartic = true, 3, 1.5e-4
			e.WorstDirection, e.WorstSusceptibility = "0.83 X - 0.41 Y", 1.9e-6
		}
		for k := -20; k <= 20; k++ {
			x := end * float64(k) / 20
			p := replay.Point{Value: x, Infidelity: 2.71e-9 + quartic*x*x*x*x/(1+0.02*x*x)}
			if quartic == 0 {
				p.Infidelity = math.Min(0.5, 2.71e-9+6e-5*x*x)
			}
			e.Curve = append(e.Curve, p)
		}
		switch e.Kind {
		case "amplitude":
			e.Low, e.High = -1.29, 1.29
		case "any":
			e.Low, e.High = -0.904, 0.904
		default:
			e.Low, e.High = -1.267, 1.267
		}
		v.Errors = append(v.Errors, e)
	}
	v.Errors[3].Low, v.Errors[3].High = -0.18, 0.19
	v.Errors[3].Susceptibility = 0.91
	for k := range 11 {
		a := 0.9 + 0.02*float64(k)
		v.BringUp.Amplitude = append(v.BringUp.Amplitude, replay.Population{Value: math.Round(100*a) / 100, One: 0.5 + 0.8*(a-1)})
		d := float64(k - 5)
		v.BringUp.Detuning = append(v.BringUp.Detuning, replay.Population{Value: d, One: 0.5 + 0.0004*d*d*d})
	}
	for k := 1; k <= 32; k++ {
		v.BringUp.Repeats = append(v.BringUp.Repeats, replay.Population{Value: float64(k), One: []float64{0, 0.5, 1, 0.5}[k%4]})
	}
	return v
}
