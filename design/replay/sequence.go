package replay

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"slices"
)

const (
	repeats        = 32  // of the bring-up table
	benchDetuning  = 5.0 // MHz: how far that of detuning goes,
	benchFullScale = 2   // or this part of the largest full scale, where it is less
)

// A follow says how pulses follow one another without a gap.
type follow struct {
	g    []float64 // generator of the frame's rotation; nil when there is none
	turn complex128
	// turn is the phase by which each pulse is turned against the one before, so that free frames are tracked as a lab tracks
	// them: with D = D_after D_before = exp(-i theta G) the sequence D_after U D_before D_after U D_before is
	// (D_after D) (D' U D) U D_before, and D' U D is the pulse with its samples times e^(-i theta).
}

// Why pulses back to back are not judged.
var (
	errNoFrame  = errors.New("the free Z angles are not those of one rotation of the frame: pulses back to back are not judged")
	errNoFollow = errors.New("local rotations cannot be followed from one pulse to the next: pulses back to back are not judged")
	errNoSquare = errors.New("a pulse that takes states to others has no square: pulses back to back are not judged")
	errTurning  = errors.New("the Hamiltonian turns by itself, so that the same samples a span later are another gate: pulses back to back are not judged")
)

// turning says whether the Hamiltonian depends on time otherwise than by what the channels play.
func (m *Model) turning() bool {
	return len(m.Rotating) > 0 || slices.ContainsFunc(m.Channels, func(c Channel) bool { return len(c.Paths) > 0 })
}

func (e *engine) follow() (follow, error) {
	f := follow{turn: 1}
	switch {
	case e.m.turning():
		return f, errTurning
	case len(e.m.LocalBefore) > 0:
		return f, errNoFollow
	}
	g, err := e.turn()
	if err == nil {
		f.g = g
	}
	free := false
	for i := range e.m.CodeSpace {
		free = free || e.between(i) != e.between(0)
	}
	if !free {
		return f, err
	}
	if err != nil {
		return f, errNoFrame
	}
	code := e.m.CodeSpace
	theta := 0.0
	for i := range code {
		if dg := g[code[i]] - g[code[0]]; math.Abs(dg) > 1e-9 {
			theta = -cmplx.Phase(e.between(i)*cmplx.Conj(e.between(0))) / dg
			break
		}
	}
	for i := range code {
		want := cmplx.Rect(1, -theta*(g[code[i]]-g[code[0]]))
		if cmplx.Abs(e.between(i)*cmplx.Conj(e.between(0))-want) > 1e-9 {
			return f, errNoFrame
		}
	}
	f.turn = cmplx.Rect(1, -theta)
	return f, nil
}

// between is element i of D_after D_before on the code space.
func (e *engine) between(i int) complex128 {
	d := complex(1, 0)
	if e.before != nil {
		d *= e.before[i]
	}
	if e.after != nil {
		d *= e.after[i]
	}
	return d
}

// train simulates pulses back to back, each with its samples times its turn, and gives the evolution for the required ends:
// from the start of the first window to the end of the last, or settled after it.
func (e *engine) train(ctx context.Context, turns []complex128) ([]complex128, error) {
	n, l := e.dim, e.labours[0]
	w := e.newWalker(nil, turns...)
	if err := w.to(ctx, e.start, reach{}, w.newPlan()); err != nil {
		return nil, err
	}
	total, next, u := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n)
	setIdentity(total, n)
	for k := range turns { // a plan for each pulse, so that memory does not grow with their number
		p := w.newPlan()
		if err := w.to(ctx, e.start+float64(k+1)*e.span, reach{}, p); err != nil {
			return nil, err
		}
		l.integrate(p, nil, 0, u)
		mul(next, u, total, n)
		total, next = next, total
	}
	return e.finish(ctx, w, total)
}

// finish makes a sequence's evolution that for the required ends; w stands at the end of its last window. The first
// pulse begins like a single one, so that pre is the same.
func (e *engine) finish(ctx context.Context, w *walker, total []complex128) ([]complex128, error) {
	if e.m.Ends == "window" {
		return append([]complex128(nil), total...), nil
	}
	n := e.dim
	post, _, err := e.settled(ctx, w)
	if err != nil {
		return nil, err
	}
	half, u := make([]complex128, n*n), make([]complex128, n*n)
	mul(half, post, total, n)
	mul(u, half, e.pre, n)
	return u, nil
}

