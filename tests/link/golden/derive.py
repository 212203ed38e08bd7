# SPDX-License-Identifier: GPL-3.0-or-later
"""Golden reports, derived from first principles.

    /usr/bin/python3 tests/link/golden/derive.py        # rewrites clean.json, gap.json, slip.json beside it

Shares no code with the library: least squares in exact fractions, error rates by the closed forms worked out in
README.md beside, Q by mpmath, interval ends by SciPy's beta and chi-squared quantiles, the shortfall by
root finding on the closed form. Counts are written down by hand below and only compared with what the stream
gives. Needs mpmath and scipy.
"""
import hashlib
import json
import math
from fractions import Fraction
from pathlib import Path

from mpmath import erfc, log, log10, mp, mpf, sqrt
from scipy.stats import beta, chi2, norm

mp.dps = 40
VERSION = "0.1.0"
CLOCK = "2026-01-02T03:04:05Z"
DB = 10 / log(mpf(10))  # dB of a natural unit of power, 4.3429…


def q(x):
    """Gaussian tail."""
    return erfc(x / sqrt(mpf(2))) / 2


class Qpsk:
    """Points (±1, ±1), Gray labels. With q1 = Q(√γ) a coordinate crosses its axis, independently of the other."""
    name = "qpsk"
    points = [(1, 1), (-1, 1), (-1, -1), (1, -1)]
    labels = ["00", "01", "11", "10"]
    es = mpf(2)
    entropy = mpf(2)

    @staticmethod
    def decide(i, q_):
        return {(True, True): 0, (False, True): 1, (False, False): 2, (True, False): 3}[(i > 0, q_ > 0)]

    @staticmethod
    def rates(g):
        q1, q2 = q(sqrt(g)), q(sqrt(2 * g))  # PEP of an edge neighbour (d = 2) and of the diagonal (d = 2√2)
        return {"exact": (2 * q1 - q1**2, q1), "facing": (2 * q1, q1),
                "union": (2 * q1 + q2, (2 * q1 + 2 * q2) / 2), "nearest": (2 * q1, q1)}

    @staticmethod
    def transition(g, i, j):
        q1 = q(sqrt(g))
        return q1**2 if (i - j) % 4 == 2 else q1 * (1 - q1)


class Line3:
    """Points −2, 0, 2 on the real axis, natural labels. a = 1/σ = √(2/N0), Es = 8/3, so a = √(3γ/4)."""
    name = "line-3"
    points = [(-2, 0), (0, 0), (2, 0)]
    labels = ["00", "01", "10"]
    es = mpf(8) / 3
    entropy = log(mpf(3), 2)

    @staticmethod
    def decide(i, _q):
        return 0 if i < -1 else (1 if i < 1 else 2)

    @staticmethod
    def rates(g):
        a = sqrt(3 * g / 4)
        q1, q2, q3 = q(a), q(2 * a), q(3 * a)
        # Label distances: 00–01 one bit, 01–10 two bits, 00–10 one bit; b = 2 bits a symbol.
        # Sent 0: lands in 1 with q1 − q3 (1 bit), in 2 with q3 (1 bit). Sent 1: in 0 q1 (1), in 2 q1 (2).
        # Sent 2: in 1 with q1 − q3 (2 bits), in 0 with q3 (1 bit).
        bits = (q1 - q3) + q3 + q1 + 2 * q1 + 2 * (q1 - q3) + q3
        near = (4 * q1 / 3, (q1 + q1 + 2 * q1 + 2 * q1) / 3 / 2)
        return {"exact": (4 * q1 / 3, bits / 3 / 2), "facing": near,
                "union": ((4 * q1 + 2 * q2) / 3, (6 * q1 + 2 * q2) / 3 / 2), "nearest": near}

    @staticmethod
    def transition(g, i, j):
        a = sqrt(3 * g / 4)
        if i == 1:
            return q(a)
        return q(3 * a) if abs(i - j) == 2 else q(a) - q(3 * a)


