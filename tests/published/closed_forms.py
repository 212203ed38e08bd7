# SPDX-License-Identifier: GPL-3.0-or-later
"""Error rates of PSK and square QAM in closed form, by mpmath at 40 digits.

    python3 closed_forms.py > closed_forms.csv

Sources
  PSK    SER = (1/pi) * int_0^((M-1)pi/M) T(g sin^2(pi/M) / sin^2 t) dt                Craig, MILCOM 1991, eq. 14;
         with the moment-generating function of a fading law in place of the exponential Simon and Alouini,
         Digital Communication over Fading Channels, 2nd ed. 2005, section 8.2.1.2
  QAM    SER = 4 (1-1/n) Q(x) - 4 (1-1/n)^2 Q(x)^2, x^2 = 3 g/(M-1), n = sqrt(M)      Proakis, Digital
         Communications, 4th ed. 2001, eqs. 5.2-76 to 5.2-79; in the form of Craig's integrals over pi/2 and pi/4
         Simon and Alouini, section 8.2.1.1
  QAM    BER, Gray labels on each axis                                                Cho and Yoon, IEEE Trans.
         Commun. 50 (2002) 1074, eqs. 14 and 16, averaged over fading term by term
  tails  awgn exp(-u); rayleigh 1/(1+u); nakagami (1+u/m)^-m; rician (1+K)/(1+K+u) exp(-K u/(1+K+u)): Simon and
         Alouini, table 2.2 and section 9.2 (powers for branches); impulsive: the weighted sum over the states of
         class A, Middleton, IEEE Trans. EMC 19 (1977) 106
"""

import mpmath as mp

mp.mp.dps = 40
SMALLEST = {"awgn": mp.mpf("1e-2200")}  # ln P down to -5000


def tail_of(law):
    base, _, branches = law.partition("*")
    name, *numbers = base.split(":")
    numbers = [mp.mpf(x) for x in numbers]
    if name == "awgn":
        one = lambda u: mp.exp(-u)
    elif name == "rayleigh":
        one = lambda u: 1 / (1 + u)
    elif name == "nakagami":
        one = lambda u: (1 + u / numbers[0]) ** (-numbers[0])
    elif name == "rician":
        k = 10 ** (numbers[0] / 10)
        one = lambda u: (1 + k) / (1 + k + u) * mp.exp(-k * u / (1 + k + u))
    power = int(branches or 1)
    return lambda u: one(u) ** power


def craig(tail, u, upper):
    """(1/pi) int_0^upper T(u / sin^2 t) dt, split where the integrand changes its scale."""
    peak = min(upper, mp.pi / 2)
    top = tail(u / mp.sin(peak) ** 2)
    width = 1 / mp.sqrt(u + 1)
    places = {mp.mpf(0), upper}
    for k in range(-8, 9):
        for centre, size in ((mp.pi / 2, width), (peak, 1 / (u + 1)), (mp.mpf(0), mp.sqrt(u)), (mp.pi, mp.sqrt(u))):
            for t in (centre + k * size / 2, centre + k * size * 4):
                if 0 < t < upper:
                    places.add(t)
    value, error = mp.quad(lambda t: tail(u / mp.sin(t) ** 2) / top if t else mp.mpf(0), sorted(places),
                           method="gauss-legendre", error=True, maxdegree=9)
    assert error < 1e-20 * value, (u, upper, error)
    return top * value / mp.pi


def psk_ser(tail, m, g):
    return craig(tail, g * mp.sin(mp.pi / m) ** 2, mp.pi * (m - 1) / m)


def qam_ser(tail, m, g):
    n = mp.sqrt(m)
    u = 3 * g / (m - 1) / 2
    share = 1 - 1 / n
    return 4 * share * craig(tail, u, mp.pi / 2) - 4 * share**2 * craig(tail, u, mp.pi / 4)


