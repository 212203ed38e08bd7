# SPDX-License-Identifier: GPL-3.0-or-later
"""The Cramér–Rao bound of Es/N0 where nobody knows what was sent, by integration over the plane.

    python3 blind_bound.py > blind_bound.json

The density of one sample is a mixture, f(r) = sum of p_i exp(-|r - g s_i - o|^2 / N0) / (pi N0). Its Fisher information about
(Re g, Im g, Re o, Im o, ln N0) is the integral of (d ln f)(d ln f)^T f (Kay, Fundamentals of Statistical Signal Processing:
Estimation Theory, 1993, section 3.7, from memory), here by the trapezoidal rule on a grid of sigma/4, which converges faster than any
power for such integrands; the derivatives are central differences of ln f, so no formula of the module stands here. `se_db` is
the bound on the standard deviation of 10 log10(|g|^2 Es / N0) for one sample; divide by the root of their number. `ser` is
that of nearest-point decisions, by the same grid.
"""

import json

import numpy as np


def log_density(r, points, priors, theta):
    g, o, n0 = theta[0] + 1j * theta[1], theta[2] + 1j * theta[3], np.exp(theta[4])
    terms = np.log(priors)[:, None, None] - np.abs(r[None] - (g * points + o)[:, None, None]) ** 2 / n0
    most = terms.max(axis=0)
    return most + np.log(np.exp(terms - most).sum(axis=0)) - np.log(np.pi * n0)


def case(name, points, priors, db):
    points, priors = np.asarray(points, complex), np.asarray(priors, float)
    es = np.sum(priors * np.abs(points) ** 2)
    n0 = es / 10 ** (db / 10)
    sigma = np.sqrt(n0 / 2)
    step = sigma / 4
    x = np.arange(points.real.min() - 8 * sigma, points.real.max() + 8 * sigma, step)
    y = np.arange(points.imag.min() - 8 * sigma, points.imag.max() + 8 * sigma, step)
    r = x[None, :] + 1j * y[:, None]
    theta = np.array([1, 0, 0, 0, np.log(n0)])
    weight = np.exp(log_density(r, points, priors, theta)) * step**2
    assert abs(weight.sum() - 1) < 1e-9
    scores = []
    for k in range(5):
        h = np.zeros(5)
        h[k] = 1e-5 * (np.sqrt(n0) if k < 4 else 1)
        scores.append((log_density(r, points, priors, theta + h) - log_density(r, points, priors, theta - h)) / (2 * h[k]))
    information = np.array([[np.sum(a * b * weight) for b in scores] for a in scores])
    of_ln_gamma = np.array([2, 0, 0, 0, -1])
    variance = of_ln_gamma @ np.linalg.solve(information, of_ln_gamma)
    nearest = np.argmin(np.abs(r[None] - points[:, None, None]), axis=0)
    right = sum(p * np.sum(np.exp(-np.abs(r - s) ** 2 / n0) / (np.pi * n0) * (nearest == i)) * step**2 for i, (s, p) in enumerate(zip(points, priors)))
    return {"name": name, "i": list(points.real), "q": list(points.imag), "priors": list(priors), "es_n0_db": db,
            "ser": round(1 - right, 3), "se_db": 10 / np.log(10) * np.sqrt(variance)}


def main():
    side = np.arange(-3, 4, 2)
    square = (side[None, :] + 1j * side[:, None]).ravel()
    large = (np.arange(-7, 8, 2)[None, :] + 1j * np.arange(-7, 8, 2)[:, None]).ravel()
    ring = np.exp(2j * np.pi * np.arange(8) / 8)
    # Two rings and a hole, thirteen points of unequal priors.
    odd = np.concatenate([np.exp(2j * np.pi * np.arange(5) / 5), 2.2 * np.exp(2j * np.pi * (np.arange(8) + 0.3) / 8)])
    unequal = np.concatenate([np.full(5, 0.12), np.full(8, 0.05)])
    even = lambda points: np.full(len(points), 1 / len(points))
    out = []
    for name, points, priors, dbs in (
        ("two", [1, -1], [0.5, 0.5], (-8.6, -4.0, 3.0)),
        ("on and off", [0, 1], [0.5, 0.5], (-5.6, 6.0)),
        ("ring 8", ring, even(ring), (5.9, 14.0)),
        ("square 16", square, even(square), (8.7, 14.0, 20.0)),
        ("odd 13", odd, unequal, (6.8, 15.0)),
        ("square 64", large, even(large), (15.5, 24.0)),
    ):
        for db in dbs:
            out.append(case(name, points, priors, db))
    print("[\n" + ",\n".join(json.dumps(c) for c in out) + "\n]")


if __name__ == "__main__":
    main()
