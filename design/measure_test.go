//go:build measure

package design

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"holdfast/design/brief"
	"holdfast/design/replay"
	"holdfast/design/solve"
	"holdfast/filter"
	"holdfast/hardware"
	"holdfast/shape"
)

// The figures that DEVELOPERS.md quotes are printed by
//
//	go test -tags measure -run Measure -v -timeout 2h ./design
//
// Times are those of the machine at hand; everything else repeats.

// wanted writes a brief on the demonstration rack and loads it.
func wanted(t *testing.T, gate string, ns int, held []string, extra string) Inputs {
	t.Helper()
	dir, err := filepath.Abs("../testdata/skerry")
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	fmt.Fprintf(&b, "format = 1\nname = \"m\"\nprofile = %q\ndevice = %q\nspan = \"%d ns\"\n", filepath.Join(dir, "rack-b.toml"), filepath.Join(dir, "skerry.toml"), ns)
	if len(held) == 0 {
		b.WriteString("hold = \"nothing\"\n")
	}
	fmt.Fprintf(&b, "%s\n[target]\nsite = \"q1\"\ngate = %q\n", extra, gate)
	for _, h := range held {
		fmt.Fprintf(&b, "[[error]]\n%s\n", h)
	}
	path := filepath.Join(t.TempDir(), "brief.toml")
	if err := os.WriteFile(path, []byte(b.String()), 0o666); err != nil {
		t.Fatal(err)
	}
	br, p, d, err := brief.LoadAll(path)
	if err != nil {
		t.Fatal(err)
	}
	return Inputs{Brief: br, Profile: p, Device: d, Version: "measure"}
}

// judged designs, writes and replays, and returns the verdict of the samples
// before rounding with what they were judged from.
func judged(t *testing.T, in Inputs) (*Pulse, *replay.Folder, *replay.Verdict, time.Duration) {
	t.Helper()
	p, f, took := folderOf(t, in)
	v, err := f.Model.BeforeRounding().Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	return p, f, v, took
}

const (
	detuning  = `detuning = "q1"`
	amplitude = `amplitude = "q1 drive"`
	anyError  = `any = "all"`
)

var heldTable = []struct {
	name      string
	held      []string
	x90, x180 int
}{
	{"nothing", nil, 40, 40},
	{"detuning", []string{detuning}, 64, 64},
	{"amplitude", []string{amplitude}, 56, 64},
	{"detuning + amplitude", []string{detuning, amplitude}, 72, 72},
	{"any static error", []string{anyError}, 96, 96},
	{"any + amplitude", []string{anyError, amplitude}, 104, 112},
}

// TestMeasureTable designs both gates against every class at the shortest span
// known and one block below it.
func TestMeasureTable(t *testing.T) {
	for _, gate := range []string{"X90", "X180"} {
		for _, c := range heldTable {
			ns := c.x90
			if gate == "X180" {
				ns = c.x180
			}
			p, _, v, took := judged(t, wanted(t, gate, ns, c.held, ""))
			worst := 0.0
			for _, e := range v.Errors {
				if e.Held {
					worst = math.Max(worst, e.Susceptibility)
				}
			}
			fmt.Printf("%-4s %-21s %3d ns: %s; infidelity %.1e, worst held susceptibility %.1e; %v\n", gate, c.name, ns, p.Summary(), v.Settled.Infidelity, worst, took.Round(time.Millisecond))
			if p.Status != Found || !(v.Settled.Infidelity <= 1e-7) || !(worst <= 1e-3) {
				t.Errorf("%s %s at %d ns misses", gate, c.name, ns)
			}
			p, _, _, took = judged(t, wanted(t, gate, ns-8, c.held, ""))
			fmt.Printf("%-4s %-21s %3d ns: %s; %v\n", gate, c.name, ns-8, p.Summary(), took.Round(time.Millisecond))
		}
	}
}

// TestMeasureShares counts the successes of 100 starts at each shortest span.
func TestMeasureShares(t *testing.T) {
	for _, gate := range []string{"X90", "X180"} {
		for _, c := range heldTable {
			ns := c.x90
			if gate == "X180" {
				ns = c.x180
			}
			q, err := newTask(wanted(t, gate, ns, c.held, ""), "slepian")
			if err != nil {
				t.Fatal(err)
			}
			const starts = 100
			begun := time.Now()
			zeros, spent := 0, make([]int, starts)
			list := solve.Search(context.Background(), starts, starts, runtime.GOMAXPROCS(0), q.solve, nil)
			for i, r := range list {
				if spent[i] = r.Evaluations; r.Status == solve.Converged {
					zeros++
				}
			}
			slices.Sort(spent)
			fmt.Printf("%-4s %-21s %3d ns: %3d of %d starts at a zero, median %d evaluations; %v\n", gate, c.name, ns, zeros, starts, spent[starts/2], time.Since(begun).Round(time.Millisecond))
		}
	}
}