def sha256_of_settings(case):
    s = case["set"]
    settings = {"confidence": case["confidence"], "decisions": "own", "detector": "ml", "labels": s.labels, "law": "awgn",
                "pattern": case["pattern"], "points": [[float(a), float(b)] for a, b in s.points], "set": s.name,
                "window": case["window"]}
    if case.get("symbol_rate"):
        settings["symbol_rate"] = float(case["symbol_rate"])
    settings |= {"frame_symbols": case["frame"], "target": case["target"], "max_excluded": MAX_EXCLUDED}
    if case.get("dependence"):
        settings["dependence"] = case["dependence"]
    return hashlib.sha256(json.dumps(settings, sort_keys=True, separators=(",", ":")).encode()).hexdigest()


class Sums:
    """Judged symbols of a stretch as a list; everything is recomputed from the list."""

    def __init__(self, s, judged):
        self.s, self.judged = s, judged
        self.n = len(judged)
        self.errors = [(sent, got) for _, sent, got in judged if sent != got]
        self.h = [sum(x != y for x, y in zip(s.labels[a], s.labels[b])) for a, b in self.errors]

    def fit(self):
        """Least squares r = g·s + o + e in exact complex fractions; None where it says nothing."""
        n, s = self.n, self.s
        if n < 3:
            return None
        rows = [((Fraction(r[0]), Fraction(r[1])), tuple(map(Fraction, s.points[sent])), sent != got)
                for r, sent, got in self.judged]
        mean = lambda k: (sum(row[k][0] for row in rows) / n, sum(row[k][1] for row in rows) / n)
        mr, ms = mean(0), mean(1)
        rs_re = sum((r[0] - mr[0]) * (p[0] - ms[0]) + (r[1] - mr[1]) * (p[1] - ms[1]) for r, p, _ in rows)
        rs_im = sum((r[1] - mr[1]) * (p[0] - ms[0]) - (r[0] - mr[0]) * (p[1] - ms[1]) for r, p, _ in rows)
        ss = sum((p[0] - ms[0])**2 + (p[1] - ms[1])**2 for _, p, _ in rows)
        if ss == 0:
            return None
        g = (rs_re / ss, rs_im / ss)
        o = (mr[0] - (g[0] * ms[0] - g[1] * ms[1]), mr[1] - (g[0] * ms[1] + g[1] * ms[0]))
        g2 = g[0]**2 + g[1]**2
        residual, influence, power = Fraction(0), Fraction(0), Fraction(0)
        kept = []
        for r, p, wrong in rows:
            e = (r[0] - g[0] * p[0] + g[1] * p[1] - o[0], r[1] - g[0] * p[1] - g[1] * p[0] - o[1])
            residual += e[0]**2 + e[1]**2
            power += g2 * (p[0]**2 + p[1]**2)
            kept.append((e, p, wrong))
        n0 = residual / (n - 2)
        # Influence of one symbol on ln γ, γ = |g|²Es/N0: 2·Re[e·(s − s̄)*/(g·Q)] − (|e|²/N0 − 1), Q the mean |s − s̄|².
        for e, p, wrong in kept:
            if wrong:
                d = (p[0] - ms[0], p[1] - ms[1])
                ed = (e[0] * d[0] + e[1] * d[1], e[1] * d[0] - e[0] * d[1])
                influence += 2 * (ed[0] * g[0] + ed[1] * g[1]) / g2 / (ss / n) - ((e[0]**2 + e[1]**2) / n0 - 1)
        m = lambda f: mpf(f.numerator) / f.denominator
        snr = m(g2) * s.es / m(n0)
        return {"snr": snr, "g": (m(g[0]), m(g[1])), "g2": m(g2), "o2": m(o[0]**2 + o[1]**2),
                "variance": DB**2 * (1 + 2 / snr) / n, "evm": sqrt(m(residual) / m(power)), "influence": m(influence)}


def binomial(k, n, conf):
    if k == 0:
        return None, beta.ppf(conf, 1, n)
    low = beta.ppf((1 - conf) / 2, k, n - k + 1)
    high = beta.ppf((1 + conf) / 2, k + 1, n - k) if k < n else 1.0
    return low, high


def clumped(k, n, d, conf):
    d = max(d, 1.0)
    c = k / d
    if k == 0:
        return None, min(1.0, d * chi2.ppf(conf, 2) / 2 / n)
    return d * chi2.ppf((1 - conf) / 2, 2 * c) / 2 / n, min(1.0, d * chi2.ppf((1 + conf) / 2, 2 * c + 2) / 2 / n)


