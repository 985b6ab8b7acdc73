package design

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/replay"
)

// A register writes rack "B" with a drive for each of n spins, a device of these spins with the
// given couplings, and a brief; and loads the three. Sites are q1, q2, ..., and each is driven by
// its own channel, "q1 drive" and so on. sites are further keys of theirs; nil for none.
func register(t testing.TB, n int, couplings, wanted string, sites ...string) Inputs {
	t.Helper()
	rack, err := os.ReadFile("../testdata/skerry/rack-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	head, channel, ok := strings.Cut(string(rack), "\n[[channel]]")
	if !ok {
		t.Fatal("the rack has no channel")
	}
	dir := t.TempDir()
	profile, device := head, "format = 1\nname = \"register\"\n"
	for i := range n {
		name := fmt.Sprintf("q%d", i+1)
		profile += "\n[[channel]]" + strings.Replace(channel, "q1 drive", name+" drive", 1)
		keys := "zero = \"upper\""
		if i < len(sites) {
			keys = sites[i]
		}
		device += fmt.Sprintf("[[site]]\nname = %q\n%s\n[[drive]]\nsite = %q\nchannel = \"%s drive\"\n", name, keys, name, name)
	}
	for name, text := range map[string]string{"rack.toml": profile, "device.toml": device + couplings, "rates.csv": rates, "brief.toml": "format = 1\nname = \"m\"\nprofile = \"rack.toml\"\ndevice = \"device.toml\"\n" + wanted} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	b, p, d, err := brief.LoadAll(filepath.Join(dir, "brief.toml"))
	if err != nil {
		t.Fatal(err)
	}
	return Inputs{Brief: b, Profile: p, Device: d, Version: "test"}
}

// rates are learned Pauli rates of two spins over two decades; invented.
const rates = "pauli,rate\nZI,1e-3\nIZ,7e-4\nZZ,3e-4\nXI,2e-4\nIX,1e-4\nYI,1.5e-4\nIY,8e-5\nXX,2e-5\nYY,3e-5\nXY,1e-5\nYX,1e-5\nXZ,4e-5\nZX,2e-5\nYZ,1e-5\nZY,3e-5\n"

// exchanged is the coupling of two spins by exchange, 5 MHz.
const exchanged = "[[coupling]]\nkind = \"exchange\"\nbetween = [\"q1\", \"q2\"]\nstrength = \"5 MHz\"\n"

const both = "[target]\nsites = [\"q1\", \"q2\"]\n"

// registers are designed, written and replayed.
var registers = []struct {
	name      string
	couplings string
	sites     []string
	wanted    string
	tolerance float64 // of the infidelity before rounding; 0: 1e-9
}{
	{name: "sqrt-iSWAP", couplings: exchanged, wanted: "span = \"40 ns\"\nhold = \"nothing\"\n" + both + "gate = \"sqrt-iSWAP\"\nfree_z = \"both\""},
	{name: "CNOT", couplings: exchanged, wanted: "span = \"64 ns\"\nhold = \"nothing\"\n" + both + "gate = \"CNOT\"\nfree_z = \"both\""},
	{name: "up to local rotations", couplings: exchanged, wanted: "span = \"56 ns\"\nhold = \"nothing\"\n" + both + "gate = \"CNOT\"\nup_to = \"local rotations\""},
	{name: "a coupling that turns", couplings: exchanged, sites: []string{"frequency = \"5.1 GHz\"", "frequency = \"5.13 GHz\""},
		wanted: "span = \"64 ns\"\nhold = \"nothing\"\n[target]\ngates = { q1 = \"X90\", q2 = \"identity\" }"},
	{name: "a coupling left out", couplings: exchanged + "rotating_wave = true\n", sites: []string{"frequency = \"5.1 GHz\"", "frequency = \"5.9 GHz\""},
		wanted: "span = \"48 ns\"\nhold = \"nothing\"\n[target]\ngates = { q1 = \"X90\", q2 = \"X90\" }"},
	{name: "crosstalk", couplings: "[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q2\"\nshare = \"6 %\"\nphase = \"40 deg\"\n[[crosstalk]]\nchannel = \"q2 drive\"\nsite = \"q1\"\nshare = \"3 %\"\n",
		sites: []string{"frequency = \"5.1 GHz\"", "frequency = \"5.15 GHz\""}, wanted: "span = \"72 ns\"\nrefine = false\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\namplitude = \"q1 drive\"\n[[error]]\ndetuning = \"q1\""},
	{name: "unknown crosstalk", couplings: "[[coupling]]\nkind = \"heisenberg\"\nbetween = [\"q1\", \"q2\"]\nstrength = \"500 kHz\"\n",
		wanted: "span = \"120 ns\"\nrefine = false\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\ncrosstalk = \"q1 drive\"\nsite = \"q2\"\n"},
	{name: "a ladder beside a spin", couplings: "[[coupling]]\nkind = \"dispersive\"\nbetween = [\"q1\", \"q2\"]\nstrength = \"300 kHz\"\n", sites: []string{"levels = 3\nanharmonicity = \"-220 MHz\"", ""},
		wanted: "span = \"96 ns\"\nhold = \"nothing\"\n[target]\nsite = \"q1\"\ngate = \"X90\"\nfree_z = \"after\""},
	{name: "a pair of states", couplings: exchanged, wanted: "span = \"120 ns\"\nrefine = false\n[target]\nfrom = \"00\"\nto = [0.7071067811865476, 0, 0, [0, 0.7071067811865476]]\n[[error]]\ndetuning = \"q1\""},
	{name: "subspaces", couplings: exchanged, wanted: "span = \"80 ns\"\nhold = \"nothing\"\n[target]\nfrom = [\"00\", \"11\"]\nto = [\"01\", \"10\"]"},
	{name: "second order", wanted: "span = \"120 ns\"\nrefine = false\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\ndetuning = \"q1\"\norder = 2"},
	{name: "one body", couplings: exchanged, wanted: "span = \"272 ns\"\nrefine = false\n" + both + "gate = \"sqrt-iSWAP\"\nfree_z = \"both\"\n[[error]]\nany = \"one-body\"", tolerance: 1e-8},
}

// TestRegister designs gates and states of registers, writes them and has replay judge
// them, which must agree with the record, and with inputs/ on the model.
func TestRegister(t *testing.T) {
	for _, c := range registers {
		t.Run(c.name, func(t *testing.T) {
			n := 2
			if len(c.sites) == 1 || !strings.Contains(c.couplings+c.wanted, "q2") && !strings.Contains(c.wanted, "from") {
				n = 1
			}
			in := register(t, n, c.couplings, c.wanted, c.sites...)
			p, f, took := folderOf(t, in)
			if p.Status != Found {
				t.Fatalf("%s", p.Summary())
			}
			exact, err := f.Model.BeforeRounding().Judge(context.Background(), 1e-4)
			if err != nil {
				t.Fatal(err)
			}
			tolerance := c.tolerance
			if tolerance == 0 {
				tolerance = 1e-9
			}
			if !(exact.Required().Infidelity <= tolerance) {
				t.Errorf("infidelity %.2g before rounding", exact.Required().Infidelity)
			}
			for _, e := range exact.Errors {
				if e.Held && !(e.Susceptibility <= 1e-4) {
					t.Errorf("%s: susceptibility %.2g before rounding", e.Name, e.Susceptibility)
				}
			}
			v, err := replay.Judge(context.Background(), f)
			if err != nil {
				t.Fatal(err)
			}
			t.Logf("%s in %v; infidelity %.2g; differs by %.2g, %.2g; inputs %v", p.Summary(), took, v.Required().Infidelity, v.Agreement.Infidelity, v.Agreement.Susceptibility, v.Inputs)
			if !v.Met() || len(v.Inputs) > 0 {
				t.Errorf("replay does not agree, or a limit or a requirement is broken: %+v %v %+v", v.Agreement, v.Inputs, v.Requirements)
			}
		})
	}
}

// agreed has replay judge a folder: it must agree with the record and with inputs/.
func agreed(t *testing.T, f *replay.Folder) {
	t.Helper()
	v, err := replay.Judge(context.Background(), f)
	if err != nil {
		t.Fatal(err)
	}
	if !v.Met() || len(v.Inputs) > 0 {
		t.Errorf("replay does not agree, or a limit or a requirement is broken: %+v %v %+v", v.Agreement, v.Inputs, v.Requirements)
	}
}

// TestAgreement: where a search finds nothing, record and replay agree all the same: on what leads out of the code space, of gates, classes
// of leakage and states, on the noise of an amplitude, and on a shift with a slow tail.
func TestAgreement(t *testing.T) {
	ladder := "levels = 3\nanharmonicity = \"-220 MHz\""
	loose := "\n[require]\ninfidelity = 1\nsusceptibility = 1\n"
	for name, in := range map[string]Inputs{
		"leakage":                  register(t, 1, "", "span = \"48 ns\"\nstarts = 1\nrefine = false\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\nany = \"leakage\""+loose, ladder),
		"leaking states":           register(t, 1, "", "span = \"32 ns\"\nstarts = 1\nrefine = false\n[target]\nfrom = \"0\"\nto = \"1\"\n[[error]]\ndetuning = \"q1\"\nspread = \"average\""+loose, ladder),
		"noise of drives":          register(t, 1, "", "span = \"48 ns\"\nstarts = 1\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\namplitude = \"q1 drive\"\nnoise = { form = \"white\", sigma = \"0.5 %\", high = \"20 MHz\" }"+loose),
		"a shift with a slow pole": scene{ns: 64, channel: "shift = \"2 MHz\"", line: "lowpass = { family = \"single-pole\", corner = \"10 MHz\" }\n", head: "starts = 1\nrefine = false", errors: "[[error]]\ndetuning = \"q1\""}.inputs(t),
	} {
		p, f, _ := folderOf(t, in)
		v, err := replay.Judge(context.Background(), f)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		t.Logf("%s: %s; %+v", name, p.Summary(), v.Agreement)
		if !v.Agreement.OK || len(v.Inputs) > 0 {
			t.Errorf("%s: %+v %v", name, v.Agreement, v.Inputs)
		}
		for i, e := range v.Errors {
			if name == "leakage" && i == 0 && !(*e.LeakSusceptibility > 1e-4) || name == "leaking states" && i == 0 && !(*e.LeakSusceptibility > 1e-4) || name == "noise of drives" && i == 0 && !(*e.NoiseInfidelity > 1e-8) {
				t.Errorf("%s: too little to test anything: %+v", name, e)
			}
		}
	}
}

// TestSpreads: held over a spread of detunings, the mean and the worst infidelity are what they are said to be, and each is the
// smaller of the two where it was asked for.
func TestSpreads(t *testing.T) {
	in := func(spread string) Inputs {
		return register(t, 1, "", "span = \"64 ns\"\nstarts = 12\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\ndetuning = \"q1\"\n"+spread+"\n[require]\ninfidelity = 1e-3\nsusceptibility = 1")
	}
	values := "values = [\"-6 MHz\", \"-3 MHz\", \"0 MHz\", \"3 MHz\", \"6 MHz\"]"
	losses := func(in Inputs) (mean, worst float64) {
		p, folder, _ := folderOf(t, in)
		if p.Status != Found {
			t.Fatal(p.Summary())
		}
		agreed(t, folder)
		q, err := newTask(in, brief.Slepian)
		if err != nil {
			t.Fatal(err)
		}
		g := q.gate(true)
		u, v := q.controls(&q.fine, [][]complex128{p.Channels[0].Exact})
		for i := range 5 {
			h := q.spin.Held[0]
			h.Values, h.Shares = []float64{float64(i-2) * 2 * math.Pi * 3e-3}, []float64{1}
			loss := q.evaluator(q.fine.Grid, q.fineR, append(q.spin.Held[:0:0], h), 0).MeanInfidelity(u, v, 0)
			mean, worst = mean+loss/5, math.Max(worst, loss)
		}
		want := mean
		if in.Brief.Errors[0].Spread == brief.Corners {
			want = worst
		}
		if got := g.MeanInfidelity(u, v, 0); !(math.Abs(got-want) <= 1e-12) {
			t.Errorf("%s: %v, want %v", in.Brief.Errors[0].Spread, got, want)
		}
		if got := *p.Record.Model.Errors[0].SpreadInfidelity; !(math.Abs(got/want-1) <= 0.1) { // of the codes
			t.Errorf("%s: the record says %v, want about %v", in.Brief.Errors[0].Spread, got, want)
		}
		return mean, worst
	}
	am, aw := losses(in("spread = \"average\"\n" + values))
	wm, ww := losses(in("spread = \"worst\"\n" + values))
	t.Logf("average: mean %.3g, worst %.3g; worst: mean %.3g, worst %.3g", am, aw, wm, ww)
	if !(am < wm && ww < aw) {
		t.Errorf("average: mean %v, worst %v; worst: mean %v, worst %v", am, aw, wm, ww)
	}
	// Gauss and Hermite: the shares of a normal distribution
	b := in("spread = \"average\"\nsize = \"2 MHz\"").Brief
	x, w := spread(&b.Errors[0])
	sum, second, fourth := 0.0, 0.0, 0.0
	for i := range x {
		sum, second, fourth = sum+w[i], second+w[i]*x[i]*x[i], fourth+w[i]*math.Pow(x[i], 4)
	}
	if s := 2 * math.Pi * 2e-3; !(math.Abs(sum-1) <= 1e-12) || !(math.Abs(second/(s*s)-1) <= 1e-12) || !(math.Abs(fourth/(3*math.Pow(s, 4))-1) <= 1e-12) {
		t.Errorf("moments %v, %v, %v", sum, second, fourth)
	}
}

// TestNoiseHeld: a gate that is held against slow noise of the detuning leaves far less of it than one that is not,
// by the record of either.
func TestNoiseHeld(t *testing.T) {
	const slow = "noise = { form = \"lorentzian\", sigma = \"200 kHz\", correlation_time = \"2 us\" }"
	noises := func(weight string) string {
		return "[[error]]\ndetuning = \"q1\"\n" + slow + "\n" + weight + "\n"
	}
	left := func(weight string) float64 {
		in := register(t, 1, "", "span = \"88 ns\"\nstarts = 1\n[target]\nsite = \"q1\"\ngate = \"X90\"\n"+noises(weight))
		p, folder, _ := folderOf(t, in)
		if p.Status != Found {
			t.Fatal(p.Summary())
		}
		agreed(t, folder)
		f := *p.Record.Model.Errors[0].NoiseInfidelity
		t.Logf("%s: infidelity %.2g, noise adds %.3g", p.Summary(), p.Record.Claim.Infidelity, f)
		return f
	}
	if held, plain := left(""), left("weight = 1e-6"); !(held <= plain/50) {
		t.Errorf("noise leaves %.3g where it is held off, %.3g where it is not", held, plain)
	}
}

// TestMappedBias: a gate by a drive and a bias that is no straight one, polynomial or loop, as replay sees it too.
func TestMappedBias(t *testing.T) {
	bias := `[[channel]]
name = "q1 flux"
kind = "baseband"
full_scale = "20 MHz"
slew_limit = "25 %/sample"
band = "100 MHz"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "0.1 %", fast = "8 ns" }
[channel.line]
delay = "2.4 ns"
lowpass = { family = "single-pole", corner = "250 MHz" }
tails = [ { amplitude = "-1 %", time = "40 ns" } ]
`
	for name, keys := range map[string]string{
		"polynomial": "polynomial = [0.4, 1.3, -0.5]", "loop": "loop = { highest = \"5.2 GHz\", bias = 0.2, full_scale = 0.02, asymmetry = 0.1 }",
	} {
		s := scene{name: name, ns: 72, more: bias, device: "[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n" + keys + "\n", head: "refine = false", errors: "[[error]]\ndetuning = \"q1\"\n[[error]]\namplitude = \"q1 drive\""}
		p, f, _ := folderOf(t, s.inputs(t))
		if p.Status != Found {
			t.Fatalf("%s: %s", name, p.Summary())
		}
		largest := 0.0
		for _, x := range p.Channels[1].Exact {
			largest = math.Max(largest, math.Abs(real(x)))
		}
		if !(largest > 0.02) {
			t.Errorf("%s: the bias plays at most %v: this tests nothing", name, largest)
		}
		agreed(t, f)
		g, _, _, err := f.Model.BeforeRounding().Figures(context.Background())
		if err != nil || !(g.Infidelity <= 1e-9) {
			t.Errorf("%s: infidelity %.2g before rounding by replay, %v", name, g.Infidelity, err)
		}
		t.Logf("%s: %s, the bias up to %.2f, infidelity %.2g", name, p.Summary(), largest, g.Infidelity)
	}
}

// TestTooLarge: what would take minutes to look at once is refused before the search.
func TestTooLarge(t *testing.T) {
	in := register(t, 6, "", "span = \"480 ns\"\n[target]\nfrom = \"000000\"\nto = \"GHZ\"\n[[error]]\nany = \"two-body\"\n")
	if _, err := newTask(in, brief.Slepian); err == nil || !strings.Contains(err.Error(), "take minutes") {
		t.Errorf("%v", err)
	}
}
