package device

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"holdfast/hardware/quantity"
)

func loopOf(highest, bias, fullScale, asymmetry float64) *Bias {
	return &Bias{Axis: "Z", Loop: &Loop{Highest: highest, Bias: bias, FullScale: fullScale, Asymmetry: asymmetry}}
}

// Rates by their definitions: a sum of powers, and the root of the cosine of the flux. With like junctions g = sqrt |cos(pi f)|, of which slope and
// curvature have short closed forms; with one junction alone nothing is tuned.
func TestRate(t *testing.T) {
	const full = 0.7
	p := []float64{1, 0.2, -0.05, 0, 2, -1.5, 0.3, 9}
	for n := range p {
		b := &Bias{Polynomial: p[:n+1]}
		for s := -1.2; s < 1.3; s += 0.1 {
			var want [3]float64
			for i, c := range b.Polynomial {
				k := float64(i + 1)
				want[0] += full * c * math.Pow(s, k)
				want[1] += full * c * k * math.Pow(s, k-1)
				if i > 0 {
					want[2] += full * c * k * (k - 1) * math.Pow(s, k-2)
				}
			}
			rate, slope, curvature := b.Rate(s, full)
			for i, got := range []float64{rate, slope, curvature} {
				if !(math.Abs(got-want[i]) <= 1e-12*(1+math.Abs(want[i]))) {
					t.Errorf("%d powers at %v, derivative %d: %v, want %v", n+1, s, i, got, want[i])
				}
			}
		}
	}
	straight := &Bias{}
	if rate, slope, curvature := straight.Rate(-0.3, full); rate != full*-0.3 || slope != full || curvature != 0 {
		t.Errorf("straight: %v, %v, %v", rate, slope, curvature)
	}
	const highest, bias, scale = 32.0, 0.21, -0.2
	for s := -1.0; s <= 1; s += 0.05 {
		a := math.Pi * (bias + scale*s)
		root := math.Sqrt(math.Cos(a))
		k := math.Pi * scale
		want := [3]float64{
			highest * (root - math.Sqrt(math.Cos(math.Pi*bias))),
			-highest * k * math.Sin(a) / (2 * root),
			-highest * k * k * (root/2 + math.Sin(a)*math.Sin(a)/(4*root*root*root)),
		}
		rate, slope, curvature := loopOf(highest, bias, scale, 0).Rate(s, full)
		for i, got := range []float64{rate, slope, curvature} {
			if !(math.Abs(got-want[i]) <= 1e-12*highest) {
				t.Errorf("like junctions at %v, derivative %d: %v, want %v", s, i, got, want[i])
			}
		}
		if rate, slope, curvature := loopOf(highest, bias, scale, 1).Rate(s, full); !(math.Abs(rate) <= 1e-13) || slope != 0 || curvature != 0 {
			t.Errorf("one junction at %v: %v, %v, %v", s, rate, slope, curvature)
		}
	}
	// At half a quantum unlike junctions leave the root of their asymmetry; like ones leave nothing, and a corner.
	if rate, slope, _ := loopOf(1, 0, 0.5, 0.09).Rate(1, full); !(math.Abs(rate-(0.3-1)) <= 1e-15) || !(math.Abs(slope) <= 1e-14) {
		t.Errorf("half a quantum: %v, %v", rate, slope)
	}
	for s := -3.0; s <= 3; s += 0.25 {
		for _, v := range values(loopOf(1, 0.5, 0.5, 0), s) {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Errorf("like junctions at %v: %v", s, v)
			}
		}
	}
}

func values(b *Bias, s float64) [3]float64 {
	rate, slope, curvature := b.Rate(s, 0.7)
	return [3]float64{rate, slope, curvature}
}

// Slope and curvature against central differences of fourth order of what they are derivatives of.
func TestRateDifferences(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 1))
	for range 200 {
		b := loopOf(30*r.Float64(), 2*r.Float64()-1, 2*r.Float64()-1, 0.2+0.8*r.Float64())
		if r.IntN(2) == 0 {
			b = &Bias{}
			for range 1 + r.IntN(8) {
				b.Polynomial = append(b.Polynomial, r.NormFloat64())
			}
		}
		s := 2*r.Float64() - 1
		at := values(b, s)
		if got := values(b, 0)[0]; got != 0 {
			t.Fatalf("%+v: a rate of %v at rest", b, got)
		}
		const e = 1e-3
		for i := range 2 {
			want := (8*(values(b, s+e)[i]-values(b, s-e)[i]) - (values(b, s+2*e)[i] - values(b, s-2*e)[i])) / (12 * e)
			if !(math.Abs(at[i+1]-want) <= 1e-7*(1+math.Abs(want))) {
				t.Fatalf("%+v %+v at %v: derivative %d is %v, the differences give %v", b, b.Loop, s, i+1, at[i+1], want)
			}
		}
	}
}

// A device with a bias that has the keys.
func mapped(keys string) string {
	return "format = 1\nname = 'd'\n[[site]]\nname = 'q1'\n[[site]]\nname = 'q2'\nzero = 'upper'\n[[bias]]\nsite = 'q1'\nchannel = 'flux'\n" + keys + "\n"
}

