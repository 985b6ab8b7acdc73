# Writes step.txt: step responses of low-passes whose |G|^2 is 1/2 at 1 rad/ns,
# every 0.75 ns, from a general reference library.
# /usr/bin/python3 step.py > step.txt      (made with scipy 1.10.1, Debian python3-scipy 1.10.1-2)
import numpy as np
from scipy import signal
print("# family order t step; scipy 1.10.1: butter(n, 1, analog=True), bessel(n, 1, analog=True, norm='mag'),")
print("# high-pass butter(1, 1, 'high', analog=True), damped: n equal poles; all through signal.step")
T = 0.75*np.arange(0, 25)
def rows(name, n, zpk):
    t, y = signal.step(signal.ZerosPolesGain(*zpk), T=T)
    for a, b in zip(t, y):
        print(name, n, "%.2f" % a, "%.15f" % b)
for n in range(1, 9):
    rows("butterworth", n, signal.butter(n, 1, analog=True, output='zpk'))
for n in range(1, 9):
    rows("bessel", n, signal.bessel(n, 1, analog=True, norm='mag', output='zpk'))
for n in range(1, 9):
    rate = 1/np.sqrt(2**(1/n)-1)
    rows("damped", n, ([], [-rate]*n, rate**n))
rows("high-pass", 1, signal.butter(1, 1, 'high', analog=True, output='zpk'))
rows("allpass", 1, ([1.0], [-1.0], -1.0))
