#!/usr/bin/python3
"""Reference values for the tests of package shape, by means that are not its own.

    /usr/bin/python3 testdata/shape/reference.py > testdata/shape/reference.json

Needs Debian's python3-scipy and python3-mpmath; the tests read only the output.

sequences: scipy.signal.windows.dpss, the sequences and concentration ratios.
concentration: 1 - lambda from the sinc kernel itself in 60 decimal digits (mpmath): eigenvectors
    by inverse iteration on the commuting matrix in those digits, then the Rayleigh quotient.
composite: series coefficients of the average gate infidelity of each composite sequence at small amplitude
    error eps and detuning f (in units of the Rabi rate), by 2x2 matrices in 60 digits.
    Angles and phases are written here from the published formulas, not taken from the package.
"""
import json
import mpmath as mp
import numpy as np
import scipy
from scipy.signal.windows import dpss

mp.mp.dps = 60


def sequences(n, nw, count):
    v, ratios = dpss(n, nw, count, sym=True, norm=2, return_ratios=True)
    return dict(n=n, w=nw / n, columns=[[float(t) for t in x] for x in v], ratios=[float(r) for r in ratios])


def concentration(n, nw, count):
    w = mp.mpf(nw) / n
    c = mp.cos(2 * mp.pi * w)
    d = [(mp.mpf(n - 1 - 2 * k) / 2) ** 2 * c for k in range(n)]
    e = [mp.mpf(k + 1) * (n - 1 - k) / 2 for k in range(n - 1)]
    t = np.diag([float(x) for x in d]) + np.diag([float(x) for x in e], 1) + np.diag([float(x) for x in e], -1)
    start = np.linalg.eigvalsh(t)[::-1]
    sinc = [2 * w] + [mp.sin(2 * mp.pi * w * m) / (mp.pi * m) for m in range(1, n)]
    out = []
    for j in range(count):
        lam = mp.mpf(start[j])
        x = [mp.mpf(1 + (k * 7919 % 13)) for k in range(n)]
        for it in range(8):
            # elimination without pivoting is safe here: 60 digits
            p = [d[0] - lam]
            y = list(x)
            for k in range(1, n):
                m = e[k - 1] / p[k - 1]
                p.append(d[k] - lam - m * e[k - 1])
                y[k] -= m * y[k - 1]
            z = [mp.mpf(0)] * n
            z[n - 1] = y[n - 1] / p[n - 1]
            for k in range(n - 2, -1, -1):
                z[k] = (y[k] - e[k] * z[k + 1]) / p[k]
            s = mp.sqrt(sum(v * v for v in z))
            x = [v / s for v in z]
            if it < 5:
                r = sum(d[k] * x[k] ** 2 for k in range(n)) + 2 * sum(e[k] * x[k] * x[k + 1] for k in range(n - 1))
                # one unit of the 50th digit away: the matrix must not become singular
                lam = r * (1 + mp.mpf(10) ** -50)
        a = [sum(x[k] * x[k + m] for k in range(n - m)) for m in range(n)]
        q = sinc[0] * a[0] + 2 * sum(sinc[m] * a[m] for m in range(1, n))
        out.append(mp.nstr(1 - q / a[0], 20))
    return dict(n=n, w=float(w), outside=out)


def turn(angle, phase, eps, f):
    """Rotation for the time angle (Rabi rate 1) with amplitude 1+eps and detuning f."""
    x, y, z = (1 + eps) * mp.cos(phase), (1 + eps) * mp.sin(phase), f
    r = mp.sqrt(x * x + y * y + z * z)
    c, s = mp.cos(angle * r / 2), mp.sin(angle * r / 2) / r
    return mp.matrix([[c - 1j * s * z, -1j * s * (x - 1j * y)], [-1j * s * (x + 1j * y), c + 1j * s * z]])


def infidelity(seq, theta, eps, f):
    u = mp.eye(2)
    for angle, phase in seq:
        u = turn(angle, phase, eps, f) * u
    m = turn(theta, 0, 0, 0).H * u
    tr = abs(m[0, 0] + m[1, 1]) ** 2
    return 1 - (2 + tr) / 6


def leading(g):
    """Order and coefficient of the leading power of g at 0."""
    h = mp.mpf(10) ** -8
    order = int(mp.nint(mp.log(g(2 * h) / g(h), 2)))
    return order, mp.nstr(g(h) / h ** order, 8)


pi = mp.pi


def corpse(t, n1):
    k = mp.asin(mp.sin(t / 2) / 2)
    return [(2 * pi * n1 + t / 2 - k, 0), (2 * pi - 2 * k, pi), (t / 2 - k, 0)]


def scrofulous(t):
    t1 = pi if t == pi else mp.findroot(lambda x: mp.sin(x) / x - 2 * mp.cos(t / 2) / pi, (pi / 2 + 0.001, pi), solver="anderson")
    p1 = mp.acos(-pi * mp.cos(t1) / (2 * t1 * mp.sin(t / 2)))
    p2 = p1 - mp.acos(-pi / (2 * t1))
    return [(t1, p1), (pi, p2), (t1, p1)]


def bb1(t):
    p = mp.acos(-t / (4 * pi))
    return [(pi, p), (2 * pi, 3 * p), (pi, p), (t, 0)]


def knill(t):
    return [(pi, p * pi / 6 - 5 * pi / 6) for p in (1, 0, 3, 0, 1)]


def composite():
    out = []
    for deg in (180, 90, 45, 120):
        t = pi * deg / 180
        todo = [("CORPSE", corpse(t, 1)), ("short CORPSE", corpse(t, 0)), ("SCROFULOUS", scrofulous(t)), ("BB1", bb1(t))]
        if deg == 180:
            todo.append(("Knill", knill(t)))
        for name, seq in todo:
            ao, ac = leading(lambda h: infidelity(seq, t, h, 0))
            do, dc = leading(lambda h: infidelity(seq, t, 0, h))
            out.append(dict(name=name, degrees=deg,
                            segments=[[float(a), float(p)] for a, p in seq],
                            amplitude_order=ao, amplitude=float(ac), detuning_order=do, detuning=float(dc)))
    return out


print(json.dumps(dict(
    made_with="scipy %s, mpmath %s, numpy %s" % (scipy.__version__, mp.__version__, np.__version__),
    sequences=[sequences(60, 6, 11), sequences(64, 4, 8), sequences(65, 20, 40), sequences(33, 15.5, 31)],
    concentration=[concentration(64, 4, 8), concentration(16, 2, 8), concentration(60, 6, 12), concentration(33, 15.5, 33)],
    composite=composite(),
), indent=0))