def qam_ber(tail, m, g):
    n = int(mp.sqrt(m))
    bits = n.bit_length() - 1
    total = mp.mpf(0)
    for k in range(1, bits + 1):
        for i in range(int((1 - mp.mpf(2) ** -k) * n)):
            sign = (-1) ** int(mp.floor(mp.mpf(i) * 2 ** (k - 1) / n))
            weight = 2 ** (k - 1) - int(mp.floor(mp.mpf(i) * 2 ** (k - 1) / n + mp.mpf(1) / 2))
            u = (2 * i + 1) ** 2 * 3 * g / (m - 1) / 2
            total += sign * weight * 2 * craig(tail, u, mp.pi / 2)
    return total / n / bits


def impulsive(figure, law, m, g):
    a, gamma = [mp.mpf(x) for x in law.split(":")[1:]]
    total = mp.mpf(0)
    for k in range(400):
        weight = mp.exp(-a) * a**k / mp.factorial(k)
        part = weight * figure(tail_of("awgn"), m, g * (1 + gamma) / (k / a + gamma))
        total += part
        if k > a and weight < 1e-25 * total:
            return total
    raise ArithmeticError("class A did not settle")


def value_at(law, kind, m, what, db):
    g = mp.mpf(10) ** (mp.mpf(db) / 10)
    figure = {("psk", "ser"): psk_ser, ("qam", "ser"): qam_ser, ("qam", "ber"): qam_ber}[kind, what]
    return impulsive(figure, law, m, g) if law.startswith("impulsive") else figure(tail_of(law), m, g)


def deepest_level(kind, m, what="ser"):
    """The highest multiple of 1/64 dB (a number that a double holds) at which the rate over AWGN is still 1e-290."""
    low, high = -10 * 64, 130 * 64
    while high - low > 1:
        middle = (low + high) // 2
        if value_at("awgn", kind, m, what, mp.mpf(middle) / 64) >= mp.mpf("1e-290"):
            low = middle
        else:
            high = middle
    return low / 64


def emit(law, kind, m, what, db):
    value = value_at(law, kind, m, what, db)
    if value < SMALLEST.get(law, mp.mpf("1e-290")):
        return False
    print(f"{law},{kind}:{m},{what},{db},{mp.nstr(value, 18, min_fixed=0, max_fixed=0)},{mp.nstr(mp.log(value), 18)}",
          flush=True)
    return True


def levels(first, last, step):
    return [first + k * step for k in range(int((last - first) / step) + 1)]


def main():
    print("law,set,what,es_n0_db,value,ln_value")
    for kind, m, what, step in (
            [("psk", m, "ser", 3) for m in (2, 4, 8, 16, 64, 512, 4096)]
            + [("qam", m, "ser", 3) for m in (4, 16, 64, 256, 1024, 4096)]
            + [("qam", m, "ber", 4) for m in (4, 16, 64)] + [("qam", 256, "ber", 7), ("qam", 4096, "ber", 15)]):
        for db in levels(-10, 120, step):
            if not emit("awgn", kind, m, what, db):
                break
        # At this depth BER is SER over a few bits, and 4/64 dB are seven powers of e.
        emit("awgn", kind, m, what, deepest_level(kind, m, "ser") - (4 / 64 if what == "ber" else 0))
    for law in ("rayleigh", "rician:6", "rician:0.5", "rician:20", "nakagami:0.5", "nakagami:2.7", "rayleigh*2",
                "rayleigh*4", "rician:3*3", "nakagami:1.5*8"):
        for kind, m, what in (("psk", 2, "ser"), ("psk", 8, "ser"), ("qam", 64, "ser"), ("qam", 16, "ber")):
            for db in (-10, 0, 10, 20, 35, 60):
                emit(law, kind, m, what, db)
    for law in ("impulsive:0.1:0.01", "impulsive:1.5:0.3", "impulsive:0.001:1"):
        for kind, m, what in (("psk", 4, "ser"), ("qam", 16, "ser"), ("qam", 16, "ber")):
            for db in (-5, 5, 15, 25, 40):
                emit(law, kind, m, what, db)


if __name__ == "__main__":
    main()
