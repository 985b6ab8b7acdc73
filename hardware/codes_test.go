package hardware

import (
	"math"
	"math/cmplx"
	"testing"
)

func TestQuantise(t *testing.T) {
	for _, test := range []struct {
		x    complex128
		bits int
		i, q int16
		ok   bool
	}{
		{0, 14, 0, 0, true},
		{complex(0.5, -0.25), 14, 4096, -2048, true},
		{complex(0.5/8192, -0.5/8192), 14, 1, -1, true}, // half away from zero
		{complex(1.5/8192, -1.5/8192), 14, 2, -2, true}, // not half to even
		{complex(0.4999/8192, -0.4999/8192), 14, 0, 0, true},
		{complex(8191.0/8192, -1), 14, 8191, -8192, true},
		{complex(8191.49/8192, -8192.49/8192), 14, 8191, -8192, true},
		{1, 14, 0, 0, false}, // plus full scale does not exist (two's complement)
		{complex(0, 8191.5/8192), 14, 0, 0, false},
		{complex(0, -8192.5/8192), 14, 0, 0, false},
		{complex(0.5, -1), 2, 1, -2, true},
		{complex(32767.0/32768, -1), 16, 32767, -32768, true},
		{1, 16, 0, 0, false},
		{cmplx.NaN(), 14, 0, 0, false},
		{cmplx.Inf(), 14, 0, 0, false},
		{0, 1, 0, 0, false},
		{0, 17, 0, 0, false},
	} {
		i, q, err := Quantise(test.x, test.bits)
		if i != test.i || q != test.q || (err == nil) != test.ok {
			t.Errorf("%v at %d bit: %d, %d, %v; needed: %d, %d", test.x, test.bits, i, q, err, test.i, test.q)
		}
	}
}

// Every code of every resolution comes back from its sample.
func TestCodesComeBack(t *testing.T) {
	for bits := minBits; bits <= maxBits; bits++ {
		codes := make([]int16, 2<<bits)
		for c := range 1 << bits {
			codes[2*c], codes[2*c+1] = int16(c-1<<(bits-1)), int16(1<<(bits-1)-1-c)
		}
		x, err := SamplesOf(codes, bits)
		if err != nil {
			t.Fatal(err)
		}
		if x[0] != complex(-1, 1-math.Ldexp(1, 1-bits)) {
			t.Errorf("%d bit: the lowest and the highest code are %v", bits, x[0])
		}
		back, err := QuantiseAll(x, bits)
		if err != nil {
			t.Fatal(err)
		}
		for k := range codes {
			if back[k] != codes[k] {
				t.Fatalf("%d bit: code %d came back as %d", bits, codes[k], back[k])
			}
		}
	}
}

func TestCodesThatDoNotExist(t *testing.T) {
	for _, test := range []struct {
		codes []int16
		bits  int
		want  string
	}{
		{[]int16{0, 0, 8192, 0}, 14, "sample 1 has code 8192; allowed at 14 bit: -8192 to 8191"},
		{[]int16{0, -8193}, 14, "sample 0 has code -8193; allowed at 14 bit: -8192 to 8191"},
		{[]int16{0}, 14, "1 codes are not pairs of I and Q"},
		{[]int16{0, 0}, 20, "a converter of 20 bit; allowed: 2 to 16 bit"},
	} {
		if x, err := SamplesOf(test.codes, test.bits); err == nil || err.Error() != test.want {
			t.Errorf("%v: %v, %v; needed: %s", test.codes, x, err, test.want)
		}
	}
	want := "sample 1, quadrature Q: sample -1.5 of full scale has no code; allowed: -8192 to 8191 of 8192"
	if _, err := QuantiseAll([]complex128{0, -1.5i}, 14); err == nil || err.Error() != want {
		t.Errorf("got %v; needed: %s", err, want)
	}
}
