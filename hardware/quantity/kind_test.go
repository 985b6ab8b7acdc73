package quantity

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestParse(t *testing.T) {
	for _, c := range []struct {
		text string
		kind Kind
		want float64
	}{
		// Exact: the float64 nearest to the decimal, whatever the scale (the Go compiler rounds the constant on the right).
		{"112 ns", Time, 112}, {"112ns", Time, 112}, {"  112   ns ", Time, 112}, {"+3.2 ns", Time, 3.2}, {".5 us", Time, 500}, {"5. us", Time, 5000},
		{"1 s", Time, 1e9}, {"1.1 ms", Time, 1.1e6}, {"7 ps", Time, 7e-3}, {"2.5 µs", Time, 2500}, {"2.5 μs", Time, 2500}, {"-0 ns", Time, 0},
		{"40 MHz", Frequency, 0.04}, {"4e1 MHz", Frequency, 0.04}, {"0.04E+0 GHz", Frequency, 0.04}, {"80 kHz", Frequency, 8e-5}, {"3 Hz", Frequency, 3e-9},
		{"1 GS/s", SampleRate, 1}, {"2.4 GS/s", SampleRate, 2.4}, {"625 MS/s", SampleRate, 0.625}, {"10 kS/s", SampleRate, 1e-5}, {"9 S/s", SampleRate, 9e-9},
		{"-1.5 %", Ratio, -0.015}, {"95%", Ratio, 0.95}, {"250 ppm", Ratio, 250e-6}, {"25 %/sample", PerSample, 0.25}, {"0.3%/sample", PerSample, 0.003},
		{"0.5 V", Voltage, 0.5}, {"-120 mV", Voltage, -0.12}, {"3 uV", Voltage, 3e-6}, {"3 µV", Voltage, 3e-6},
		{"14 bit", Bits, 14}, {"1.57 rad", Angle, 1.57}, {"90 deg", Angle, math.Pi / 2}, {"-180 deg", Angle, -math.Pi},
	} {
		if got, err := Parse(c.text, c.kind); err != nil || got != c.want {
			t.Errorf("Parse(%q, %v) = %v, %v; want %v", c.text, c.kind, got, err, c.want)
		}
	}
}

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct {
		text string
		kind Kind
		want string
	}{
		{"112", Time, `found "112"; allowed: a time such as "112 ns" (the unit is missing)`},
		{"", Time, `found ""; allowed: a time such as "112 ns" (the text is empty)`},
		{"ns", Time, `found "ns"; allowed: a time such as "112 ns" (no number at the start)`},
		{"- 3 ns", Time, `found "- 3 ns"; allowed: a time such as "112 ns" (no number at the start)`},
		{"nan ns", Time, `found "nan ns"; allowed: a time such as "112 ns" (not a finite number)`},
		{"-Inf GHz", Frequency, `found "-Inf GHz"; allowed: a frequency such as "40 MHz" (not a finite number)`},
		{"1e400 ns", Time, `found "1e400 ns"; allowed: a time such as "112 ns" (too large a number)`},
		{"1e300 s", Time, `found "1e300 s"; allowed: a time such as "112 ns" (too large a number)`},
		{"9e99999999999999999999 ns", Time, `found "9e99999999999999999999 ns"; allowed: a time such as "112 ns" (too large a number)`},
		{"40 Mhz", Frequency, `found "40 Mhz"; allowed: a frequency such as "40 MHz" (units are case-sensitive: write MHz)`},
		{"40 mhz", Frequency, `found "40 mhz"; allowed: a frequency such as "40 MHz" (units are case-sensitive: write MHz)`},
		{"25 MHz", PerSample, `found "25 MHz"; allowed: a share per sample such as "25 %/sample" ("MHz" is a unit of frequency)`},
		{"25 %", PerSample, `found "25 %"; allowed: a share per sample such as "25 %/sample" ("%" is a unit of share)`},
		{"1 GHz", SampleRate, `found "1 GHz"; allowed: a sample rate such as "1 GS/s" ("GHz" is a unit of frequency)`},
		{"1 GSa/s", SampleRate, `found "1 GSa/s"; allowed: a sample rate such as "1 GS/s" (write GS/s)`},
		{"14 bits", Bits, `found "14 bits"; allowed: a resolution such as "14 bit" (write bit)`},
		{"14.5 bit", Bits, `found "14.5 bit"; allowed: a resolution such as "14 bit" (a whole number is needed)`},
		{"0.5 dB", Ratio, `found "0.5 dB"; allowed: a share such as "1.5 %" ("dB" is not one of ppm, %)`},
		{"1,5 ns", Time, `found "1,5 ns"; allowed: a time such as "112 ns" (write decimals with a point, not with a comma)`},
		{"−1.5 %", Ratio, `found "−1.5 %"; allowed: a share such as "1.5 %" (write the minus sign as the hyphen -)`},
		{"0x10 ns", Time, `found "0x10 ns"; allowed: a time such as "112 ns" ("x10 ns" is not one of ps, ns, us, µs, ms, s)`},
		{"1_000 ns", Time, `found "1_000 ns"; allowed: a time such as "112 ns" ("_000 ns" is not one of ps, ns, us, µs, ms, s)`},
		{"3 ns ns", Time, `found "3 ns ns"; allowed: a time such as "112 ns" ("ns ns" is not one of ps, ns, us, µs, ms, s)`},
		{"3\tns", Time, `found "3\tns"; allowed: a time such as "112 ns" ("\tns" is not one of ps, ns, us, µs, ms, s)`},
		{"90 °", Angle, `found "90 °"; allowed: an angle such as "90 deg" (write deg)`},
		{"1e308 deg", Angle, `found "1e308 deg"; allowed: an angle such as "90 deg" (too large a number)`},
		{"11111111111111111111111111111111111111111111111111111111111111111 ns", Time,
			`found "111111111111111111111111111111111111111111111111111111111111"...; allowed: a time such as "112 ns" (longer than 64 characters)`},
	} {
		_, err := Parse(c.text, c.kind)
		if err == nil || err.Error() != c.want {
			t.Errorf("Parse(%q):\n got %v\nwant %s", c.text, err, c.want)
		}
	}
}

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		v    float64
		kind Kind
		want string
	}{
		{0.04, Frequency, "40 MHz"}, {2 * math.Pi * 0.04 / (2 * math.Pi), Frequency, "40 MHz"}, {1e-6, Frequency, "1 kHz"}, {5.2, Frequency, "5.2 GHz"}, {0, Frequency, "0 Hz"},
		{112, Time, "112 ns"}, {999.9999999, Time, "1 us"}, {999.9, Time, "999.9 ns"}, {0.0032, Time, "3.2 ps"}, {1e9, Time, "1 s"}, {-30, Time, "-30 ns"},
		{math.Pi, Time, "3.14159 ns"}, {-0.015, Ratio, "-1.5 %"}, {0.001, Ratio, "0.1 %"}, {1e-4, Ratio, "0.01 %"}, {5e-5, Ratio, "50 ppm"}, {1, Ratio, "100 %"},
		{0.25, PerSample, "25 %/sample"}, {1e-4, PerSample, "0.01 %/sample"}, {0.5, Voltage, "500 mV"}, {2, Voltage, "2 V"}, {14, Bits, "14 bit"},
		{math.Pi / 2, Angle, "90 deg"}, {1, SampleRate, "1 GS/s"}, {0.625, SampleRate, "625 MS/s"},
		{math.Inf(1), Frequency, "infinite"}, {math.Inf(-1), Ratio, "minus infinite"}, {math.NaN(), Time, "not a number"},
	} {
		if got := Format(c.v, c.kind); got != c.want {
			t.Errorf("Format(%v) = %q, want %q", c.v, got, c.want)
		}
	}
}

