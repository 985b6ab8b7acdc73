# Writes lowpass.txt: Butterworth and Gaussian-like low-passes of orders 1 to 8,
# scaled so that |G|^2 is 1/2 at 1 rad/ns, worked out in 40 digits.
#   pole        real and imaginary part
#   transition  10-90 % transition time of the step times the cyclic corner
#   overshoot   largest excess of the step over one
# and for the Gaussian-like ones their distance from the Gaussian of equal corner:
#   gain        largest difference of |G|, over all frequencies
#   step        largest difference of the step responses, their 50 % points aligned
# python3 lowpass.py > lowpass.txt      (made with mpmath 1.2.1, Python 3.11)
from mpmath import (mp, mpf, mpc, polyroots, findroot, factorial, nstr, sqrt, exp, expj,
                    log, pi, erfc, diff)
mp.dps = 40
print("# family order kind value value; mpmath 1.2.1, 40 digits")

def top(f, grid):
    """Largest |f| over the grid, refined where the slope is zero."""
    best, at = max((abs(f(t)), i) for i, t in enumerate(grid))
    if at in (0, len(grid) - 1):
        return best
    for _ in range(120):                      # golden section
        if at is not None:
            a, b, at = grid[at-1], grid[at+1], None
        g = (3 - sqrt(5))/2
        x, y = a + g*(b-a), b - g*(b-a)
        if abs(f(x)) > abs(f(y)): b = y
        else: a = x
    return max(best, abs(f((a+b)/2)))

def report(name, n, poles):
    for p in sorted(poles, key=lambda p: (p.real, p.imag)):
        print(name, n, "pole", nstr(p.real, 25), nstr(p.imag, 25) if abs(p.imag) > mpf(10)**-30 else 0)
    res = []
    for p in poles:                           # of G/s at p: the step response
        r = mpf(-1)
        for q in poles:
            if q is not p: r *= q/(q-p)
        res.append(r)
    step = lambda t: 1 + sum((r*exp(p*t)).real for r, p in zip(res, poles))
    grid = [mpf(k)/20 for k in range(1, 801)]
    values = [step(t) for t in grid]
    def cross(level):
        i = next(i for i, v in enumerate(values) if v >= level)
        a = grid[i-1] if i else mpf(0)
        return findroot(lambda t: step(t)-level, (a, grid[i]), solver='anderson', tol=mpf(10)**-60)
    print(name, n, "transition", nstr((cross(mpf('0.9')) - cross(mpf('0.1')))/(2*pi), 20), 0)
    over = top(lambda t: max(step(t)-1, mpf(0)), grid)
    print(name, n, "overshoot", nstr(over, 20) if over > mpf(10)**-30 else 0, 0)
    return step, cross

for n in range(1, 9):
    report("butterworth", n, [expj(pi*(2*k+n-1)/(2*n)) for k in range(1, n+1)])
for n in range(1, 9):
    a = [1/factorial(k) for k in range(n+1)]
    y = findroot(lambda y: sum(c*y**k for k, c in enumerate(a)) - 2, log(2))
    poles = []
    for z in polyroots(a[::-1], maxsteps=500, extraprec=400):
        s = sqrt(-z/y)
        poles.append(-s if s.real > 0 else s)
    step, cross = report("gaussian", n, poles)
    gain = lambda w: 1/sqrt(sum(c*(y*w*w)**k for k, c in enumerate(a)))
    print("gaussian", n, "gain", nstr(top(lambda w: gain(w)-exp(-log(2)*w*w/2), [mpf(k)/50 for k in range(0, 500)]), 20), 0)
    mid, sigma = cross(mpf('0.5')), sqrt(log(2))
    ideal = lambda t: erfc(-(t-mid)/(sigma*sqrt(2)))/2
    print("gaussian", n, "step", nstr(top(lambda t: step(t)-ideal(t), [mpf(k)/50 for k in range(0, 1000)]), 20), 0)
