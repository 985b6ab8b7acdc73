package replay

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"holdfast/hardware"
)

var (
	halfX = []complex128{0, 0.5, 0.5, 0}
	halfY = []complex128{0, -0.5i, 0.5i, 0}
	halfZ = []complex128{0.5, 0, 0, -0.5}
)

// rotation is exp(-i angle/2 (cos phase X + sin phase Y)).
func rotation(angle, phase float64) []complex128 {
	c, s := complex(math.Cos(angle/2), 0), complex(0, -math.Sin(angle/2))
	return []complex128{c, s * cmplx.Rect(1, -phase), s * cmplx.Rect(1, phase), c}
}

// spinModel is one driven spin with a line that lets everything through, full scale 40 MHz, 14 bit.
func spinModel(h float64, target []complex128, x []complex128) *Model {
	inf := math.Inf(1)
	m := &Model{
		SamplePeriod: h, Samples: len(x), Bits: 14, Ends: "settled", Dim: 2, CodeSpace: []int{0, 1},
		Static: make([]complex128, 4), Target: target,
		Channels: []Channel{{
			Name: "q1 drive", Kind: "quadrature", FullScale: 2 * math.Pi * 0.04, Direct: 1,
			Operators: [][]complex128{halfX, halfY}, MaxShare: inf, MaxSlew: inf, RingOut: inf, Samples: x,
		}},
	}
	return m
}

// rackB gives a model of issue 1's rack B: delay 3.2 ns, Bessel low-pass of order 2 with corner 200 MHz, tail -1.5 % at 30 ns.
//
// The Bessel polynomial of order 2 is s^2 + 3 s + 3 (Thomson 1949, Proc. IEE 96, 487), and |G|^2 = 1/2 where
// w^4 + 3 w^2 - 9 = 0, w = 1.361654; the poles below are scaled by hand so that this falls on the corner.
func rackB(x []complex128) *Model {
	m := spinModel(1, rotation(math.Pi/2, 0), x)
	c := &m.Channels[0]
	scale := 2 * math.Pi * 0.2 / math.Sqrt((math.Sqrt(45)-3)/2)
	p := complex(-1.5*scale, math.Sqrt(3)/2*scale)
	const a, t = -0.015, 30.0
	q := complex(-1/t, 0)
	low := func(s complex128) complex128 { return p * cmplx.Conj(p) / ((s - p) * (s - cmplx.Conj(p))) }
	tail := func(s complex128) complex128 { return 1 + complex(a, 0) - complex(a/t, 0)/(s-q) }
	r := p * cmplx.Conj(p) / (p - cmplx.Conj(p)) * tail(p)
	c.Direct = 0
	c.Poles = []complex128{p, cmplx.Conj(p), q}
	c.Powers = []int{1, 1, 1}
	c.Residues = []complex128{r, cmplx.Conj(r), low(q) * complex(-a/t, 0)}
	c.Delay, m.WindowStart = 3.2, 3.2
	c.MaxShare, c.MaxSlew, c.GuardTrail, c.RingOut = 0.95, 0.25, 4, 0.001
	return m
}

// cosine is a raised-cosine X90 for full scale 40 MHz at 1 GS/s: k samples, the last four of n zero.
func cosine(k, n int) []complex128 {
	x := make([]complex128, n)
	for i := range k {
		x[i] = complex((1-math.Cos(2*math.Pi*(float64(i)+0.5)/float64(k)))*math.Pi/2/float64(k)/(2*math.Pi*0.04), 0)
	}
	return x
}

// rounded gives codes and the samples that they stand for.
func rounded(x []complex128, bits int) (codes []int16, y []complex128) {
	full := math.Ldexp(1, bits-1)
	for _, v := range x {
		i, q := math.Round(real(v)*full), math.Round(imag(v)*full)
		codes = append(codes, int16(i), int16(q))
		y = append(y, complex(i/full, q/full))
	}
	return codes, y
}