func TestLoadMaps(t *testing.T) {
	for _, c := range []struct {
		keys string
		want Bias
	}{
		{"", Bias{}},
		{"polynomial = [1]", Bias{}},
		{"polynomial = [1.0]\naxis = 'X'", Bias{Axis: "X"}},
		{"polynomial = [-1]", Bias{Polynomial: []float64{-1}}},
		{"polynomial = [1, 0.2, -0.05]\naxis = 'Y'", Bias{Axis: "Y", Polynomial: []float64{1, 0.2, -0.05}}},
		{"polynomial = [0, 0, 0, 0, 0, 0, 0, 10]", Bias{Polynomial: []float64{0, 0, 0, 0, 0, 0, 0, 10}}},
		{"loop = { highest = '5.2 GHz', bias = 0.23, full_scale = 0.15, asymmetry = 0.1 }", Bias{Loop: &Loop{2 * math.Pi * 5.2, 0.23, 0.15, 0.1}}},
		{"loop = { highest = '5.2 GHz', full_scale = -0.479 }", Bias{Loop: &Loop{2 * math.Pi * 5.2, 0, -0.479, 0}}},
		{"loop = { highest = '5.2 GHz', bias = -0.6, full_scale = 0.3, asymmetry = 0.01 }", Bias{Loop: &Loop{2 * math.Pi * 5.2, -0.6, 0.3, 0.01}}},
		{"loop = { highest = '5.2 GHz', bias = 0.75, full_scale = 0.22 }", Bias{Loop: &Loop{2 * math.Pi * 5.2, 0.75, 0.22, 0}}},
	} {
		d := mustRead(t, mapped(c.keys))
		c.want.Site, c.want.Channel, c.want.Line = "q1", "flux", 10
		if c.want.Axis == "" {
			c.want.Axis = "Z"
		}
		got := d.Biases[0]
		if got.Loop != nil && c.want.Loop != nil && math.Abs(got.Loop.Highest-c.want.Loop.Highest) <= 1e-14 {
			got.Loop.Highest = c.want.Loop.Highest
		}
		if !reflect.DeepEqual(got, c.want) {
			t.Errorf("%s: %+v %+v", c.keys, got, got.Loop)
		}
		if m := d.Map("flux"); (m != nil) != c.want.Mapped() || m != nil && m != &d.Biases[0] || d.Map("other") != nil {
			t.Errorf("%s: map %+v", c.keys, m)
		}
	}
}

