package replay

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
)

// A class of many operators is looked at along each of them, and a class with a list or of several sites also along the combination that survives most
// to first order and along some fixed ones; all of them both ways. What a curve costs is counted before it is spent, in gates times steps times the
// multiplications of two matrices, so that the answer depends on no clock.
const (
	combinations = 16 // fixed ones, of a class of 2 to mostCombined operators
	mostCombined = 64
	effort       = 30e6     // of the curve of one class
	fewest, most = 60, 3000 // gates, whatever the effort
	followed     = 8        // ways at most that a curve follows where it cannot follow all, and half as many at least
	looks        = 8        // sizes at most at which a margin is looked at along the way to it
)

// affordable says how many gates the effort for one class is good for.
func (e *engine) affordable() int {
	n := float64(e.dim)
	each := float64(max(1, len(e.plans[0].steps))) * n * n * float64(e.columns)
	return int(math.Max(fewest, math.Min(most, effort/each)))
}

// combine gives the probe of sum v_i V_i over a class.
func (e *engine) combine(s *study, v []float64) *probed {
	op := make([]complex128, e.dim*e.dim)
	for i, o := range s.all {
		for k, z := range o.static {
			op[k] += complex(v[i], 0) * z
		}
	}
	p := &probed{probe: newStatic(op, e.dim), unit: perMHz}
	e.weigh(p, nil)
	return p
}

// weakest finds the margin of a class of many operators, the smallest over the directions, either way. It chooses too what the curve follows, and
// says what was looked at.
func (e *engine) weakest(ctx context.Context, r *Error, s *study, nominal, threshold float64, like []Error) error {
	n := len(s.all)
	looked := []string{fmt.Sprintf("the %d operators of the class", n)}
	if n == 1 {
		looked[0] = "the one operator of the class"
	} else if s.class.Operators != nil || len(e.m.Sites) > 0 {
		if r.Direction != nil {
			s.sides = append(s.sides, e.combine(s, r.Direction))
			looked = append(looked, "the combination that survives most")
		}
		if n <= mostCombined {
			random := rand.New(rand.NewPCG(uint64(n), combinations))
			for range combinations {
				v, length := make([]float64, n), 0.0
				for i := range v {
					v[i] = random.NormFloat64()
					length = math.Hypot(length, v[i])
				}
				for i := range v {
					v[i] /= length
				}
				s.sides = append(s.sides, e.combine(s, v))
			}
			looked = append(looked, fmt.Sprintf("%d fixed combinations", combinations))
		}
	}
	r.Sampled = strings.Join(looked, ", ") + ", both ways"
	list := s.courses()
	harm := make([]float64, len(list))
	if nominal <= threshold {
		var err error
		if r.High, err = e.nearest(ctx, list, harm, nominal, threshold); err != nil {
			return err
		}
	}
	r.Low = -r.High
	values := e.curveValues(r, like)
	if len(values)*len(list) <= e.affordable() {
		return nil
	}
	if !(nominal <= threshold) {
		if err := e.look(ctx, list, values[len(values)-1:], harm, nil); err != nil {
			return err
		}
	}
	// The curve is drawn along those that are worst near the margin.
	order := make([]int, len(list))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(harm[j], harm[i]) })
	few := max(followed/2, min(followed, e.affordable()/len(values)))
	for _, i := range order[:min(few, len(order))] {
		s.few = append(s.few, list[i])
	}
	r.Sampled += fmt.Sprintf("; the curve along the %d ways that are worst", len(s.few))
	return nil
}

// nearest finds the smallest of the sizes at which courses first break the threshold, or +Inf where none does within what is searched. One
// course is searched as far as margins are; of the others only whether they break the threshold before that one, at a few sizes on the way, and of those that
// do the worst is searched next, until none is left. harm is filled with the infidelity at the margin of the first.
func (e *engine) nearest(ctx context.Context, list []course, harm []float64, nominal, threshold float64) (float64, error) {
	lead, most, strength := 0, -1.0, 0.0
	for i, c := range list {
		strength = math.Max(strength, c.o.strength)
		lambda := e.smallest(c.o)
		if h := c.o.harm / (lambda * lambda); h > most {
			lead, most = i, h
		}
	}
	bound := e.farthest
	search := func(c course, grid []float64) error {
		one := []crossing{newCrossing(c, nominal, threshold, grid)}
		err := e.cross(ctx, one)
		bound = math.Min(bound, one[0].found)
		return err
	}
	if err := search(list[lead], list[lead].o.searchGrid(bound)); err != nil {
		return 0, err
	}
	// MHz that turn by a quarter, by the root of the mean square of the eigenvalues.
	quarter := math.Pi / 4 / (strength / math.Sqrt(float64(e.dim)) * perMHz)
	open := make([]int, len(list))
	for i := range open {
		open[i] = i
	}
	for first := true; len(open) > 0; first = false {
		sizes := make([]float64, int(math.Max(1, math.Min(looks, math.Ceil(bound/quarter)))))
		for i := range sizes {
			sizes[i] = bound * float64(i+1) / float64(len(sizes))
		}
		ways := make([]course, len(open))
		for i, k := range open {
			ways[i] = list[k]
		}
		last, worst := make([]float64, len(open)), make([]float64, len(open))
		if err := e.look(ctx, ways, sizes, last, worst); err != nil {
			return 0, err
		}
		var next []int
		at := -1
		most := 0.0
		for i, k := range open {
			if first {
				harm[k] = last[i]
			}
			if worst[i] > threshold && k != lead {
				next = append(next, k)
				if worst[i] > most {
					at, most = k, worst[i]
				}
			}
		}
		if at >= 0 {
			if err := search(list[at], sizes); err != nil {
				return 0, err
			}
		}
		open = slices.DeleteFunc(next, func(k int) bool { return k == at })
	}
	if bound >= e.farthest {
		return math.Inf(1), nil
	}
	return bound, nil
}

// look fills in the infidelity of every course at the last of the sizes, and the largest over the sizes where worst is not nil.
func (e *engine) look(ctx context.Context, list []course, sizes, last, worst []float64) error {
	var gates []gate
	for _, c := range list {
		for _, x := range sizes {
			gates = append(gates, gate{c.o.probe, c.sign * x * c.o.unit})
		}
	}
	found := make([]float64, len(gates))
	if err := e.infidelities(ctx, gates, found); err != nil {
		return err
	}
	for i := range list {
		part := found[i*len(sizes) : (i+1)*len(sizes)]
		last[i] = part[len(part)-1]
		if worst != nil {
			worst[i] = slices.Max(part)
		}
	}
	return nil
}
