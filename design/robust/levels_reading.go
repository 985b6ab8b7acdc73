package robust

import (
	"math"

	"holdfast/design/dynamics"
)

// A reading takes the coordinates of a toggled integral to residuals.
type reading struct {
	rows   int
	parts  []readingPart
	needed []int // coordinates, ascending
}

type readingPart struct {
	row, coordinate int
	factor          float64
}

func (r *reading) add(row, coordinate int, factor float64) {
	if factor == 0 {
		return
	}
	r.parts = append(r.parts, readingPart{row, coordinate, factor})
	r.rows = max(r.rows, row+1)
}

// readCode reads the code space's block without its trace.
func readCode(d int, code []int) (r reading) {
	row := 0
	for k := 1; k < len(code); k++ { // an orthonormal basis of traceless diagonals
		n := math.Sqrt(float64(k * (k + 1)))
		for i := range k {
			r.add(row, dynamics.Coordinate(code[i], code[i], d), 1/n)
		}
		r.add(row, dynamics.Coordinate(code[k], code[k], d), -float64(k)/n)
		row++
	}
	for i := range code {
		for _, q := range code[i+1:] {
			at := dynamics.Coordinate(min(code[i], q), max(code[i], q), d)
			r.add(row, at, 1)
			r.add(row+1, at+1, 1)
			row += 2
		}
	}
	return r.done(d)
}

// readLeak reads what couples the code space to the rest: (1 - P) A P, whose entries are
// those of A, of half the squares of the coordinates.
func readLeak(d int, code, outside []int) (r reading) {
	row := 0
	for _, o := range outside {
		for _, i := range code {
			at := dynamics.Coordinate(min(i, o), max(i, o), d)
			r.add(row, at, math.Sqrt2/2)
			r.add(row+1, at+1, math.Sqrt2/2)
			row += 2
		}
	}
	return r.done(d)
}

// readStates reads (1 - Q) A F, F the d x k columns of the first states.
func readStates(d, k int, from []complex128) (r reading) {
	row := 0
	left := diagonal(d)
	for i, x := range product(from, adjoint(from, d, k), d, k, d) {
		left[i] -= x
	}
	for p := range d {
		for j := range k {
			for a := range d {
				for b := a; b < d; b++ {
					// entry (a, b) of A is (x + i y)/√2, entry (b, a) its conjugate
					f, g := left[p*d+a]*from[b*k+j], left[p*d+b]*from[a*k+j]
					at := dynamics.Coordinate(a, b, d)
					if a == b {
						r.add(row, at, real(f))
						r.add(row+1, at, imag(f))
						continue
					}
					const h = math.Sqrt2 / 2
					r.add(row, at, h*(real(f)+real(g)))
					r.add(row+1, at, h*(imag(f)+imag(g)))
					r.add(row, at+1, h*(imag(g)-imag(f)))
					r.add(row+1, at+1, h*(real(f)-real(g)))
				}
			}
			row += 2
		}
	}
	r.rows = row
	return r.done(d)
}

func (r reading) done(d int) reading {
	seen := make([]bool, d*d)
	for _, p := range r.parts {
		seen[p.coordinate] = true
	}
	for i, s := range seen {
		if s {
			r.needed = append(r.needed, i)
		}
	}
	return r
}

// of returns the residuals of a matrix.
func (r *reading) of(a []complex128, d int, coord []float64) []float64 {
	dynamics.Coordinates(coord, a, d)
	out := make([]float64, r.rows)
	for _, p := range r.parts {
		out[p.row] += p.factor * coord[p.coordinate]
	}
	return out
}

func sumSquares(list []float64) float64 {
	s := 0.0
	for _, v := range list {
		s += v * v
	}
	return s
}