// TestMeasureBlocks follows the margin against any static error from block to
// block.
func TestMeasureBlocks(t *testing.T) {
	last := 0.0
	for ns := 96; ns <= 144; ns += 8 {
		p, f, _, took := judged(t, wanted(t, "X90", ns, []string{anyError}, ""))
		m := f.Model.BeforeRounding()
		average, _ := lossOver(t, m, directions(), 1e-3)
		random, worst := lossOver(t, m, randomDirections(2000), 1e-3)
		fmt.Printf("X90 any %3d ns: 14 directions at 1 MHz: average %.2e; 2000 random: average %.2e, worst %.2e; %s; %v\n", ns, average, random, worst, p.Summary(), took.Round(time.Millisecond))
		if last > 0 && !(average <= 1.1*last) {
			t.Errorf("%d ns: %.2e after %.2e", ns, average, last)
		}
		last = average
	}
	_, f, _, _ := judged(t, wanted(t, "X90", 64, []string{detuning}, ""))
	m := f.Model.BeforeRounding()
	for _, mhz := range []float64{1, 3} {
		a, w := lossOver(t, m, [][3]float64{{0, 0, 1}, {0, 0, -1}}, mhz*1e-3)
		fmt.Printf("X90 detuning 64 ns at +-%v MHz: average %.2e, worst %.2e\n", mhz, a, w)
	}
}

// lossOver returns the average and the worst settled infidelity over static errors
// of field 2π f n·σ/2, f in GHz.
func lossOver(t *testing.T, m *replay.Model, list [][3]float64, f float64) (average, worst float64) {
	t.Helper()
	fields := make([][]complex128, len(list))
	for i, n := range list {
		s := complex(math.Pi*f, 0)
		x, y, z := complex(n[0], 0), complex(n[1], 0), complex(n[2], 0)
		fields[i] = []complex128{s * z, s * (x - 1i*y), s * (x + 1i*y), -s * z}
	}
	got, err := m.Against(context.Background(), fields)
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range got {
		average += v / float64(len(got))
		worst = math.Max(worst, v)
	}
	return average, worst
}

func directions() [][3]float64 {
	r := 1 / math.Sqrt(3)
	list := [][3]float64{{1, 0, 0}, {-1, 0, 0}, {0, 1, 0}, {0, -1, 0}, {0, 0, 1}, {0, 0, -1}}
	for i := range 8 {
		v := [3]float64{r, r, r}
		for k := range v {
			if i>>k&1 == 1 {
				v[k] = -r
			}
		}
		list = append(list, v)
	}
	return list
}

func randomDirections(n int) [][3]float64 {
	rng := rand.New(rand.NewPCG(7, 7))
	var list [][3]float64
	for range n {
		v := [3]float64{rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()}
		l := math.Sqrt(v[0]*v[0] + v[1]*v[1] + v[2]*v[2])
		list = append(list, [3]float64{v[0] / l, v[1] / l, v[2] / l})
	}
	return list
}

// TestMeasureShapes finds the shortest span of each family of shapes for every
// class, from the shortest known on, and what lies outside the band.
func TestMeasureShapes(t *testing.T) {
	for _, gate := range []string{"X90", "X180"} {
		for _, c := range heldTable {
			ns := c.x90
			if gate == "X180" {
				ns = c.x180
			}
			line := fmt.Sprintf("%-4s %-21s", gate, c.name)
			for _, family := range []string{"slepian", "fourier", "b-spline"} {
				found := false
				for span := ns - 8; span <= ns+24; span += 8 {
					in := wanted(t, gate, span, c.held, "refine = false")
					in.Brief.Basis.Family, in.Brief.Basis.Degree = family, 3
					p, err := Run(context.Background(), in, nil)
					if err != nil {
						t.Fatal(err)
					}
					if p.Status != Found {
						continue
					}
					x := p.Channels[0].Exact
					re, im := make([]float64, len(x)), make([]float64, len(x))
					for k, v := range x {
						re[k], im[k] = real(v), imag(v)
					}
					a, _, err := shape.OutOfBand(re, 0.1)
					if err != nil {
						t.Fatal(err)
					}
					b, _, err := shape.OutOfBand(im, 0.1)
					if err != nil {
						t.Fatal(err)
					}
					total := 0.0
					for _, v := range x {
						total += real(v)*real(v) + imag(v)*imag(v)
					}
					line += fmt.Sprintf("  %s %3d ns (%.1e outside)", family, span, (a+b)/total)
					found = true
					break
				}
				if !found {
					line += fmt.Sprintf("  %s not found to %d ns", family, ns+24)
				}
			}
			fmt.Println(line)
		}
	}
}