def counts(sums, conf):
    n, b = sums.n, len(sums.s.labels[0])
    out = {"symbols": n, "symbol_errors": len(sums.errors), "bits": n * b, "bit_errors": sum(sums.h)}
    if n:
        for name, k, trials, ends in (
                ("ser", len(sums.errors), n, binomial(len(sums.errors), n, conf)),
                ("ber", sum(sums.h), n * b,
                 clumped(sum(sums.h), n * b, sum(x * x for x in sums.h) / sum(sums.h) if sums.h else 1, conf))):
            out[name] = k / trials
            if ends[0] is not None:
                out[name + "_low"] = ends[0]
            out[name + "_high"] = ends[1]
    fit = sums.fit()
    if fit:
        snr = fit["snr"]
        out |= {"es_n0_db": 10 * log10(snr), "es_n0_db_se": sqrt(fit["variance"]),
                "eb_n0_db": 10 * log10(snr / sums.s.entropy), "gain_db": 10 * log10(fit["g2"]),
                "phase_deg": mpf(math.degrees(math.atan2(fit["g"][1], fit["g"][0]))), "evm_rms": fit["evm"],
                "mer_db": -20 * log10(fit["evm"])}
        if fit["o2"]:
            out["offset_db"] = 10 * log10(fit["o2"] / (fit["g2"] * sums.s.es))
    return out


MAX_EXCLUDED = 0.001
CAUSES = ["before_lock", "slip", "signal_lost", "overflow", "nonfinite"]


def frames(rows, length, begin, end, conf):
    """
    Frames that end behind place `begin` and not behind `end`; rows are None before the first judged symbol, True or False
    (in error or not) where judged, else the cause.
    """
    first = next((k for k, row in enumerate(rows) if isinstance(row, bool)), len(rows))
    n = errors = 0
    excluded = dict.fromkeys(CAUSES, 0)
    for k in range(first, end - length + 1, length):
        if k + length <= begin:
            continue
        frame = rows[k:k + length]
        causes = [row for row in frame if not isinstance(row, bool)]
        if causes:
            excluded[causes[0]] += 1
        else:
            n, errors = n + 1, errors + any(frame)
    out = {"frames": n, "frame_errors": errors}
    if n:
        low, high = binomial(errors, n, conf)
        out |= {"fer": errors / n} | ({} if low is None else {"fer_low": low}) | {"fer_high": high}
    return out | {"frames_excluded": excluded}


