package shape

import (
	"math"
	"testing"
)

// allSplines are the values of all intervals+degree splines at x = at + past.
func allSplines(at, intervals, degree int, past float64) []float64 {
	all := make([]float64, intervals+degree)
	splines(at, intervals, past, 1-past, all[at:at+degree+1])
	return all
}

// The clamped cubic splines on knots 0000 1 2 3 4444. Source: C. de Boor, A practical
// guide to splines (1978), the recurrence; exact fractions CALC.
func TestSplinesPublished(t *testing.T) {
	for _, c := range []struct {
		at   int
		past float64
		want []float64
	}{
		{0, .5, []float64{1. / 8, 19. / 32, 25. / 96, 1. / 48, 0, 0, 0}}, // .125 .59375 .2604166667 .0208333333
		{1, 0, []float64{0, 1. / 4, 7. / 12, 1. / 6, 0, 0, 0}},
		{3, .5, []float64{0, 0, 0, 1. / 48, 25. / 96, 19. / 32, 1. / 8}}, // mirrored
		{0, 0, []float64{1, 0, 0, 0, 0, 0, 0}},
	} {
		for i, got := range allSplines(c.at, 4, 3, c.past) {
			if !(math.Abs(got-c.want[i]) <= 1.2e-16) {
				t.Errorf("x=%v: spline %d is %.17g, want %.17g", float64(c.at)+c.past, i, got, c.want[i])
			}
		}
	}
}

// slowSpline is Cox and de Boor's recurrence, word for word.
func slowSpline(i, p int, knots []float64, x float64) float64 {
	if p == 0 {
		if knots[i] <= x && x < knots[i+1] {
			return 1
		}
		return 0
	}
	var s float64
	if d := knots[i+p] - knots[i]; d > 0 {
		s += (x - knots[i]) / d * slowSpline(i, p-1, knots, x)
	}
	if d := knots[i+p+1] - knots[i+1]; d > 0 {
		s += (knots[i+p+1] - x) / d * slowSpline(i+1, p-1, knots, x)
	}
	return s
}

// Partition of unity, nowhere negative, and the recurrence in its plain form.
func TestSplinesPartitionOfUnity(t *testing.T) {
	for degree := 1; degree <= MaxDegree; degree++ {
		for intervals := 1; intervals <= 9; intervals++ {
			var knots []float64
			for q := range intervals + 2*degree + 1 {
				knots = append(knots, float64(min(max(q-degree, 0), intervals)))
			}
			for i := range intervals * 16 {
				at, past := i/16, float64(i%16)/16
				var total float64
				for j, got := range allSplines(at, intervals, degree, past) {
					if want := slowSpline(j, degree, knots, float64(at)+past); !(got >= 0) || !(math.Abs(got-want) <= 3e-16) {
						t.Errorf("degree %d, %d intervals, x=%v: spline %d is %v, want %v", degree, intervals, float64(at)+past, j, got, want)
					}
					total += got
				}
				if !(math.Abs(total-1) <= 5e-16) {
					t.Errorf("degree %d, %d intervals, x=%v: sum %v", degree, intervals, float64(at)+past, total)
				}
			}
		}
	}
}

// The splines at the samples against scipy.interpolate.BSpline 1.10.1 (CALC;
// testdata/shape/families.py), and BSpline's columns as their QR factorisation: R = Q'A has zeros
// under its diagonal, a positive diagonal, and Q R gives A back.
func TestBSplineAgainstLibrary(t *testing.T) {
	for _, r := range readFamilyReference(t).Splines {
		for k, row := range r.Values {
			at, rest := r.Intervals*(k+1)/(r.N+1), r.Intervals*(k+1)%(r.N+1)
			for i, got := range allSplines(at, r.Intervals, r.Degree, float64(rest)/float64(r.N+1)) {
				if !(math.Abs(got-row[i]) <= 3e-15) {
					t.Errorf("degree %d, %d intervals: spline %d is %v at sample %d, want %v", r.Degree, r.Intervals, i, got, k, row[i])
				}
			}
		}
		skip := (r.Degree + 1) / 2
		count := r.Intervals + r.Degree - 2*skip
		b := spline(r.Degree)
		q, err := b(r.N, 0, 0, 0.5, count)
		if err != nil {
			t.Fatal(err)
		}
		for j := range count {
			a := make([]float64, r.N)
			for k, row := range r.Values {
				a[k] = row[j+skip]
			}
			factors := q.Transpose(a, nil)
			for i, f := range factors {
				if i > j && !(math.Abs(f) <= 1e-14) || i == j && !(f > 0.01) {
					t.Errorf("degree %d: R(%d,%d) = %v", r.Degree, i, j, f)
				}
			}
			for k, got := range q.Apply(factors, nil) {
				if !(math.Abs(got-a[k]) <= 1e-14) {
					t.Errorf("degree %d: (QR)(%d,%d) = %v, want %v", r.Degree, k, j, got, a[k])
				}
			}
		}
	}
}

// The columns begin and end at zero to the order that the documentation states:
// halving the sample period divides the first sample by 2^power (and by the root of 2).
func TestBSplineEnds(t *testing.T) {
	for degree := 1; degree <= MaxDegree; degree++ {
		power := float64((degree + 1) / 2)
		// Column 0 is a spline: what is left with the lowest power at its start.
		short, err := BSpline(1999, 0, 0, 0.5, 8, degree)
		if err != nil {
			t.Fatal(err)
		}
		long, err := BSpline(3999, 0, 0, 0.5, 8, degree)
		if err != nil {
			t.Fatal(err)
		}
		if ratio, want := short.Column(0)[0]/long.Column(0)[0], math.Exp2(power+0.5); !(math.Abs(ratio-want) <= 0.02*want) {
			t.Errorf("degree %d: first samples in a ratio of %v, want %v", degree, ratio, want)
		}
		last := func(b *Basis) (s float64) { // of the largest
			for j := range b.Count {
				s = math.Hypot(s, b.Column(j)[b.Samples-1])
			}
			return s
		}
		if ratio, want := last(short)/last(long), math.Exp2(power+0.5); !(math.Abs(ratio-want) <= 0.02*want) {
			t.Errorf("degree %d: last samples in a ratio of %v, want %v", degree, ratio, want)
		}
	}
}
