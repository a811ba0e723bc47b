"""The sweep of benches/molecule.rs in numpy, all modes at once and mode by mode.

Usage: peers_molecule.py MODES POINTS REPEATS. Prints one line for each way, `NAME SECONDS SUM`, the time being the best of the
repeats. The values are Cp/R; hc/k is that of the SI of 2019.
"""
import sys
import time

import numpy as np

C2 = 1.4387768775039338  # K cm


def at_once(theta, t):
    x = theta[:, None] / t
    e = np.exp(-x)
    return 4.0 + (x * x * e / (1 - e) ** 2).sum(axis=0)


def mode_by_mode(theta, t):
    out, inverse = np.full_like(t, 4.0), 1 / t
    for mode in theta:
        x = mode * inverse
        e = np.exp(-x)
        r = x / (1 - e)
        out += r * r * e
    return out


def main():
    modes, points, repeats = map(int, sys.argv[1:])
    theta, t = C2 * (150.0 + 105.0 * np.arange(modes)), 200.0 + 0.028 * np.arange(points)
    for work in (at_once, mode_by_mode):
        times = []
        for _ in range(repeats):
            start = time.perf_counter()
            out = work(theta, t)
            times.append(time.perf_counter() - start)
        print(work.__name__, min(times), repr(float(out.sum())))


main()