func newTestEngine(t testing.TB, m *Model) *engine {
	t.Helper()
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	e, err := newEngine(context.Background(), m)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// evolve gives the window's evolution with an error.
func evolve(t testing.TB, e *engine, p *probe, lambda float64) []complex128 {
	t.Helper()
	var got []complex128
	err := e.run(context.Background(), []gate{{p, lambda}}, func(_ *labour, _ int, u []complex128) {
		got = append([]complex128(nil), u...)
	})
	if err != nil {
		t.Fatal(err)
	}
	return got
}

func distance(a, b []complex128) float64 {
	s := 0.0
	for i := range a {
		s += square(a[i] - b[i])
	}
	return math.Sqrt(s)
}

// writeFolder writes a pulse folder to the letter of the record, with a claim as given, and gives its path.
func writeFolder(t testing.TB, m *Model, v *Verdict) string {
	t.Helper()
	return writeFolderOf(t, m, v, testProfile, testDevice, testBrief)
}

func writeFolderOf(t testing.TB, m *Model, v *Verdict, profile, device, brief string) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "pulse")
	if err := os.MkdirAll(filepath.Join(dir, "inputs"), 0o777); err != nil {
		t.Fatal(err)
	}
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	write("inputs/profile.toml", profile)
	write("inputs/device.toml", device)
	write("inputs/brief.toml", brief)
	var names []string
	for i, c := range m.Channels {
		codes, _ := rounded(c.Samples, m.Bits)
		name := fmt.Sprintf("channel-%d.npy", i)
		columns := len(c.Operators)
		var exact []float64
		for k, x := range c.Samples {
			exact = append(exact, []float64{real(x), imag(x)}[:columns]...)
			if columns == 1 {
				codes[k] = codes[2*k]
			}
		}
		if err := hardware.WriteNPY(filepath.Join(dir, name), m.Samples, columns, codes[:m.Samples*columns]); err != nil {
			t.Fatal(err)
		}
		if err := hardware.WriteNPY(filepath.Join(dir, "exact-"+name), m.Samples, columns, exact); err != nil {
			t.Fatal(err)
		}
		names = append(names, name, "exact-"+name)
	}
	names = append(names, "inputs/profile.toml", "inputs/device.toml", "inputs/brief.toml")
	text := recordText(m, v)
	for _, name := range names {
		data, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		sum := sha256.Sum256(data)
		text += fmt.Sprintf("[[file]]\nname = %q\nsha256 = %q\n", name, hex.EncodeToString(sum[:]))
	}
	write("pulse.toml", text)
	return dir
}

func number(v float64) string {
	s := strconv.FormatFloat(v, 'g', -1, 64)
	if !strings.ContainsAny(s, ".e") {
		s += ".0"
	}
	return s
}

func pairText(z complex128) string { return "[" + number(real(z)) + ", " + number(imag(z)) + "]" }

func listText[T any](list []T, text func(T) string) string {
	var parts []string
	for _, v := range list {
		parts = append(parts, text(v))
	}
	return "[" + strings.Join(parts, ", ") + "]"
}

func matrixText(m []complex128) string {
	n := int(math.Round(math.Sqrt(float64(len(m)))))
	var rows []string
	for i := range n {
		rows = append(rows, listText(m[i*n:(i+1)*n], pairText))
	}
	return "[" + strings.Join(rows, ", ") + "]"
}

