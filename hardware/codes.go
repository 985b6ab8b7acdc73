package hardware

import (
	"fmt"
	"math"
)

// LeastStep is the share of full scale that one converter code stands for,
//
//	LSB = 2^-(bits-1)
//
// bits is 2 to 16.
func LeastStep(bits int) float64 { return math.Ldexp(1, 1-bits) }

// LargestCode is the largest code of a two's complement converter, 2^(bits-1)-1.
// Plus one times full scale does not exist; minus one does.
func LargestCode(bits int) int { return 1<<(bits-1) - 1 }

// Quantise rounds one sample, in shares of full scale, to the codes of its two quadratures,
// half away from zero:
//
//	c = round(x 2^(bits-1)),  -2^(bits-1) <= c <= 2^(bits-1)-1
//
// It never clamps: a sample that is not finite or whose code does not exist is an error.
func Quantise(x complex128, bits int) (i, q int16, err error) {
	if i, err = quantise(real(x), bits); err != nil {
		return 0, 0, fmt.Errorf("quadrature I: %w", err)
	}
	if q, err = quantise(imag(x), bits); err != nil {
		return 0, 0, fmt.Errorf("quadrature Q: %w", err)
	}
	return i, q, nil
}

func quantise(x float64, bits int) (int16, error) {
	if bits < minBits || bits > maxBits {
		return 0, fmt.Errorf("a converter of %d bit; allowed: %d to %d bit", bits, minBits, maxBits)
	}
	c := math.Round(math.Ldexp(x, bits-1))
	if !(c >= -float64(LargestCode(bits)+1) && c <= float64(LargestCode(bits))) {
		return 0, fmt.Errorf("sample %v of full scale has no code; allowed: %d to %d of %d",
			x, -LargestCode(bits)-1, LargestCode(bits), LargestCode(bits)+1)
	}
	return int16(c), nil
}

// QuantiseAll rounds samples x, in shares of full scale, to interleaved codes I0 Q0 I1 Q1 ...,
// the C order of an array of shape (len(x), 2). The error names the first sample that has no code.
func QuantiseAll(x []complex128, bits int) ([]int16, error) {
	codes := make([]int16, 2*len(x))
	for k, v := range x {
		i, q, err := Quantise(v, bits)
		if err != nil {
			return nil, fmt.Errorf("sample %d, %w", k, err)
		}
		codes[2*k], codes[2*k+1] = i, q
	}
	return codes, nil
}

// SamplesOf is the way back from interleaved codes to shares of full scale, x = c / 2^(bits-1),
// exact in float64. A code that the converter does not have, or half a pair, is an error.
func SamplesOf(codes []int16, bits int) ([]complex128, error) {
	if bits < minBits || bits > maxBits {
		return nil, fmt.Errorf("a converter of %d bit; allowed: %d to %d bit", bits, minBits, maxBits)
	}
	if len(codes)%2 != 0 {
		return nil, fmt.Errorf("%d codes are not pairs of I and Q", len(codes))
	}
	for k, c := range codes {
		if int(c) > LargestCode(bits) || int(c) < -LargestCode(bits)-1 {
			return nil, fmt.Errorf("sample %d has code %d; allowed at %d bit: %d to %d",
				k/2, c, bits, -LargestCode(bits)-1, LargestCode(bits))
		}
	}
	x := make([]complex128, len(codes)/2)
	for k := range x {
		x[k] = complex(math.Ldexp(float64(codes[2*k]), 1-bits), math.Ldexp(float64(codes[2*k+1]), 1-bits))
	}
	return x, nil
}

// Codes turns unrounded samples of a channel, in shares of full scale, into its codes: what the converter has to put out for
// the drive to reach them, rounded. They are interleaved I0 Q0 I1 Q1 ..., the C order of an array of shape (len(x), 2), or of shape
// (len(x), 1) for a baseband channel, of which the samples must be real. The error names the first sample that has no code.
func (p *Profile) Codes(channel int, x []complex128) ([]int16, error) {
	c, err := p.checked(channel, len(x))
	if err != nil {
		return nil, err
	}
	codes := make([]int16, 0, c.Columns()*len(x))
	for k, v := range x {
		if c.Kind == Baseband && imag(v) != 0 {
			return nil, fmt.Errorf("sample %d is %v; needed: real numbers, as %q is a baseband channel", k, v, c.Name)
		}
		i, q, err := Quantise(c.Compression.Converter(v), p.Bits)
		if err != nil {
			return nil, fmt.Errorf("sample %d, %w", k, err)
		}
		codes = append(codes, i, q)[:(k+1)*c.Columns()]
	}
	return codes, nil
}

// Samples is the way back from codes of a channel, laid out as Codes does, to what the drive reaches, in shares of full
// scale. A code that the converter does not have, or half a pair, is an error.
func (p *Profile) Samples(channel int, codes []int16) ([]complex128, error) {
	c, err := p.checked(channel, 0)
	if err != nil {
		return nil, err
	}
	x, err := c.atConverter(codes, p.Bits)
	if err != nil {
		return nil, err
	}
	if _, err := p.checked(channel, len(x)); err != nil {
		return nil, err
	}
	for k := range x {
		for _, code := range codes[k*c.Columns() : (k+1)*c.Columns()] {
			if int(code) > LargestCode(p.Bits) || int(code) < -LargestCode(p.Bits)-1 {
				return nil, fmt.Errorf("sample %d has code %d; allowed at %d bit: %d to %d", k, code, p.Bits, -LargestCode(p.Bits)-1, LargestCode(p.Bits))
			}
		}
		x[k] = c.Compression.Reached(x[k])
	}
	return x, nil
}

// atConverter gives codes as shares at the converter, those that it does not have included.
func (c *Channel) atConverter(codes []int16, bits int) ([]complex128, error) {
	columns := c.Columns()
	if len(codes)%columns != 0 {
		return nil, fmt.Errorf("%d codes are not pairs of I and Q", len(codes))
	}
	x := make([]complex128, len(codes)/columns)
	for k := range x {
		q := 0.0
		if columns == 2 {
			q = math.Ldexp(float64(codes[2*k+1]), 1-bits)
		}
		x[k] = complex(math.Ldexp(float64(codes[columns*k]), 1-bits), q)
	}
	return x, nil
}
