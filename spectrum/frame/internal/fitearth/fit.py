#!/usr/bin/env python3
"""Fits the Earth's velocity by short trigonometric series and writes earth_terms.go.

Run from spectrum/frame (takes about five minutes; needs numpy and pyerfa, which
Debian's python3-astropy brings):

    /usr/bin/python3 internal/fitearth/fit.py > earth_terms.go

Reference: erfa.epv00 (ERFA/SOFA; heliocentric and barycentric Earth after the planetary theory
VSOP2000 of Moisan and Bretagnon, made to follow the ephemeris DE405 within a few mm/s). It is
called for its values; none of its code or coefficients is used.

Model: in the ecliptic of J2000 (obliquity 84381.406 arcsec) a velocity is a sum of terms

    (a + i b) T^p exp(i w t),    t in days from J2000 (TDB), T = t/36525,

of which the complex sum is vx + i vy, and for the third component the real part is vz.
The terms at multiples of the mean motion of the Earth are set beforehand, with T^p for the slow
changes of the orbit; all others are found one after the other at the highest peak of
the periodogram of what is left, after which all amplitudes and all found frequencies are fitted
together by least squares. A frequency so found need not be that of one planetary argument:
arguments closer than one cycle in the span are one term here. Do not use the series outside it.
"""
import sys

import erfa
import numpy as np

FROM, TO = 1945.0, 2066.0  # fitted; the program promises 1950 to 2061
STEP = 2.0                 # days
AU_PER_DAY = 149597870.7 / 86400  # in km/s
YEAR = 2 * np.pi / 365.256363     # mean motion of the Earth, rad/day


def velocities(t):
    """Heliocentric Earth and barycentric Sun, km/s, ecliptic of J2000: two arrays of 3 rows."""
    helio, bary = erfa.epv00(2451545.0, t)
    eps = np.radians(84381.406 / 3600)
    c, s = np.cos(eps), np.sin(eps)
    turn = np.array([[1, 0, 0], [0, c, s], [0, -s, c]]) * AU_PER_DAY
    return turn @ helio["v"].T, turn @ (bary["v"] - helio["v"]).T


def columns(t, w, p, complex_):
    """The functions that amplitudes a and b multiply, real parts above imaginary parts."""
    e = np.exp(1j * np.outer(t, w)) * (t[:, None] / 36525) ** p
    if complex_:
        return np.block([[e.real, -e.imag], [e.imag, e.real]])
    return np.hstack([e.real, -e.imag])


def solve(m, y):
    """Least squares by the normal equations of scaled columns, refined once."""
    scale = np.linalg.norm(m, axis=0)
    scale[scale == 0] = 1
    m = m / scale
    normal = m.T @ m + 1e-13 * np.eye(m.shape[1])
    x = np.linalg.solve(normal, m.T @ y)
    x += np.linalg.solve(normal, m.T @ (y - m @ x))
    return x / scale


def fit(name, t, v, seeds, count):
    complex_ = np.iscomplexobj(v)
    y = np.concatenate([v.real, v.imag]) if complex_ else v
    w = np.array([f for f, _ in seeds])
    p = np.array([q for _, q in seeds])
    m = columns(t, w, p, complex_)
    x = solve(m, y)
    r = y - m @ x
    window = np.hanning(len(t))
    bin_ = 2 * np.pi / (t[-1] - t[0])
    while len(w) < count:
        left = r[:len(t)] + 1j * r[len(t):] if complex_ else r
        power = np.abs(np.fft.fft(left * window, 8 * len(t)))
        freq = np.fft.fftfreq(8 * len(t), STEP) * 2 * np.pi
        if not complex_:
            power[freq < 0] = 0
        top, new = power.max(), []
        while len(w) + len(new) < count and len(new) < 6:
            i = int(np.argmax(power))
            if power[i] < 0.5 * top:
                break
            new.append(freq[i])
            power[np.abs(freq - freq[i]) < 4 * bin_] = 0
        w, p = np.append(w, new), np.append(p, np.zeros(len(new), int))
        free = np.arange(len(w)) >= len(seeds)
        m = columns(t, w, p, complex_)
        x = solve(m, y)
        r = y - m @ x
        for _ in range(6 if len(w) == count else 2):  # Gauss–Newton on the frequencies
            n = len(w)
            amp = x[:n] + 1j * x[n:]
            d = 1j * t[:, None] * np.exp(1j * np.outer(t, w[free])) * amp[free]
            d = np.vstack([d.real, d.imag]) if complex_ else d.real
            step = solve(np.hstack([m, d]), y)[2 * n:]
            for shrink in (1, 0.3, 0.1, 0.03):
                w2 = w.copy()
                w2[free] += shrink * np.clip(step, -bin_ / 4, bin_ / 4)
                m2 = columns(t, w2, p, complex_)
                x2 = solve(m2, y)
                r2 = y - m2 @ x2
                if r2 @ r2 < r @ r:
                    w, m, x, r = w2, m2, x2, r2
                    break
            else:
                break
    print("%s: %d terms, rms %.5f m/s" % (name, len(w), 1e3 * np.sqrt(r @ r / len(t))), file=sys.stderr)
    n = len(w)
    order = np.argsort(-np.hypot(x[:n], x[n:]), kind="stable")
    return [(round(w[i], 12), int(p[i]), round(x[i], 8), round(x[n + i], 8)) for i in order]


