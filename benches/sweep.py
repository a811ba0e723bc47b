"""The reaction enthalpy of benches/sweep.rs at many temperatures, by numpy on the same polynomials, for comparison.

Usage: sweep.py REPEATS, with a description on standard input: the grid, and of each species its stoichiometric number,
formation enthalpy, H(298.15 K) and intervals with their constants. Prints the seconds of the fastest run and the sum of
the values. The code is what one writes for whole arrays: ln T and 1/T once, each interval a slice of the sorted grid, and
no loop over temperatures.
"""
import json
import sys
import time

import numpy


def enthalpy(t, species):
    ln_t, inverse = numpy.log(t), 1.0 / t
    total = numpy.zeros_like(t)
    for one in species:
        intervals = one["intervals"]
        ends = numpy.searchsorted(t, [interval["t_max"] for interval in intervals[:-1]], side="right")
        bounds = [0, *ends, len(t)]
        for interval, low, high in zip(intervals, bounds, bounds[1:]):
            if low == high:
                continue
            a, b = interval["a"], interval["b"]
            x, part = t[low:high], slice(low, high)
            powers = a[2] + x * (a[3] / 2 + x * (a[4] / 3 + x * (a[5] / 4 + x * (a[6] / 5))))
            h = -a[0] * inverse[part] + a[1] * ln_t[part] + x * powers + b[0]
            total[part] += one["nu"] * (one["formation"] + (one["r"] * h - one["h_298"]))
    return total


def main():
    repeats = int(sys.argv[1])
    given = json.load(sys.stdin)
    t = numpy.linspace(given["from"], given["to"], given["points"])
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        total = enthalpy(t, given["species"])
        times.append(time.perf_counter() - start)
    print(f"{min(times):.6e} {float(total.sum())!r} {numpy.__version__}")


if __name__ == "__main__":
    main()
