# SPDX-License-Identifier: GPL-3.0-or-later
"""MAP decisions under fading: integrated.py's plane, averaged over the fade by SciPy's adaptive quadrature.

    python3 map_fading.py > map_fading.json

The gain is known to the detector, so at each gain the decisions are MAP at that gain's Es/N0. Densities of the power gain
(mean 1), Simon and Alouini, Digital Communication over Fading Channels, 2nd ed. 2005, table 2.2, by scipy.stats: gamma with
shape m (Nakagami; Rayleigh is m = 1), and a scaled noncentral chi square with two degrees of freedom (Rice). The variable is
ln G; the quadrature is asked for 1e-11 and its own estimate of the error stands beside each number.
"""

import json

import numpy as np
from integrated import case
from scipy.integrate import quad
from scipy.stats import gamma, ncx2


def density(law):
    name, *numbers = law.split(":")
    if name == "rician":
        k = 10 ** (float(numbers[0]) / 10)
        return lambda g: ncx2.pdf(2 * (1 + k) * g, 2, 2 * k) * 2 * (1 + k)
    m = float(numbers[0]) if numbers else 1.0
    return lambda g: gamma.pdf(g, m, scale=1 / m)


def averaged(name, points, labels, bits, db, priors, law):
    of_gain = density(law)
    known = {}

    def at(t, which):
        if t not in known:
            known[t] = case(name, points, labels, bits, db + 10 * t / np.log(10), priors, "map")
        return known[t][which] * of_gain(np.exp(t)) * np.exp(t)

    out = {}
    # Below e^-30 the gain has no probability left that counts, above e^5 none either; the middle, where cells come and go
    # and the integrand bends, is cut into pieces.
    cuts = np.array([-30, -14, -8, -5, -3, -2, -1, 0, 1, 2, 3.5, 5])
    for which in ("ser", "ber"):
        parts = [quad(at, a, b, args=(which,), epsabs=1e-14, epsrel=1e-11, limit=60) for a, b in zip(cuts, cuts[1:])]
        out[which] = sum(value for value, _ in parts)
        out[which + "_error"] = sum(error for _, error in parts)
    return {"name": name, "i": [z.real for z in points], "q": [z.imag for z in points], "labels": [int(x) for x in labels],
            "label_bits": bits, "priors": list(priors), "law": law, "es_n0_db": db, **out}


def main():
    four = np.array([-1 + 0.2j, 1j, 1 + 0j, 0.3 - 1.4j])
    draw = np.random.default_rng(7)
    eight = draw.normal(size=8) + 1j * draw.normal(size=8)
    out = []
    for law in ("rayleigh", "rician:5", "nakagami:2.5"):
        for db in (4.0, 15.0):
            out.append(averaged("four", four, [0, 1, 3, 2], 2, db, [0.1, 0.2, 0.3, 0.4], law))
    out.append(averaged("eight", eight, np.arange(8), 3, 12.0, [0.3, 0.2, 0.15, 0.1, 0.1, 0.07, 0.05, 0.03], "rayleigh"))
    print("[\n" + ",\n".join(json.dumps(c) for c in out) + "\n]")


if __name__ == "__main__":
    main()
