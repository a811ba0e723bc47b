"""The work of benches/quantity.rs done by two general-purpose Python libraries, for comparison.

Usage: peers.py ITERATIONS REPEATS. Prints one line per row, `NAME SECONDS RESULT`, the time being the best of the
repeats: the loop `s = s + a * 2`, an addition and a multiplication alone. Reading the standard uncertainty of the last
value is part of the time, since a lazy sum would otherwise be measured half done.
"""
import sys
import time

import pint
from uncertainties import ufloat

VALUE, U = 12.34, 0.05


def best(repeats, work):
    """Seconds of the fastest run, and what the work gave."""
    times, result = [], None
    for _ in range(repeats):
        start = time.perf_counter()
        result = work()
        times.append(time.perf_counter() - start)
    return min(times), result


def loop(a, s, n):
    for _ in range(n):
        s = s + a * 2
    return s


def add(a, s, n):
    for _ in range(n):
        s = s + a
    return s


def multiply(a, b, n):
    for _ in range(n):
        product = a * b
    return product


def main():
    n, repeats = int(sys.argv[1]), int(sys.argv[2])
    units = pint.UnitRegistry()

    def with_units(value, u, unit):
        return units.Quantity(ufloat(value, u), unit)

    peers = {
        "uncertainties": (lambda value, u, unit: ufloat(value, u), lambda x: x.std_dev),
        "pint": (with_units, lambda x: x.magnitude.std_dev),
    }
    for name, (make, spread) in peers.items():
        a, s, b = make(VALUE, U, "kJ/mol"), make(0.0, 0.1, "kJ/mol"), make(2.5, 0.01, "mol")
        rows = {
            "loop": lambda: spread(loop(a, s, n)),
            "add": lambda: spread(add(a, s, n)),
            "multiply": lambda: spread(multiply(a, b, n)),
        }
        for row, work in rows.items():
            seconds, result = best(repeats, work)
            print(f"{name}-{row} {seconds:.6e} {result!r}")


if __name__ == "__main__":
    main()