def verdict(target, steps, excluded, dependence, conf):
    """
    Of a run with no error or with too few blocks to bet on. Without an error the wealth against "at or above p" is a mixture
    of (1 + λp)^blocks: over lengths dependence·2^j with weights 0.8·0.2^j, what is left being 1, and over λ, 0.99/(1 − p) with
    weight 0.8 and its halves down to 2^−7 with 0.2/7 each; against "at or below p" of (1 − λp)^blocks, λ = 0.99/p and its
    halves down to the first below 0.1, with equal weights.
    """
    kind, rate = target.split(":")
    p = mpf(rate)
    out = {"target": {kind: p}, "state": "undecided"}
    if steps // dependence >= 16:
        wealth = {}
        for name, bets in (("pass", [(mpf("0.8") if k == 0 else mpf("0.2") / 7, mpf("0.99") / (1 - p) / 2**k) for k in range(8)]),
                           ("fail", None)):
            if bets is None:
                each = [mpf("0.99") / p]
                while each[-1] / 2 > mpf("0.1"):
                    each.append(each[-1] / 2)
                bets = [(mpf(1) / len(each), -bet) for bet in each]
            total, weight, length = mpf(0), mpf("0.8"), dependence
            while steps // length:
                total += weight * sum(w * (1 + bet * p)**(steps // length) for w, bet in bets)
                weight, length = weight / 5, 2 * length
            wealth[name] = total + weight / mpf("0.8")
        out |= {"log_wealth_pass": log(wealth["pass"]), "log_wealth_fail": log(wealth["fail"]), "block": dependence}
        assert excluded == 0
        if wealth["pass"] >= 2 / (1 - mpf(str(conf))):
            out["state"] = "pass"
    out["excluded_share"] = mpf(excluded) / (steps + excluded)
    return out


def named(rates):
    return {rung: {"ser": ser, "ber": ber} for rung, (ser, ber) in rates.items()}


def solve_shortfall(s, snr_db, errors, n, conf, variance, influence):
    """x with SER(γ − x) = errors/n, and its ends: see README.md, 'Shortfall'."""
    ser = lambda db: s.rates(mpf(10)**(db / 10))["exact"][0]
    low, high = binomial(errors, n, conf)

    def at(rate):
        """Nothing where no Es/N0 from −60 to 200 dB gives the rate (more errors than pure noise makes)."""
        if not ser(mpf(-60)) > rate > ser(mpf(200)):
            return None
        below, above = mpf(-60), mpf(200)
        for _ in range(100):  # bisection to 2e-28 dB
            middle = (below + above) / 2
            below, above = (middle, above) if ser(middle) > rate else (below, middle)
        return snr_db - below

    sigma = sqrt(variance)
    if errors == 0:
        bound = at(high)
        return {} if bound is None else {"db_high": bound + norm.ppf(conf) * sigma}
    p = mpf(errors) / n
    x, x_low, x_high = at(p), at(low), at(high)
    if x is None:
        return {} if x_low is None else {"db_low": x_low - norm.ppf((1 + conf) / 2) * sigma}
    u = norm.ppf((1 + conf) / 2) * sigma
    rho = 0
    if influence:
        # Cov(γ in dB, errors) = DB·Σ_errors ψ / n; Var(errors) = n p (1 − p)
        rho = DB * influence / n / sqrt(variance * n * p * (1 - p))
        rho = max(min(rho, mpf(1)), mpf(-1))
    side = lambda a: sqrt(a * a + u * u + 2 * rho * a * u)
    out = {"db": x, "db_low": x - side(x - x_low)}
    if x_high is not None:
        out["db_high"] = x + side(x_high - x)
    return out


def derive(case):
    s, conf, stream, size = case["set"], case["confidence"], case["stream"], case["window"]
    causes = ["before_lock", "slip", "signal_lost", "overflow"]
    reports, judged_all, nonfinite, excluded = [], [], 0, [0] * 4
    stretches, carry, rows = [], [], []
    starts = list(range(0, len(stream), size))
    for sequence, start in enumerate(starts):
        judged = []
        for i, q_, ref in stream[start:start + size]:
            if ref < 0:
                excluded[-1 - ref] += 1
                rows.append(CAUSES[-1 - ref])
            elif not (math.isfinite(i) and math.isfinite(q_)):
                nonfinite += 1
                rows.append("nonfinite")
            else:
                judged.append(((i, q_), ref, s.decide(i, q_)))
                rows.append(ref != s.decide(i, q_))
        judged_all += judged
        window, total = Sums(s, judged), Sums(s, judged_all)
        # A window that cannot be gauged is predicted together with the next that can; until then, at the run's gauge.
        carry += judged
        pooled = Sums(s, carry)
        if window.fit():
            stretches.append((pooled, pooled.fit()["snr"]))
            carry = []
        parts = list(stretches)
        if carry and total.fit():
            parts.append((Sums(s, carry), total.fit()["snr"]))
        report = {"schema": "halfplane/report/1", "version": VERSION, "settings_sha256": sha256_of_settings(case), "time": CLOCK,
                  "sequence": sequence, "set": s.name, "pattern": case["pattern"], "law": "awgn", "detector": "ml",
                  "decisions": "own", "confidence": conf}
        report["window"] = {"first_symbol": start} | counts(window, conf)
        handed = min(start + size, len(stream))
        report["window"] |= frames(rows, case["frame"], start, handed, conf)
        if window.fit():
            report["window"]["predicted"] = named(s.rates(window.fit()["snr"]))
        t = counts(total, conf) | frames(rows, case["frame"], 0, handed, conf)
        t |= {"in": handed + case["pending"], "judged": total.n, "pending": case["pending"], "nonfinite": nonfinite,
              "excluded": dict(zip(causes, excluded)), "slips": case["lock"]["slips"]}
        if case.get("symbol_rate"):
            t["seconds"] = (handed + case["pending"]) / case["symbol_rate"]
        if total.h:
            t["bit_dispersion"] = sum(x * x for x in total.h) / sum(total.h)
        if sum(p.n for p, _ in parts) == total.n and total.n:
            mean = {}
            for rung in ("exact", "facing", "union", "nearest"):
                mean[rung] = tuple(sum(p.n * s.rates(g)[rung][k] for p, g in parts) / total.n for k in (0, 1))
            t["predicted"] = named(mean)
        t["by_bit"] = [sum(s.labels[a][k] != s.labels[b][k] for a, b in total.errors) for k in range(len(s.labels[0]))]
        t["transitions"] = []
        for pair in sorted(set(total.errors)):
            row = [pair[0], pair[1], total.errors.count(pair)]
            if "predicted" in t:
                row.append(sum(sum(sent == pair[0] for _, sent, _ in p.judged) * s.transition(g, *pair) for p, g in parts))
            t["transitions"].append(row)
        report["total"] = t
        report["input"] = dict(case["input"])
        fit = total.fit()
        shortfall = {}
        if fit:
            found = solve_shortfall(s, 10 * log10(fit["snr"]), len(total.errors), total.n, conf, fit["variance"],
                                    fit["influence"])
            if found:
                shortfall["decision"] = found
        if total.n:
            found = solve_shortfall(s, mpf(case["input"]["es_n0_db"]), len(total.errors), total.n, conf,
                                    mpf(case["input"]["es_n0_db_se"])**2, 0)
            if found:
                shortfall["input"] = found
        if shortfall:
            report["shortfall"] = shortfall
        report["lock"] = {k: v for k, v in case["lock"].items() if k != "slips"}
        by_frame = case["target"].startswith("fer")
        left_out = sum(t["frames_excluded"].values()) if by_frame else nonfinite + sum(excluded[1:])
        dependence = case.get("dependence") or (1 if by_frame else 256 // len(s.labels[0]))
        report["verdict"] = verdict(case["target"], t["frames"] if by_frame else total.n, left_out, dependence, conf)
        reports.append(report)
    return reports


# Noise of symbol k in eighths, chosen by eye so that no decision changes by it and gain, phase and offset all differ from nothing.
E = [(3, -2), (-4, 1), (2, 4), (-1, -3), (0, 5), (-5, -1), (1, 2), (4, -4), (-2, 0), (3, 3), (-3, 2), (1, -5), (5, 1), (-1, 4)]


def noisy(s, k, sent):
    return s.points[sent][0] + E[k % len(E)][0] / 8, s.points[sent][1] + E[k % len(E)][1] / 8


def clean():
    """24 symbols 0 1 2 3 0 1 2 3 …, no error."""
    return [(*noisy(Qpsk, k, k % 4), k % 4) for k in range(24)]


def gap():
    """40 symbols 0 0 1 1 2 2 3 3 …; for symbols 22 … 29 the receiver is half a turn off and the gap is judged;
    symbol 5 lands across one axis, symbol 33 across one axis."""
    out = []
    for k in range(40):
        sent = k // 2 % 4
        i, q_ = noisy(Qpsk, k, sent)
        if 22 <= k <= 29:
            i, q_ = -i, -q_
        if k == 5:
            i, q_ = -1.0, 0.25  # sent 2 (−1, −1), decided 1
        if k == 33:
            i, q_ = -0.25, 1.25  # sent 0 (1, 1), decided 1
        out.append((i, q_, sent))
    return out


def slip():
    """40 symbols in windows of 10: eight before lock, an Inf among them; a NaN at symbol 14; slip at 20 … 24; signal lost from 32 on."""
    sent = [0, 1, 2, 2, 1, 0, 1, 1, 2, 0]
    out = []
    for k in range(40):
        i, q_ = noisy(Line3, k, sent[k % 10])
        ref = sent[k % 10]
        if k < 8:
            ref = -1
        elif 20 <= k <= 24:
            ref = -2
        elif k >= 32:
            ref = -3
        out.append([i, q_, ref])
    out[3][0] = math.inf       # excluded before lock: the cause stands, not the value
    out[14][1] = math.nan      # judged otherwise
    out[12][0] = 0.75          # sent 2, decided 1: labels 10 and 01, two bits
    out[17][0] = -1.25         # sent 1, decided 0: one bit
    out[28][0] = -1.5          # sent 2, decided 0: one bit
    return [tuple(x) for x in out]


LOCK = {"state": "held", "delay": 17, "rotation_deg": 90.0, "mirrored": False, "inverted": False, "frequency": 1.25e-05}
CASES = {
    "clean": {"set": Qpsk, "stream": clean(), "window": 24, "confidence": 0.95, "pattern": "draw:7:4096", "symbol_rate": 1000,
              "frame": 5, "target": "ser:0.2", "dependence": 1, "pending": 6, "lock": LOCK | {"slips": 0},
              "input": {"es_n0_db": 12.0, "es_n0_db_se": 0.0, "source": "declared"}},
    "gap": {"set": Qpsk, "stream": gap(), "window": 20, "confidence": 0.95, "pattern": "o150:9", "pending": 0, "frame": 4, "target": "fer:0.5",
            "lock": LOCK | {"slips": 0, "mirrored": True, "delay": 0, "rotation_deg": 0.0},
            "input": {"es_n0_db": 9.5, "es_n0_db_se": 0.0, "source": "declared"}},
    "slip": {"set": Line3, "stream": slip(), "window": 10, "confidence": 0.9, "pattern": "file:sent.txt", "pending": 9, "frame": 3, "target": "ber:0.3",
             "lock": LOCK | {"slips": 1, "inverted": True},
             "input": {"es_n0_db": 6.0, "es_n0_db_se": 0.25, "source": "measured"}},
}

# By hand, at the end of the stream: frames, in error, excluded by cause.
FRAMES_BY_HAND = {"clean": (4, 0, [0, 0, 0, 0, 0]), "gap": (10, 5, [0, 0, 0, 0, 0]), "slip": (5, 3, [0, 2, 2, 0, 1])}

# Counted by hand from the streams (README.md): symbols, symbol errors, bit errors, nonfinite, excluded, in, by bit, transitions.
BY_HAND = {
    "clean": (24, 0, 0, 0, [0, 0, 0, 0], 30, [0, 0], []),
    "gap": (40, 10, 18, 0, [0, 0, 0, 0], 40, [9, 9], [[0, 1, 1], [0, 2, 2], [1, 3, 2], [2, 0, 2], [2, 1, 1], [3, 1, 2]]),
    "slip": (18, 3, 4, 1, [8, 5, 8, 0], 49, [2, 2], [[1, 0, 1], [2, 0, 1], [2, 1, 1]]),
}


def plain(x):
    if isinstance(x, dict):
        return {k: plain(v) for k, v in x.items()}
    if isinstance(x, (list, tuple)):
        return [plain(v) for v in x]
    if isinstance(x, (bool, int, str)):
        return x
    return float(x)


def main():
    for name, case in CASES.items():
        reports = derive(case)
        t = reports[-1]["total"]
        seen = (t["symbols"], t["symbol_errors"], t["bit_errors"], t["nonfinite"], list(t["excluded"].values()), t["in"], t["by_bit"],
                [row[:3] for row in t["transitions"]])
        assert seen == BY_HAND[name], (name, seen)
        assert (t["frames"], t["frame_errors"], list(t["frames_excluded"].values())) == FRAMES_BY_HAND[name], name
        s = case["set"]
        number = lambda x: x if math.isfinite(x) else str(x)
        document = {"what": globals()[name].__doc__,
                    "set": {"name": s.name, "points": s.points, "labels": s.labels},
                    "options": {"pattern": case["pattern"], "confidence": case["confidence"], "window": case["window"],
                                "symbol_rate": case.get("symbol_rate", 0), "clock": CLOCK, "target": case["target"],
                                "frame_symbols": case["frame"], "max_excluded": MAX_EXCLUDED, "dependence": case.get("dependence", 0)},
                    "pending": case["pending"], "lock": case["lock"], "input": case["input"],
                    "stream": [[number(i), number(q_), ref] for i, q_, ref in case["stream"]], "reports": plain(reports)}
        lines = lambda rows: "[\n  " + ",\n  ".join(json.dumps(row) for row in rows) + "]"
        fields = [f'"{k}": ' + (lines(v) if k in ("stream", "reports") else json.dumps(v)) for k, v in document.items()]
        (Path(__file__).parent / f"{name}.json").write_text("{" + ",\n ".join(fields) + "}\n")
        print(name, "reports:", len(reports), "last shortfall:", plain(reports[-1].get("shortfall")))


if __name__ == "__main__":
    main()
