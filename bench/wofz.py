#!/usr/bin/env python3
"""Time of the Voigt function a point, beside scipy.special.wofz.

Run from the repository root, pinned to one core:

    taskset -c 0 /usr/bin/python3 bench/wofz.py [runs]

It builds the Go benchmarks of ./voigt once, then alternates with SciPy region by
region, so that both see the same machine. Both sides report their shortest pass
over 4096 points (0.1 to 0.6 ms, short enough to fall between other work); printed
are the medians of that over the runs and of the paired ratios SciPy / Go, with
the range. wofz works on numpy arrays of complex numbers, as it is used in practice;
both sides draw u uniformly below the same |u|.
"""
import os
import re
import statistics
import subprocess
import sys
import tempfile
import time

import numpy as np
from scipy.special import wofz

# name, a, largest |u|: keep equal to regions in voigt/bench_test.go
REGIONS = [
    ("core", 1e-2, 5), ("mid", 1e-3, 20), ("wing", 1e-4, 1000), ("a=0.0156", 1 / 64, 8),
    ("a=0.05", 0.05, 8), ("a=0.125", 1 / 8, 8),
    ("a=0.3", 0.3, 8), ("a=1.0", 1, 8), ("a=3", 3, 8), ("a=6", 6, 6), ("a=10", 10, 20),
]


def scipy_ns(z, seconds=0.1):
    """Shortest time of wofz a point during this many seconds, in ns."""
    wofz(z)
    best, end = 1e9, time.perf_counter() + seconds
    while time.perf_counter() < end:
        start = time.perf_counter()
        wofz(z)
        best = min(best, time.perf_counter() - start)
    return best / z.size * 1e9


def go_ns(binary, bench, name):
    env = dict(os.environ, GOMAXPROCS="1")
    pattern = "^Benchmark%s$/^%s$" % (bench, name)
    out = subprocess.run([binary, "-test.run", "^$", "-test.bench", pattern, "-test.benchtime", "100ms"],
                         capture_output=True, text=True, check=True, env=env).stdout
    return float(re.search(r"([\d.]+) best-ns/point", out).group(1))


def main():
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 5
    rng = np.random.default_rng(1)
    with tempfile.TemporaryDirectory() as folder:
        binary = os.path.join(folder, "voigt.test")
        subprocess.run(["go", "test", "-c", "-o", binary, "./voigt"], check=True)
        print("ns a point, median of the shortest passes of %d alternating runs; ratio SciPy / Go (range)" % runs)
        print("%-8s %20s  %24s  %24s" % ("", "wofz random ascending", "H, random", "Fill, ascending"))
        for name, a, top in REGIONS:
            u = rng.uniform(-top, top, 4096)
            cols = {"r": [], "s": [], "h": [], "f": [], "hr": [], "fr": []}
            for _ in range(runs):
                r = scipy_ns(u + 1j * a)
                h = go_ns(binary, "H", name)
                s = scipy_ns(np.sort(u) + 1j * a)
                f = go_ns(binary, "Fill", name)
                for key, x in zip(("r", "s", "h", "f", "hr", "fr"), (r, s, h, f, r / h, s / f)):
                    cols[key].append(x)
            m = {k: statistics.median(v) for k, v in cols.items()}
            print("%-8s %10.0f %10.0f  %10.1f  %4.1f (%.1f-%.1f)  %10.1f  %4.1f (%.1f-%.1f)" % (
                name, m["r"], m["s"], m["h"], m["hr"], min(cols["hr"]), max(cols["hr"]),
                m["f"], m["fr"], min(cols["fr"]), max(cols["fr"])))


if __name__ == "__main__":
    main()
