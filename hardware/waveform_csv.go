package hardware

import (
	"bufio"
	"encoding/csv"
	"fmt"
	"os"
	"strconv"
)

// CSVHeader gives the first line of a waveform's CSV file, with the unit in each column's name: the leading edge of the
// sample in ns after that of sample 0, the codes as they are played, and the same as shares of full scale. A channel
// has two quadratures, or one converter.
func CSVHeader(quadratures int) []string {
	if quadratures == 1 {
		return []string{"time_ns", "code", "share"}
	}
	return []string{"time_ns", "code_i", "code_q", "share_i", "share_q"}
}

// WriteCSV writes codes, interleaved by quadrature, as a new CSV file at path (RFC 4180: commas, CRLF, one header
// line), one sample a line. period is that of the samples in ns. Every number is written with as many digits as
// reading the same float64 back takes. It refuses to overwrite, and leaves nothing behind when it fails.
func WriteCSV(path string, period float64, bits, quadratures int, codes []int16) error {
	if quadratures != 1 && quadratures != 2 || len(codes)%quadratures != 0 {
		return fmt.Errorf("%s: %d codes for %d quadratures; allowed: whole samples of 1 or 2", path, len(codes), quadratures)
	}
	return writeNew(path, func(w *bufio.Writer) error {
		c := csv.NewWriter(w)
		c.UseCRLF = true
		c.Write(CSVHeader(quadratures)) // a csv.Writer keeps its first error: Error tells it
		record := make([]string, 1+2*quadratures)
		for k := 0; k < len(codes)/quadratures; k++ {
			record[0] = shortest(float64(k) * period)
			for q := range quadratures {
				code := codes[k*quadratures+q]
				record[1+q] = strconv.Itoa(int(code))
				record[1+quadratures+q] = shortest(float64(code) * LeastStep(bits))
			}
			c.Write(record)
		}
		c.Flush()
		return c.Error()
	})
}

// shortest writes a number with the fewest digits that read back as the same float64.
func shortest(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

// writeNew makes a new file at path of what fill writes. Nothing is left behind when it fails.
func writeNew(path string, fill func(*bufio.Writer) error) (err error) {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return fileError(path, err)
	}
	defer func() {
		if cerr := f.Close(); err == nil && cerr != nil {
			err = fileError(path, cerr)
		}
		if err != nil {
			os.Remove(path)
		}
	}()
	w := bufio.NewWriter(f)
	if err := fill(w); err != nil {
		return fileError(path, err)
	}
	if err := w.Flush(); err != nil {
		return fileError(path, err)
	}
	return nil
}
