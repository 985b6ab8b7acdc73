package hardware

import (
	"fmt"
	"math"
)

// ArrivalRows is how many rows an arrival file has for each sample of the window.
const ArrivalRows = 8

// Arrival gives what the interleaved codes of a channel become at the device: rows of three numbers,
//
//	time   ns after the trigger, from the start of the window to one span after its end, ArrivalRows a sample
//	I, Q   MHz, the Rabi frequency of each quadrature behind compression and line: full scale/(2 pi) times (u_I, u_Q);
//	       of a baseband channel the frequency by which it turns the device, and Q is zero where the line is real
//
// Where the line lets part of a step through at once, the row at the edge holds the value just after it. A code that the
// converter does not have is an error, and so is half a sample.
func (p *Profile) Arrival(channel int, codes []int16) ([]float64, error) {
	if channel < 0 || channel >= len(p.Channels) {
		return nil, fmt.Errorf("%s has no channel %d; it has %d", p.Name, channel, len(p.Channels))
	}
	c := &p.Channels[channel]
	columns := c.Columns()
	if len(codes)%columns != 0 || len(codes)/columns > maxSamples {
		return nil, fmt.Errorf("%d codes; allowed: whole samples of %d, at most %d of them", len(codes), columns, maxSamples)
	}
	y := make([]complex128, len(codes)/columns)
	for k := range y {
		var share [2]float64
		for q, code := range codes[k*columns : (k+1)*columns] {
			if int(code) > LargestCode(p.Bits) || int(code) < -LargestCode(p.Bits)-1 {
				return nil, fmt.Errorf("sample %d has code %d; allowed at %d bit: %d to %d", k, code, p.Bits, -LargestCode(p.Bits)-1, LargestCode(p.Bits))
			}
			share[q] = math.Ldexp(float64(code), 1-p.Bits)
		}
		y[k] = c.Compression.Reached(complex(share[0], share[1]))
	}
	times := make([]float64, 2*len(y)*ArrivalRows+1)
	for k := range times {
		// The edge of every sample exactly, so that the value there is the one after it.
		times[k] = float64(k/ArrivalRows)*p.SamplePeriod + float64(k%ArrivalRows)*(p.SamplePeriod/ArrivalRows)
	}
	start, scale := p.Start(channel), c.FullScale/(2*math.Pi)*1e3
	rows := make([]float64, 0, 3*len(times))
	for k, u := range c.Line.Held(y, p.SamplePeriod, times, nil) {
		// adding zero turns minus zero into zero
		rows = append(rows, start+times[k], scale*real(u)+0, scale*imag(u)+0)
	}
	return rows, nil
}

// WriteArrival writes the rows that Arrival gave as a new NPY file at path, float64 of shape (rows, 3).
func WriteArrival(path string, rows []float64) error { return WriteNPY(path, len(rows)/3, 3, rows) }