// pair plays the pulse twice, the second turned by each of four phases, against the square of the target, the second
// factor turned likewise; always settled at the end, for it is the ring-out that is asked about. With a static part
// H0 the target is reached twice as the single one is, H0 included in each window; a turn needs H0 to commute with the frame's
// rotation, and otherwise only the phase zero is judged.
func (e *engine) pair(ctx context.Context) (Pair, error) {
	if e.states > 0 {
		return Pair{}, errNoSquare
	}
	f, err := e.follow()
	if notJudged(err) {
		return Pair{}, err
	}
	settled := *e.m
	settled.Ends = "settled"
	o := *e // the same engine, for settled ends
	o.m = &settled
	d := len(e.m.CodeSpace)
	turned, square := make([]complex128, d*d), make([]complex128, d*d)
	after := make([]complex128, d)
	for i := range after {
		after[i] = e.between(i)
		if e.after != nil {
			after[i] *= e.after[i]
		}
	}
	worst := Pair{Infidelity: -1}
	for quarter := range 4 {
		phi := math.Pi / 2 * float64(quarter)
		if quarter > 0 && f.g == nil {
			break
		}
		copy(turned, e.target)
		if quarter > 0 {
			for i, a := range e.m.CodeSpace {
				for j, b := range e.m.CodeSpace {
					turned[i*d+j] *= cmplx.Rect(1, -phi*(f.g[a]-f.g[b]))
				}
			}
		}
		mul(square, turned, e.target, d)
		quarterTurn := [...]complex128{1, 1i, -1, -1i}[quarter]
		u, err := o.train(ctx, []complex128{1, quarterTurn * f.turn})
		if err != nil {
			return Pair{}, err
		}
		if got := e.against(e.labours[0], e.first(e.labours[0], u), square, e.before, after).Infidelity; got > worst.Infidelity {
			worst = Pair{Infidelity: got, Phase: 90 * float64(quarter)}
		}
	}
	return worst, err
}

// bringUp makes the tables of populations, for two code states; the state of the first is prepared.
func (e *engine) bringUp(ctx context.Context) (BringUp, error) {
	var b BringUp
	if len(e.m.CodeSpace) != 2 {
		return b, nil
	}
	zero, one := e.m.CodeSpace[0], e.m.CodeSpace[1]
	var gates []gate
	all := e.newAmplitude(nil, "")
	for i := -10; i <= 10; i++ {
		b.Amplitude = append(b.Amplitude, Population{Value: float64(100+i) / 100})
		gates = append(gates, gate{all, float64(i) / 100})
	}
	for _, c := range e.m.classes() {
		if c.Name != "detuning" || c.Kind != "static" {
			continue
		}
		p := newStatic(c.Operator, e.dim)
		end := benchDetuning
		if slow := e.m.fastest() / benchFullScale; slow > 0 {
			end = math.Min(end, slow)
		}
		for i := -20; i <= 20; i++ {
			f := end * float64(i) / 20
			b.Detuning = append(b.Detuning, Population{Value: f})
			gates = append(gates, gate{p, f * perMHz})
		}
	}
	found := make([]float64, len(gates))
	if err := e.run(ctx, gates, func(l *labour, i int, u []complex128) {
		found[i] = square(e.ended(l, u)[one*e.dim+zero])
	}); err != nil {
		return b, err
	}
	for i := range b.Amplitude {
		b.Amplitude[i].One = found[i]
	}
	for i := range b.Detuning {
		b.Detuning[i].One = found[len(b.Amplitude)+i]
	}
	f, err := e.follow()
	if notJudged(err) {
		return b, nil // said where the pair is judged
	}
	turns := make([]complex128, repeats)
	turns[0] = 1
	for k := 1; k < repeats; k++ {
		turns[k] = turns[k-1] * f.turn
	}
	add := func(n int, u []complex128) {
		b.Repeats = append(b.Repeats, Population{Value: float64(n), One: square(u[one*e.dim+zero])})
	}
	for c := range e.m.Channels {
		if e.m.Channels[c].Delay < e.start {
			// The next pulse begins to arrive before the window of this one ends: each train for itself.
			for n := 1; n <= repeats; n++ {
				u, err := e.train(ctx, turns[:n])
				if err != nil {
					return b, err
				}
				add(n, u)
			}
			return b, nil
		}
	}
	n, l := e.dim, e.labours[0]
	w := e.newWalker(nil, turns...)
	total, next, u := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n)
	setIdentity(total, n)
	for k := range repeats {
		p := w.newPlan()
		if err := w.to(ctx, e.start+float64(k+1)*e.span, reach{}, p); err != nil {
			return b, err
		}
		l.integrate(p, nil, 0, u)
		mul(next, u, total, n)
		total, next = next, total
		end, err := e.finish(ctx, w.fork(k+1), total)
		if err != nil {
			return b, err
		}
		add(k+1, end)
	}
	return b, nil
}
