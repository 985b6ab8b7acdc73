package solve

// An update keeps an estimate of the Hessian of |r|²/2, positive definite, from the
// gradients at the points that were accepted.
type update struct {
	step, slope, image []float64
	scaled             bool
}

func newUpdate(n int) *update {
	return &update{step: make([]float64, n), slope: make([]float64, n), image: make([]float64, n)}
}

// begin sets b, n x n of which the upper triangle is used, to the multiple of the
// identity for which a step against the gradient would cancel a linear miss.
func (u *update) begin(grad []float64, miss float64, b []float64) {
	f := 0.0
	for _, v := range grad {
		f += v * v
	}
	if f /= miss; !(f > 0) {
		f = 1
	}
	u.multiple(f, b)
}

func (u *update) multiple(f float64, b []float64) {
	clear(b)
	for i := range u.step {
		b[i*len(u.step)+i] = f
	}
}

// before takes the step from the old to the new point, and the old gradient.
func (u *update) before(old, next, grad []float64) {
	for i := range u.step {
		u.step[i], u.slope[i] = next[i]-old[i], -grad[i]
	}
}

// after takes the gradient at the new point and updates b.
func (u *update) after(grad, b []float64) {
	n := len(u.step)
	along, size := 0.0, 0.0
	for i, v := range grad {
		u.slope[i] += v
		along += u.slope[i] * u.step[i]
		size += u.slope[i] * u.slope[i]
	}
	if !u.scaled && along > 0 {
		u.multiple(size/along, b)
		u.scaled = true
	}
	clear(u.image)
	for i := range n {
		u.image[i] += b[i*n+i] * u.step[i]
		for k := i + 1; k < n; k++ {
			u.image[i] += b[i*n+k] * u.step[k]
			u.image[k] += b[i*n+k] * u.step[i]
		}
	}
	const least = 0.2
	bent := 0.0
	for i, v := range u.image {
		bent += v * u.step[i]
	}
	if !(bent > 0) {
		return
	}
	// damped, so that b stays positive definite
	if along < least*bent {
		f := (1 - least) * bent / (bent - along)
		for i := range u.slope {
			u.slope[i] = f*u.slope[i] + (1-f)*u.image[i]
		}
		along = least * bent
	}
	for i := range n {
		for k := i; k < n; k++ {
			b[i*n+k] += u.slope[i]*u.slope[k]/along - u.image[i]*u.image[k]/bent
		}
	}
}
