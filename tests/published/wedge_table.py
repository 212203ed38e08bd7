# SPDX-License-Identifier: GPL-3.0-or-later
"""Reference wedges of Gaussian noise, by mpmath at 40 digits.

    python3 wedge_table.py > wedge_table.csv

Each line: kind, h, x1, x2 and W = (1/2pi) exp(-h^2/2) * integral of exp(-x^2/2) h/(h^2 + x^2) from x1 to x2.
The inputs are doubles printed so that they read back exactly. The integral is taken piecewise between the points
where the integrand changes scale, by mpmath's Gauss-Legendre rule with its own error estimate, which must be
below 1e-25.
"""

import random

import mpmath as mp

mp.mp.dps = 40
SMALLEST = mp.mpf("1e-300")


def side(h, a, b):
    """Integral over 0 <= a < b, less exp(-(h^2 + a^2)/2), with the 1/(2 pi) and the factor h."""
    decay = 1 / (a + 1)
    scale = min(decay, mp.sqrt(h * h + a * a))
    places = [mp.mpf(0)]
    step = scale
    reach = min(b - a, 160 / (a + mp.sqrt(a * a + 160)) + 0)
    while places[-1] + step < reach:
        places.append(places[-1] + step)
        step *= 2 if step < decay else 1
    places.append(reach)
    value, error = mp.quad(
        lambda u: mp.exp(-u * (a + u / 2)) * h / (h * h + (a + u) ** 2),
        places, method="gauss-legendre", error=True)
    assert error < 1e-25 * value, (h, a, b, error)
    return value / (2 * mp.pi)


def wedge(h, x1, x2):
    h, x1, x2 = mp.mpf(h), mp.mpf(x1), mp.mpf(x2)
    if x1 >= 0 or x2 <= 0:
        a, b = (x1, x2) if x1 >= 0 else (-x2, -x1)
        return mp.exp(-(h * h + a * a) / 2) * side(h, a, b)
    return mp.exp(-h * h / 2) * (side(h, mp.mpf(0), -x1) + side(h, mp.mpf(0), x2))


def log_uniform(draw, low, high):
    return 10 ** draw.uniform(low, high)


def case(kind, draw):
    h = draw.uniform(0.001, 37) if draw.random() < 0.6 else log_uniform(draw, -3, 1.5)
    inf = float("inf")
    if kind == "infinite":
        return h, -inf, inf
    if kind == "half":
        return (h, draw.uniform(-8, 20), inf) if draw.random() < 0.5 else (h, -inf, draw.uniform(-20, 8))
    if kind == "straddling":
        return h, -log_uniform(draw, -4, 1.3), log_uniform(draw, -4, 1.3)
    if kind == "grazing":  # the mean almost on the line
        h = log_uniform(draw, -9, -1)
        x1 = draw.uniform(-3, 30)
        return h, x1, x1 + log_uniform(draw, -4, 1)
    if kind == "short":
        x1 = draw.uniform(-30, 30)
        return h, x1, x1 + log_uniform(draw, -9, -2)
    x1 = draw.uniform(-35, 35)  # "any"
    return h, x1, x1 + draw.uniform(0, 40)


def main():
    draw = random.Random(1991)
    print("kind,h,x1,x2,w")
    for kind, count in [("infinite", 200), ("half", 400), ("straddling", 500), ("grazing", 400), ("short", 300),
                        ("any", 600)]:
        done = 0
        while done < count:
            h, x1, x2 = case(kind, draw)
            if not x1 < x2:
                continue
            w = wedge(h, x1, x2)
            if w < SMALLEST:
                continue
            print(f"{kind},{h!r},{x1!r},{x2!r},{mp.nstr(w, 20, min_fixed=0, max_fixed=0)}", flush=True)
            done += 1


if __name__ == "__main__":
    main()
