package main

import (
	"bytes"
	"context"
	"flag"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"holdfast/design/device"
	"holdfast/filter"
	"holdfast/hardware"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// starterBench is the drive of the demonstration.
func starterBench(t *testing.T) *bench {
	t.Helper()
	p, err := hardware.Load("starter/rack-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	d, err := device.Load("starter/skerry.toml")
	if err != nil {
		t.Fatal(err)
	}
	b, err := newBench(p, d, "")
	if err != nil {
		t.Fatal(err)
	}
	if b.detuning, err = b.usual(); err != nil {
		t.Fatal(err)
	}
	return b
}

// foretold makes a bench's sequences and table.
func foretold(t *testing.T, b *bench) ([]sequence, *predictions) {
	t.Helper()
	list, err := b.sequences()
	if err != nil {
		t.Fatal(err)
	}
	k, err := b.predict(context.Background(), list)
	if err != nil {
		t.Fatal(err)
	}
	return list, k
}

// The groups that the theory at the top of signs.go allows: told apart by the cables, and by the product of mixing, cables
// and side of the carrier.
func theory(s, stated signs) [2]bool {
	return [2]bool{s.swapped, s.swapped != s.above != (s.mixing != stated.mixing)}
}

// The card tells apart all that can be told apart, by far more than 0.1 in a population, on lines of every kind: the
// demonstration's, one that lets everything through, one that turns I into Q, and a drive that compresses and shifts the device.
func TestCardTellsSignsApart(t *testing.T) {
	asymmetric, err := filter.Cascade(filter.Line{Direct: 1, Terms: []filter.Term{{Pole: complex(-0.05, 0.1), Power: 1, Residue: complex(-0.01, 0.004)}}})
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name   string
		change func(b *bench)
		within float64
	}{
		{"demonstration", func(*bench) {}, 1e-9},
		{"straight through", func(b *bench) { b.profile.Channels[0].Line = filter.Through() }, 1e-9},
		{"other mixer, lower energy", func(b *bench) {
			b.profile.Channels[0].Mixing = hardware.PlusSin
			b.device.Sites[0].Zero = device.Lower
		}, 1e-9},
		{"asymmetric line", func(b *bench) { b.profile.Channels[0].Line = asymmetric; b.profile.Channels[0].RingOut.Limit = 0.01 }, 0.04},
		{"compression and shift", func(b *bench) {
			b.profile.Channels[0].Compression = hardware.Compression{{}, {Converter: 0.5, Reached: 0.49}, {Converter: 1, Reached: 0.9}}
			b.profile.Channels[0].Shift = 2 * math.Pi * 0.0005
		}, 0.04},
		{"rms and box", func(b *bench) {
			b.profile.Channels[0].RMSLimit, b.profile.Channels[0].Envelope, b.profile.Channels[0].SlewLimit = 0.2, hardware.Box, math.Inf(1)
		}, 1e-9},
		{"a quarter of the detuning", func(b *bench) { b.detuning /= 4 }, 1e-9},
	} {
		b := starterBench(t)
		c.change(b)
		list, k := foretold(t, b)
		if len(k.table) != 16 || k.table[0].signs != b.stated() {
			t.Fatalf("%s: %d rows, the first %+v", c.name, len(k.table), k.table[0].signs)
		}
		if !(k.distance >= 0.1) || !(k.within <= c.within) {
			t.Errorf("%s: groups are %v apart, rows of one %v", c.name, k.distance, k.within)
		}
		groups := map[string][2]bool{}
		members := map[string]int{}
		for _, r := range k.table {
			want := theory(r.signs, b.stated())
			if before, seen := groups[r.group]; seen && before != want {
				t.Errorf("%s: group %s holds what can be told apart: %+v", c.name, r.group, r)
			}
			groups[r.group] = want
			members[r.group]++
		}
		if len(groups) != 4 || members["A"] != 4 || members["B"] != 4 || members["C"] != 4 || members["D"] != 4 {
			t.Errorf("%s: groups of %v", c.name, members)
		}
		// every single wrong sign shows, but for the one that no population shows
		for _, r := range k.table {
			wrong := 0
			for _, w := range []bool{r.mixing != b.stated().mixing, r.swapped, r.above} {
				if w {
					wrong++
				}
			}
			if d := apart(r.populations, k.table[0].populations); wrong == 1 && !(d >= 0.1) {
				t.Errorf("%s: %+v is only %v away from what is right", c.name, r.signs, d)
			}
		}
		// which energy |0> has shows nowhere, whatever the line and the drive do
		for i := range k.table {
			for j := range i {
				a, b := k.table[i], k.table[j]
				same := a.mixing == b.mixing && a.swapped == b.swapped && a.above == b.above
				if d := apart(a.populations, b.populations); same && !(d <= 1e-9) {
					t.Errorf("%s: the energy of |0> changes a population by %v", c.name, d)
				}
			}
		}
		if d := apart(k.unmoved, k.table[0].populations); !(d >= 0.1) {
			t.Errorf("%s: a carrier that was not moved is only %v away", c.name, d)
		}
		for _, q := range list {
			readings, err := b.profile.CheckCodes(b.channel, q.codes)
			if err != nil {
				t.Fatal(err)
			}
			for _, r := range readings {
				if !r.OK {
					t.Errorf("%s: %s breaks %s: %v of %v", c.name, q.name, r.Limit, r.Found, r.Allowed)
				}
			}
		}
	}
}

// The populations against a simulation in the laboratory's frame, which knows neither rotating frames nor operators: the mixer's
// definition, a field along X, a transition at 4 GHz, Runge and Kutta's fourth order. What the rotating frame leaves out is of the
// order of the Rabi frequency over four times the transition, 0.0025 of an amplitude.
func TestCardInTheLaboratoryFrame(t *testing.T) {
	const transition = 4.0 // GHz
	b := starterBench(t)
	b.profile.Channels[0].Line = filter.Through()
	list, k := foretold(t, b)
	full, h := b.profile.Channels[0].FullScale, b.profile.SamplePeriod
	lab := func(s signs, codes []int16, terminated bool) float64 {
		carrier := transition - b.detuning
		if s.above {
			carrier = transition + b.detuning
		}
		w, energy := 2*math.Pi*carrier, 2*math.Pi*transition/2
		if s.zero == device.Lower { // |0> has the lower energy
			energy = -energy
		}
		a, c := complex(1, 0), complex(0, 0) // amplitudes of |0> and |1>
		const steps = 24 * transition
		dt := h / steps
		for n := range len(codes) / 2 {
			i, q := float64(codes[2*n])/8192, float64(codes[2*n+1])/8192
			if s.swapped {
				i, q = q, i
			}
			if terminated {
				q = 0
			}
			if i == 0 && q == 0 { // nothing but phases
				a *= cmplx.Rect(1, -energy*h)
				c *= cmplx.Rect(1, energy*h)
				continue
			}
			if s.mixing == hardware.MinusSin {
				q = -q
			}
			slope := func(time float64, a, c complex128) (complex128, complex128) {
				field := full * (i*math.Cos(w*time) + q*math.Sin(w*time)) // H = energy Z + field X
				return -1i * (complex(energy, 0)*a + complex(field, 0)*c), -1i * (complex(field, 0)*a - complex(energy, 0)*c)
			}
			for j := range int(steps) {
				at, d := float64(n)*h+float64(j)*dt, complex(dt, 0)
				a1, c1 := slope(at, a, c)
				a2, c2 := slope(at+dt/2, a+d/2*a1, c+d/2*c1)
				a3, c3 := slope(at+dt/2, a+d/2*a2, c+d/2*c2)
				a4, c4 := slope(at+dt, a+d*a3, c+d*c3)
				a += d / 6 * (a1 + 2*a2 + 2*a3 + a4)
				c += d / 6 * (c1 + 2*c2 + 2*c3 + c4)
			}
		}
		return real(c)*real(c) + imag(c)*imag(c)
	}
	for _, r := range k.table {
		for i, found := range r.populations {
			if want := lab(r.signs, list[i%3].codes, i == 3); !(math.Abs(found-want) <= 0.01) {
				t.Errorf("%+v: population %d is %v; in the laboratory's frame %v", r.signs, i, found, want)
			}
		}
	}
}

// The verb: what it writes, reads back, says; nothing on a mistake.
func TestCard(t *testing.T) {
	dir := newLab(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	status, stdout, stderr := play("card", at("rack-b.toml"), at("skerry.toml"), "-out", at("card"))
	if status != exitMet || stderr != "" {
		t.Fatalf("card: %d, %s", status, stderr)
	}
	files := tree(t, at("card"))
	if text, _, _ := strings.Cut(stdout, "\ncard: "); text != files["card.txt"] {
		t.Errorf("card.txt is not what was printed:\n%s", files["card.txt"])
	}
	golden := filepath.Join("testdata", "card.txt")
	if *update {
		write(t, golden, files["card.txt"])
	}
	if want := read(t, golden); files["card.txt"] != want {
		t.Errorf("the card has changed (go test -run Card -update rewrites it):\n%s", files["card.txt"])
	}
	for line := range strings.Lines(stdout) {
		if n := len([]rune(line)); n > 121 && !strings.Contains(line, dir) {
			t.Errorf("a line of %d characters: %s", n, line)
		}
	}
	if files["inputs/profile.toml"] != read(t, at("rack-b.toml")) || files["inputs/device.toml"] != read(t, at("skerry.toml")) {
		t.Errorf("inputs/ are no copies")
	}
	for _, name := range []string{"1-turn", "2-plus", "3-minus"} {
		codes, _, err := hardware.ReadNPY[int16](filepath.Join(at("card"), name+".npy"), -1, 2)
		if err != nil || slices.Max(codes) == 0 {
			t.Errorf("%s: %v", name, err)
		}
		if raw := files[name+".int16"]; len(raw) != 2*len(codes) {
			t.Errorf("%s.int16 has %d bytes for %d codes", name, len(raw), len(codes))
		}
		if !strings.HasPrefix(files[name+".csv"], "time_ns,code_i,code_q,share_i,share_q\r\n") || files[name+"-arrives.npy"] == "" {
			t.Errorf("%s: %.60q", name, files[name+".csv"])
		}
	}
	before := tree(t, dir)
	for _, c := range []struct {
		says string
		args []string
	}{
		{"-force", nil},
		{"-detuning: ", []string{"-detuning", "2 ns", "-force"}},
		{"above 0", []string{"-detuning", "-2 MHz", "-force"}},
		{"a quarter period still holds a pulse", []string{"-detuning", "100 MHz", "-force"}},
		{"longer than the longest waveform", []string{"-detuning", "100 Hz", "-force"}},
	} {
		status, stdout, stderr := play(append([]string{"card", at("rack-b.toml"), at("skerry.toml"), "-out", at("card")}, c.args...)...)
		if status != exitBadInput || stdout != "" {
			t.Errorf("%v: %d, %q", c.args, status, stdout)
		}
		mustBeOneLine(t, stderr, c.says)
	}
	if d := compare(before, tree(t, dir)); d != nil {
		t.Errorf("refused cards changed %v", d)
	}
	for i, c := range []struct{ file, old, new, detuning, says string }{
		{"skerry.toml", `channel = "q1 drive"`, `channel = "q2 drive"`, "2 MHz", `found "q2 drive"`},
		{"rack-b.toml", `longest = 65536`, `longest = 64`, "8 MHz", "sequence 1-turn: channel \"q1 drive\": ring-out"},
		{"rack-b.toml", `longest = 65536`, `longest = 64`, "2 MHz", "longer than the longest waveform"},
		{"rack-b.toml", `resolution = "14 bit"`, `resolution = "2 bit"`, "2 MHz", "no raised cosine"},
		{"rack-b.toml", `longest = 65536`, `longest = 16`, "2 MHz", "no raised cosine"},
		{"rack-b.toml", `kind = "quadrature"`, "kind = \"quadrature\"\nzero_mean = true", "2 MHz", "mean"},
	} {
		other := newLab(t)
		change(t, filepath.Join(other, c.file), c.old, c.new)
		status, _, stderr := play("card", filepath.Join(other, "rack-b.toml"), filepath.Join(other, "skerry.toml"), "-out", at(fmt.Sprint("bad", i)), "-detuning", c.detuning)
		if status != exitBadInput {
			t.Errorf("%s: %d", c.new, status)
		}
		mustBeOneLine(t, stderr, c.says)
		if _, err := os.Stat(at(fmt.Sprint("bad", i))); err == nil {
			t.Errorf("%s: a folder was written", c.new)
		}
	}
	// an interrupt writes nothing
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var out, errs bytes.Buffer
	if status := run(ctx, []string{"card", at("rack-b.toml"), at("skerry.toml"), "-out", at("gone")}, &out, &errs); status != exitInterrupted {
		t.Errorf("interrupted: %d, %s", status, errs.String())
	}
	if _, err := os.Stat(at("gone")); err == nil {
		t.Errorf("an interrupted card was written")
	}
}