// What Format writes, Parse reads, to the six digits that were written.
func TestFormatParse(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 2000 {
		v := math.Pow(10, 24*r.Float64()-12)
		if r.IntN(2) == 0 {
			v = -v
		}
		for _, k := range kinds() {
			if k == Bits {
				v = math.Trunc(1e3 * r.Float64())
			}
			text := Format(v, k)
			got, err := Parse(text, k)
			if err != nil || !(math.Abs(got-v) <= 0.5000001e-5*math.Abs(v)) {
				t.Fatalf("Parse(Format(%v)) = Parse(%q) = %v, %v", v, text, got, err)
			}
		}
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"112 ns", "-1.5 %", "25 %/sample", "1e400 ns", "2.5 µs", "nan ns", "1 GS/s", "90 deg", "+.e1 bit", "0e-99999999 V"} {
		for _, k := range kinds() {
			f.Add(s, int(k))
		}
	}
	f.Fuzz(func(t *testing.T, s string, kind int) {
		k := kinds()[uint(kind)%uint(len(kinds()))]
		v, err := Parse(s, k)
		if err != nil {
			if v != 0 {
				t.Fatalf("Parse(%q) = %v with %v", s, v, err)
			}
			return
		}
		if math.IsNaN(v) || math.IsInf(v, 0) {
			t.Fatalf("Parse(%q) = %v", s, v)
		}
		again, err := Parse(Format(v, k), k)
		if k == Bits && math.Abs(v) >= 1e6 || math.Abs(v) > 1e295 || math.Abs(v) < 1e-295 {
			return // six digits do not hold it; at the ends of the range the scale may round to nothing
		}
		if err != nil || !(math.Abs(again-v) <= 0.5000001e-5*math.Abs(v)) {
			t.Fatalf("Parse(%q) = %v, written as %q, read as %v, %v", s, v, Format(v, k), again, err)
		}
	})
}
