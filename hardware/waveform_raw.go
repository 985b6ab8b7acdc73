package hardware

import (
	"bufio"
	"encoding/binary"
)

// WriteRaw writes codes as a new file at path that holds nothing else: two's complement of 16 bits, the low byte first, in
// the order given, which for a quadrature channel is I0 Q0 I1 Q1 ... A converter of fewer bits has its codes in the low
// bits, with the sign extended: they are not shifted up. It refuses to overwrite, and leaves nothing behind when it fails.
func WriteRaw(path string, codes []int16) error {
	return writeNew(path, func(w *bufio.Writer) error { return binary.Write(w, binary.LittleEndian, codes) })
}
