#!/usr/bin/python3
"""Reference values for the sine, cosine and spline bases and for the energy outside a band, by means
that are not those of package shape.

    /usr/bin/python3 testdata/shape/families.py > testdata/shape/families.json

Needs Debian's python3-scipy and python3-mpmath; the tests read only the output.

splines: scipy.interpolate.BSpline.design_matrix at x(k) = m (k+1)/(N+1) on the clamped knots 0 ... m, all
    m+degree splines, row by row.
shares: mean of the share of energy outside |f| <= W over normal coefficients, trace(Q'(1-K)Q)/count, with K the
    sinc kernel and Q from numpy.linalg.qr of the family's raw functions, dpss for the Slepian sequences;
    "full period" is sines of whole periods and the cosines of whole periods less the next, "skip" the number of
    splines left out at either end where it is not the package's own;
    step: the median, over 20000 draws, of the larger of first and last step over the largest sample.
forms: B'(1-K)B in 60 digits (mpmath) for columns that are written down in those digits: sines, and cosines
    tapered by sin^2 after Gram-Schmidt in those digits.
energy: x'(1-K)x in 60 digits for sequences of doubles that stand beside it.
"""
import json
import mpmath as mp
import numpy as np
import scipy
from scipy.interpolate import BSpline
from scipy.signal.windows import dpss

mp.mp.dps = 60


def design(n, m, degree):
    knots = np.r_[np.zeros(degree), np.arange(m + 1), np.full(degree, m)].astype(float)
    x = m * np.arange(1, n + 1) / (n + 1)
    return BSpline.design_matrix(x, knots, degree).toarray()


def splines(n, m, degree):
    return dict(n=n, intervals=m, degree=degree, values=[[float(v) for v in row] for row in design(n, m, degree)])


def raw(family, n, w, count):
    a = np.pi * np.arange(1, n + 1) / (n + 1)
    if family == "slepian":
        return dpss(n, n * w, count, sym=True, norm=2).T
    if family == "fourier":
        return np.array([np.sin(j * a) for j in range(1, count + 1)]).T
    if family == "tapered-fourier":
        return np.array([np.sin(a) ** 2 * np.cos(j * a) for j in range(count)]).T
    if family == "full period":
        both = [f(i) for i in range(count) for f in (lambda i: np.cos(2 * i * a) - np.cos(2 * (i + 1) * a), lambda i: np.sin(2 * (i + 1) * a))]
        return np.array(both[:count]).T
    degree = int(family.split()[1])
    skip = int(family.split()[3]) if "skip" in family else (degree + 1) // 2
    return design(n, count + 2 * skip - degree, degree)[:, skip:skip + count]


def share(family, n, w, count):
    q = np.linalg.qr(raw(family, n, w, count))[0]
    d = np.subtract.outer(np.arange(n), np.arange(n))
    outside = np.trace(q.T @ (np.eye(n) - 2 * w * np.sinc(2 * w * d)) @ q) / count
    x = q @ np.random.default_rng(1).standard_normal((count, 20000))
    step = np.median(np.maximum(abs(x[0]), abs(x[-1])) / abs(x).max(0))
    return dict(family=family, n=n, w=w, count=count, outside=float(outside), step=float(step))


def kernel(n, w):
    return [1 - 2 * w] + [-mp.sin(2 * mp.pi * w * m) / (mp.pi * m) for m in range(1, n)]


def form(columns, w):
    n = len(columns[0])
    k = kernel(n, w)
    return [[mp.fsum(k[abs(i - j)] * u[i] * v[j] for i in range(n) for j in range(n)) for v in columns] for u in columns]


def unit(v):
    s = mp.sqrt(mp.fsum(x * x for x in v))
    return [x / s for x in v]


def forms(family, n, w, count):
    a = [mp.pi * (k + 1) / (n + 1) for k in range(n)]
    columns = []
    for j in range(count):
        if family == "fourier":
            v = [mp.sin((j + 1) * t) for t in a]
        else:
            # sin^2 C_j(cos): ascending powers of the cosine, so that the sign is that of the package
            v = [mp.sin(t) ** 2 * mp.cos(t) ** j for t in a]
            for u in columns:
                dot = mp.fsum(x * y for x, y in zip(u, v))
                v = [y - dot * x for x, y in zip(u, v)]
        columns.append(unit(v))
    e = form(columns, mp.mpf(w))
    return dict(family=family, n=n, w=w, count=count, columns=[[float(x) for x in v] for v in columns],
                form=[[mp.nstr(x, 20) for x in row] for row in e])


def energy(x, w):
    e = form([[mp.mpf(float(v)) for v in x]], mp.mpf(w))[0][0]
    return dict(w=w, x=[float(v) for v in x], energy=mp.nstr(e, 20))


rng = np.random.default_rng(5)
t = np.arange(64) - 31.5
print(json.dumps(dict(
    made_with="scipy %s, mpmath %s, numpy %s" % (scipy.__version__, mp.__version__, np.__version__),
    splines=[splines(17, 5, 1), splines(20, 6, 2), splines(23, 7, 3), splines(9, 1, 3), splines(16, 9, 4), splines(31, 8, 5), splines(11, 2, 5)],
    shares=[share(f, 108, 0.1, c) for f, c in (
        ("slepian", 20), ("slepian", 19), ("slepian", 18), ("fourier", 20), ("fourier", 19), ("fourier", 18),
        ("tapered-fourier", 20), ("tapered-fourier", 19), ("tapered-fourier", 18),
        ("full period", 19), ("b-spline 3 skip 0", 20), ("b-spline 3 skip 1", 20),
        ("b-spline 1", 20), ("b-spline 2", 20), ("b-spline 3", 20), ("b-spline 3", 19), ("b-spline 3", 18), ("b-spline 4", 20), ("b-spline 5", 20))],
    forms=[forms("fourier", 24, 0.2, 6), forms("tapered-fourier", 40, 0.3, 5), forms("tapered-fourier", 9, 0.25, 9)],
    energy=[energy(rng.standard_normal(40), 0.1), energy(np.exp(-t * t / 2 / 25.0), 0.25), energy(np.exp(-t * t / 2 / 16.0), 0.45), energy([0, 0, 1, 0], 0.3)],
), indent=0))