// recordText writes pulse.toml without its list of files.
func recordText(m *Model, v *Verdict) string {
	var b strings.Builder
	p := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	p("format = 1\n[pulse]\nname = %q\ntarget = \"X90 on q1\"\nspan = \"%d ns\"\nheld = []\nrequirements_met = true", "test pulse", m.Samples)
	p("[basis]\nfamily = \"samples\"\n[search]\nseed = 1\n[provenance]\nprogram = \"holdfast\"")
	p("[require]\ninfidelity = 1e-4\nsusceptibility = 1e-3\n[[require.margin]]\nerror = \"detuning\"\nsize_rad_per_ns = %s", number(2*math.Pi*0.0001))
	for _, c := range m.Errors { // margins of the wide brief
		switch c.Name {
		case "corner":
			p("[[require.margin]]\nerror = \"corner\"\nsize_share = 0.01")
		case "quadrature angle":
			p("[[require.margin]]\nerror = \"quadrature angle\"\nsize_rad = %s", number(math.Pi/180))
		case "offset Q":
			p("[[require.margin]]\nerror = \"offset Q\"\nsize_rad_per_ns = %s", number(2*math.Pi*0.04*0.002))
		}
	}
	p("[[decoherence]]\nsite = \"q1\"\nt1_ns = 60000.0\nt2_ns = 40000.0")
	if len(m.Sites) > 0 {
		p("[[decoherence]]\nsite = \"q2\"\nt1_ns = 90000.0")
	}
	p("[claim]\ninfidelity = %s\ninfidelity_other_ends = %s\nleakage = %s\ntail_angle_rad = %s",
		number(v.Settled.Infidelity), number(v.Window.Infidelity), number(v.Settled.Leakage), number(v.TailAngle))
	p("[model]\nsample_period_ns = %s\nsamples = %d\nbits = %d\nends = %q\nwindow_start_ns = %s\ndim = %d",
		number(m.SamplePeriod), m.Samples, m.Bits, m.Ends, number(m.WindowStart), m.Dim)
	p("code_space = %s\nstatic_rad_per_ns = %s\nfree_z_before = %s\nfree_z_after = %s",
		listText(m.CodeSpace, strconv.Itoa), matrixText(m.Static), listText(m.FreeZBefore, number), listText(m.FreeZAfter, number))
	if m.Target != nil {
		p("target = %s", matrixText(m.Target))
	}
	vector := func(v []complex128) string { return listText(v, pairText) }
	if m.From != nil {
		p("from = %s\nto = %s", listText(m.From, vector), listText(m.To, vector))
	}
	if m.Sites != nil {
		p("sites = %s", listText(m.Sites, strconv.Itoa))
	}
	if m.LocalBefore != nil {
		p("local_before = %s\nlocal_after = %s", listText(m.LocalBefore, matrixText), listText(m.LocalAfter, matrixText))
	}
	for _, r := range m.Rotating {
		p("[[model.rotating]]\nfrequency_rad_per_ns = %s\ncosine = %s\nsine = %s", number(r.Frequency), matrixText(r.Cosine), matrixText(r.Sine))
	}
	for _, r := range m.Dropped {
		p("[[model.dropped]]\nfrequency_rad_per_ns = %s\ncosine = %s\nsine = %s", number(r.Frequency), matrixText(r.Cosine), matrixText(r.Sine))
	}
	for i, c := range m.Channels {
		p("[[model.channel]]\nname = %q\nkind = %q\ncodes = \"channel-%d.npy\"\nsamples_before_rounding = \"exact-channel-%d.npy\"", c.Name, c.Kind, i, i)
		p("full_scale_rad_per_ns = %s\ndelay_ns = %s\ndirect = %s", number(c.FullScale), number(c.Delay), pairText(c.Direct))
		p("poles_per_ns = %s\npowers = %s\nresidues = %s", listText(c.Poles, pairText), listText(c.Powers, strconv.Itoa), listText(c.Residues, pairText))
		p("operators = %s", listText(c.Operators, matrixText))
		if !math.IsInf(c.MaxShare, 1) {
			p("max_share = %s", number(c.MaxShare))
		}
		if !math.IsInf(c.MaxSlew, 1) {
			p("max_slew_per_sample = %s", number(c.MaxSlew))
		}
		if !math.IsInf(c.RingOut, 1) {
			p("ring_out_share = %s", number(c.RingOut))
		}
		p("guard_lead = %d\nguard_trail = %d", c.GuardLead, c.GuardTrail)
		for _, o := range []struct {
			key string
			v   float64
		}{
			{"rms_share", c.RMS}, {"rms_samples", c.RMSSamples}, {"ring_out_tail_share", c.RingOutTail}, {"ring_out_fast_ns", c.RingOutFast},
			{"out_of_band_share", c.OutOfBand}, {"band_ghz", c.Band}, {"shift_rad_per_ns", c.Shift},
		} {
			if o.v != 0 {
				p("%s = %s", o.key, number(o.v))
			}
		}
		if c.Box {
			p("envelope = \"box\"")
		}
		if c.ZeroMean {
			p("zero_mean = true")
		}
		if c.Compression != nil {
			p("compression = %s", listText(c.Compression, func(k Knee) string { return pairText(complex(k.Share, k.Reached)) }))
		}
		if c.ShiftOperator != nil {
			p("shift_operator = %s", matrixText(c.ShiftOperator))
		}
		for _, r := range c.Paths {
			p("[[model.channel.path]]\nfrequency_rad_per_ns = %s\noperators = %s", number(r.Frequency), listText(r.Operators, matrixText))
		}
	}
	for _, c := range m.Errors {
		p("[[model.error]]\nname = %q\nheld = %v\nkind = %q", c.Name, c.Held, c.Kind)
		if c.Operator != nil {
			p("operator = %s", matrixText(c.Operator))
		}
		if c.Kind == "line" {
			p("channel = %q\ndirect = %s\npoles_per_ns = %s\npowers = %s\nresidues = %s", c.Channels[0], pairText(c.Direct),
				listText(c.Poles, pairText), listText(c.Powers, strconv.Itoa), listText(c.Residues, pairText))
		} else if c.Kind == "crosstalk" {
			p("channel = %q", c.Channels[0])
		} else if c.Channels != nil {
			p("channels = %s", listText(c.Channels, strconv.Quote))
		}
		if c.Quadrature != "" {
			p("quadrature = %q", c.Quadrature)
		}
		if c.Operators != nil {
			p("operators = %s", listText(c.Operators, matrixText))
		}
		if c.Names != nil {
			p("names = %s\nweights = %s", listText(c.Names, strconv.Quote), listText(c.Weights, number))
		}
		if c.Leak {
			p("leak = true")
		}
		for _, e := range v.Errors {
			if e.Name == c.Name {
				p("susceptibility = %s", number(e.Susceptibility))
				if e.LeakSusceptibility != nil {
					p("leak_susceptibility = %s", number(*e.LeakSusceptibility))
				}
			}
		}
	}
	return b.String()
}

