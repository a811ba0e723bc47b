"""Runs notebooks of ten cells, which evaluate a reaction enthalpy by its polynomials, each with a kernel of its own.

Usage: archive.py AT_A_TIME, with the temperatures, one for each notebook, and the species on standard input. Prints the
seconds for all of them, kernels started and ended, and the enthalpy that each gave; reading the client's modules is not
counted.
"""
import json
import sys
import time
from concurrent.futures import ProcessPoolExecutor

import nbformat
from nbclient import NotebookClient

CELLS = """
import math
---
species = SPECIES
---
t = TEMPERATURE
---
def interval(one):
    return next(i for i in one["intervals"] if t <= i["t_max"])
---
def h(one):
    a, b = interval(one)["a"], interval(one)["b"]
    powers = a[2] + t * (a[3] / 2 + t * (a[4] / 3 + t * (a[5] / 4 + t * a[6] / 5)))
    return one["formation"] + one["r"] * (-a[0] / t + a[1] * math.log(t) + t * powers + b[0]) - one["h_298"]
---
def s(one):
    a, b = interval(one)["a"], interval(one)["b"]
    powers = a[3] + t * (a[4] / 2 + t * (a[5] / 3 + t * a[6] / 4))
    return one["r"] * (-a[0] / t**2 / 2 - a[1] / t + a[2] * math.log(t) + t * powers + b[1])
---
dh, ds = (sum(one["nu"] * f(one) for one in species) for f in (h, s))
---
print(repr(dh))
---
print(repr(ds))
---
print(repr(dh - t * ds))
"""


def run(asked):
    t, species = asked
    cells = CELLS.replace("TEMPERATURE", repr(t)).replace("SPECIES", repr(species)).split("---\n")
    assert len(cells) == 10
    notebook = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(cell) for cell in cells])
    NotebookClient(notebook, kernel_name="python3", timeout=120).execute()
    return notebook.cells[7].outputs[0].text.strip()


def main():
    at_a_time, given = int(sys.argv[1]), json.load(sys.stdin)
    asked = [(t, given["species"]) for t in given["temperatures"]]
    with ProcessPoolExecutor(at_a_time) as pool:
        # One each, so that the processes are there and have read their modules.
        list(pool.map(run, asked[:at_a_time]))
        start = time.perf_counter()
        enthalpies = list(pool.map(run, asked))
        seconds = time.perf_counter() - start
    print(json.dumps({"seconds": seconds, "enthalpies": enthalpies}))


if __name__ == "__main__":
    main()
