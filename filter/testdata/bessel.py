# Writes bessel.txt: for orders 1 to 8, the -3.0103 dB frequency of
# theta_n(0)/theta_n(iw), and the poles scaled so that it is one.
# python3 bessel.py > bessel.txt      (made with mpmath 1.3.0, Python 3.11)
from mpmath import mp, mpf, mpc, polyroots, findroot, factorial, nstr, sqrt
mp.dps = 40
print("# order kind real imaginary; corner: frequency in the real column. mpmath 1.3.0, 40 digits")
for n in range(1, 9):
    a = [factorial(2*n-k)/(2**(n-k)*factorial(k)*factorial(n-k)) for k in range(n+1)]
    theta = lambda s: sum(c*s**k for k, c in enumerate(a))
    w = findroot(lambda w: abs(theta(mpc(0, w)))**2/a[0]**2 - 2, sqrt((2*n-1)*mp.log(2)))
    print(n, "corner", nstr(w, 25), 0)
    for p in sorted(polyroots(a[::-1], maxsteps=500, extraprec=400), key=lambda p: (p.real, p.imag)):
        p = p/w
        print(n, "pole", nstr(p.real, 25), nstr(p.imag, 25) if abs(p.imag) > mpf(10)**-30 else 0)