def value(terms, t):
    return sum((a + 1j * b) * (t / 36525) ** p * np.exp(1j * w * t) for w, p, a, b in terms)


def main():
    t = np.arange((FROM - 2000) * 365.25, (TO - 2000) * 365.25, STEP)
    earth, sun = velocities(t)
    orbit = [(k * YEAR, q) for k in (1, 2, 0) for q in (0, 1, 2)] + [(k * YEAR, q) for k in (3, -1) for q in (0, 1)]
    series = [
        ("earthPlane", "the Earth relative to the Sun: vx + i vy", fit("earthPlane", t, earth[0] + 1j * earth[1], orbit, 200)),
        ("earthPole", "the Earth relative to the Sun: vz", fit("earthPole", t, earth[2], [(YEAR, 0), (YEAR, 1)], 20)),
        ("sunPlane", "the Sun relative to the barycentre: vx + i vy", fit("sunPlane", t, sun[0] + 1j * sun[1], [(0, 0), (0, 1)], 24)),
        ("sunPole", "the Sun relative to the barycentre: vz", fit("sunPole", t, sun[2], [(0, 0), (0, 1)], 8)),
    ]
    # Judged by the rounded terms, at dates that were not fitted.
    t = np.arange((1950 - 2000) * 365.25, (2061 - 2000) * 365.25, 0.37)
    earth, sun = velocities(t)
    s = [value(x[2], t) for x in series]
    he = np.array([s[0].real - earth[0], s[0].imag - earth[1], s[1].real - earth[2]])
    su = np.array([s[2].real - sun[0], s[2].imag - sun[1], s[3].real - sun[2]])
    worst = {}
    for label, d in (("heliocentric", he), ("barycentric", he + su)):
        size = 1e3 * np.sqrt((d ** 2).sum(0))
        worst[label] = "%s %.3f m/s at most, rms %.4f" % (label, size.max(), np.sqrt((size ** 2).mean()))
    print(worst, file=sys.stderr)
    print("// Code generated by internal/fitearth/fit.py (erfa.epv00 fitted over %g to %g); DO NOT EDIT." % (FROM, TO))
    print("// Difference from the reference, 1950 to 2061, length of the vector:")
    print("// %s; %s.\n" % (worst["heliocentric"], worst["barycentric"]))
    print("package frame\n")
    print("// A term is (re + i im) Tᵖ exp(i w t): km/s, w in rad/day, t in days (TDB) from J2000, T = t/36525.")
    print("type term struct {\n\tw      float64\n\tp      int\n\tre, im float64\n}\n")
    for k, (name, what, terms) in enumerate(series):
        print("// %s is %s, ecliptic of J2000." % (name, what))
        print("var %s = [...]term{" % name)
        for w, p, a, b in terms:
            print("\t{%s, %d, %s, %s}," % (repr(float(w)), p, repr(float(a) + 0.0), repr(float(b) + 0.0)))
        print("}" if k == len(series) - 1 else "}\n")


if __name__ == "__main__":
    main()