const testProfile = `format = 1
[instrument]
name = "rack B, position 3 (invented)"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 8
longest = 65536

[[channel]]
name = "q1 drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
amplitude_limit = "95 %"
slew_limit = "25 %/sample"
band = "100 MHz"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "0.1 %", fast = "8 ns" }
[channel.line]
delay = "3.2 ns"
lowpass = { family = "bessel", order = 2, corner = "200 MHz" }
tails = [ { amplitude = "-1.5 %", time = "30 ns" } ]
`

const testDevice = `format = 1
name = "Skerry (invented)"
[[site]]
name = "q1"
zero = "upper"
T1 = "60 us"
T2 = "40 us"
[[drive]]
site = "q1"
channel = "q1 drive"
`

const testBrief = `format = 1
name = "test pulse"
profile = "elsewhere.toml"
device = "elsewhere.toml"
hold = "nothing"
span = "32 ns"
[target]
site = "q1"
gate = "X90"
[require]
infidelity = 1e-4
susceptibility = 1e-3
[[require.margin]]
error = "detuning"
size = "0.1 MHz"
`

// testModel is what the three files make of a raised cosine on rounded codes, as the record tells it.
func testModel() *Model {
	_, x := rounded(cosine(24, 32), 14)
	m := rackB(x)
	m.Errors = m.classes()
	for i := range m.Errors {
		if m.Errors[i].Kind == "amplitude" {
			m.Errors[i].Channels = []string{"q1 drive"}
		}
	}
	return m
}