func TestMapRefuses(t *testing.T) {
	const tuned = "highest = '5.2 GHz', "
	long := "polynomial = [" + strings.Repeat("1, ", 8) + "1]"
	for _, c := range []struct{ keys, want string }{
		{"polynomial = [1, 2]\nloop = { " + tuned + "full_scale = 0.1 }", "d.toml:12: bias[0].loop: found a loop beside a polynomial; allowed: one of the two"},
		{"polynomial = 1", "d.toml:11: bias[0].polynomial: found 1; allowed: an array of at most 8 numbers"},
		{long, "d.toml:11: bias[0].polynomial: found an array of 9; allowed: an array of at most 8 numbers"},
		{"polynomial = [1, 11]", "d.toml:11: bias[0].polynomial: found 11 as element 1; allowed: numbers, -10 to 10"},
		{"polynomial = [1, nan]", "d.toml:11: bias[0].polynomial: found NaN as element 1; allowed: numbers, -10 to 10"},
		{"polynomial = ['1 MHz']", `d.toml:11: bias[0].polynomial: found "1 MHz" as element 0; allowed: numbers, -10 to 10`},
		{"polynomial = []", "d.toml:11: bias[0].polynomial: found []; allowed: 1 to 8 numbers, -10 to 10, one of them at least 1e-06 in size, as in [1, 0.2]"},
		{"polynomial = [0, 9e-7]", "d.toml:11: bias[0].polynomial: found [0 9e-07]; allowed: 1 to 8 numbers, -10 to 10, one of them at least 1e-06 in size, as in [1, 0.2]"},
		{"loop = 3", "d.toml:11: bias[0].loop: found 3; allowed: a table, [bias[0].loop] or loop = { ... }"},
		{"loop = { full_scale = 0.1 }", `d.toml:11: bias[0].loop.highest: found nothing; allowed: a frequency such as "40 MHz", 1 MHz to 1000 GHz`},
		{"loop = { highest = 5.2, full_scale = 0.1 }", `d.toml:11: bias[0].loop.highest: found 5.2; allowed: a frequency such as "40 MHz", 1 MHz to 1000 GHz (a bare number has no unit: write a quantity in quotes)`},
		{"loop = { " + tuned + "bias = 0.1 }", "d.toml:11: bias[0].loop.full_scale: found nothing; allowed: a number, -1 to 1"},
		{"loop = { " + tuned + "full_scale = 1.1 }", "d.toml:11: bias[0].loop.full_scale: found 1.1; allowed: a number, -1 to 1"},
		{"loop = { " + tuned + "full_scale = 1e-7 }", "d.toml:11: bias[0].loop.full_scale: found 1e-07; allowed: flux quanta, at least 1e-06 in size and at most 1"},
		{"loop = { " + tuned + "full_scale = 0.1, bias = 'x' }", `d.toml:11: bias[0].loop.bias: found "x"; allowed: a number, -1 to 1 (this figure has no unit: write it without quotes)`},
		{"loop = { " + tuned + "full_scale = 0.1, asymmetry = 1.1 }", "d.toml:11: bias[0].loop.asymmetry: found 1.1; allowed: a number, 0 to 1"},
		{"loop = { " + tuned + "full_scale = 0.1, asymmetri = 0.1 }", "d.toml:11: bias[0].loop.asymmetri: found an unknown key; allowed: highest, bias, full_scale, asymmetry (did you mean asymmetry?)"},
		{"axis = 'X'\nloop = { " + tuned + "full_scale = 0.1 }", `d.toml:11: bias[0].axis: found "X" beside a loop; allowed: "Z", as it is the transition that a loop tunes`},
		{"loop = { " + tuned + "bias = 0.3, full_scale = 0.181 }", "d.toml:11: bias[0].loop.asymmetry: found 0 where the flux goes from 0.119 to 0.481 quanta; allowed: at least 0.01, or a flux that stays 0.02 away from half a quantum"},
		{"loop = { " + tuned + "bias = -0.75, full_scale = -0.231, asymmetry = 0.009 }", "d.toml:11: bias[0].loop.asymmetry: found 0.009 where the flux goes from -0.981 to -0.519 quanta; allowed: at least 0.01, or a flux that stays 0.02 away from half a quantum"},
		{"loop = { " + tuned + "bias = -0.6, full_scale = 0.3 }", "d.toml:11: bias[0].loop.asymmetry: found 0 where the flux goes from -0.9 to -0.3 quanta; allowed: at least 0.01, or a flux that stays 0.02 away from half a quantum"},
		{"loop = { " + tuned + "bias = 0.1, full_scale = 0.3, asymmetry = 1 }", "d.toml:11: bias[0].loop: found a transition that the flux, from -0.2 to 0.4 quanta, changes by less than 1 kHz; allowed: a larger change (less asymmetry, or a larger full_scale)"},
		{"loop = { " + tuned + "full_scale = 1e-4 }", "d.toml:11: bias[0].loop: found a transition that the flux, from -0.0001 to 0.0001 quanta, changes by less than 1 kHz; allowed: a larger change (less asymmetry, or a larger full_scale)"},
		{"polynomial = [1, 0.1]\n[[crosstalk]]\nchannel = 'flux'\nsite = 'q2'\nshare = '3 %'", `d.toml:13: crosstalk[0].channel: found "flux", whose bias has a polynomial or a loop; allowed: a channel without (what reaches another site has a map of its own)`},
	} {
		doc, err := quantity.ParseDocument("d.toml", []byte(mapped(c.keys)))
		if err == nil {
			_, err = read(doc)
		}
		if err == nil || err.Error() != c.want {
			t.Errorf("%s:\n got %v\nwant %s", c.keys, err, c.want)
		}
	}
	// A straight one goes on to be allowed.
	mustRead(t, mapped("polynomial = [1]\n[[crosstalk]]\nchannel = 'flux'\nsite = 'q2'\nshare = '3 %'"))
}

// A loop raises the transition where its rate is positive: the operator has the sign of a detuning, whichever energy |0> has, on a spin and on a ladder; a
// polynomial's has none. What a loop adds is what H0 would gain from a detuning of that rate.
func TestLoopSign(t *testing.T) {
	const rate = 0.37
	for _, site := range []string{"zero = 'lower'", "zero = 'upper'", "levels = 3\nanharmonicity = '-220 MHz'", "kind = 'spin'\nlevels = 4", "kind = 'spin'\nlevels = 4\nzero = 'upper'"} {
		text := func(detuning, keys string) string {
			return fmt.Sprintf("format = 1\nname = 'd'\n[[site]]\nname = 'q0'\n[[site]]\nname = 'q1'\n%s\ndetuning = '%s'\n[[bias]]\nsite = 'q1'\nchannel = 'flux'\n%s\n", site, detuning, keys)
		}
		loop := mustRead(t, text("1 MHz", "loop = { highest = '5 GHz', bias = 0.2, full_scale = 0.1 }"))
		moved := mustRead(t, text("1 MHz", "polynomial = [0, 1]"))
		moved.Sites[1].Detuning += rate
		want := moved.Static().Add(-1, loop.Static())
		ops := loop.Paths("flux", "")[0].Operators
		if got := ops[0].Scale(rate); len(ops) != 1 || !near(got, want, 1e-14) {
			t.Errorf("%s: a loop adds %v, a detuning %v", site, got, want)
		}
		if got := loop.BiasOperator(0); !near(loop.Embed(map[int]Matrix{1: got}), ops[0], 0) {
			t.Errorf("%s: operator %v", site, got)
		}
		if got := moved.BiasOperator(0); !near(got, moved.Local(1, "Z").Scale(0.5), 0) {
			t.Errorf("%s: a polynomial drives %v", site, got)
		}
	}
}