// TestMeasureLines designs a pulse with and without holding the line's corner and
// tail, and replays both over 200 lines drawn from what is known of them.
func TestMeasureLines(t *testing.T) {
	const lines = 200
	for _, c := range []struct {
		name, held string
		ns         int
	}{{"detuning", detuning, 72}, {"any static error", anyError, 120}, {"any static error", anyError, 144}} {
		ns := c.ns
		var mean [2]float64
		for i, hold := range []bool{false, true} {
			held := []string{c.held}
			if hold {
				held = append(held, "line = \"q1 drive\"\nparameter = \"lowpass[0].corner\"\nsize = \"5 %\"", "line = \"q1 drive\"\nparameter = \"tails[0].amplitude\"\nsize = \"20 %\"")
			}
			p, f, v, _ := judged(t, wanted(t, "X90", ns, held, ""))
			fmt.Printf("X90 %s %3d ns, line held %v: %s; infidelity %.1e\n", c.name, ns, hold, p.Summary(), v.Settled.Infidelity)
			m := f.Model.BeforeRounding()
			rng := rand.New(rand.NewPCG(200, 1))
			worst := 0.0
			for range lines {
				// normal with the stated figure as the standard deviation
				corner, tail := 0.2*(1+0.05*rng.NormFloat64()), -0.015*(1+0.2*rng.NormFloat64())
				low, err := filter.Bessel(2, corner)
				if err != nil {
					t.Fatal(err)
				}
				tails, err := filter.Tails([]filter.Tail{{Amplitude: tail, Time: 30}})
				if err != nil {
					t.Fatal(err)
				}
				l, err := filter.Cascade(low, tails)
				if err != nil {
					t.Fatal(err)
				}
				var poles, residues []complex128
				var powers []int
				for _, x := range l.Terms {
					poles, powers, residues = append(poles, x.Pole), append(powers, x.Power), append(residues, x.Residue)
				}
				s, _, _, err := m.WithLine(0, 3.2, l.Direct, poles, powers, residues).Figures(context.Background())
				if err != nil {
					t.Fatal(err)
				}
				mean[i] += s.Infidelity / lines
				worst = math.Max(worst, s.Infidelity)
			}
			fmt.Printf("  over %d lines: average infidelity %.2e, worst %.2e\n", lines, mean[i], worst)
		}
		fmt.Printf("  %.1f times lower\n", mean[0]/mean[1])
	}
}

// TestMeasureLadder designs the X90 on three levels of -220 MHz: unheld, held
// against detuning, and unheld with a looser ring-out limit.
func TestMeasureLadder(t *testing.T) {
	for _, c := range []struct {
		ns           int
		held         []string
		ringOut      float64
		coefficients int
	}{{40, nil, 0.001, 0}, {64, []string{detuning}, 0.001, 0}, {24, nil, 0.006, 0}, {24, nil, 0.006, 4}, {24, nil, 0.006, 5}, {32, nil, 0.001, 0}, {32, nil, 0.001, 6}, {32, nil, 0.006, 0}, {56, []string{detuning}, 0.001, 0}} {
		in := wanted(t, "X90", c.ns, c.held, "")
		in.Device.Sites[0].Levels, in.Device.Sites[0].Anharmonicity, in.Device.Sites[0].Zero = 3, -2*math.Pi*0.22, "lower"
		in.Profile.Channels[0].Mixing = hardware.PlusSin
		in.Profile.Channels[0].RingOut.Limit = c.ringOut
		in.Brief.Basis.Coefficients = c.coefficients
		p, f, took := folderOf(t, in)
		s, _, _, err := f.Model.BeforeRounding().Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		fmt.Printf("three levels, %2d ns, held %v, ring-out %v: %s; infidelity %.1e, leakage %.1e; %v\n", c.ns, c.held, c.ringOut, p.Summary(), s.Infidelity, s.Leakage, took.Round(time.Millisecond))
	}
}
