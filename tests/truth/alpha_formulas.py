"""The alpha functions as their papers print them, for numbers of any precision; no code of the package."""

from __future__ import annotations

import mpmath as mp


def soave(tr, m):
    return (1 + m * (1 - mp.sqrt(tr))) ** 2


def stryjek_vera(tr, kappa0, kappa1):
    return soave(tr, kappa0 + kappa1 * (1 + mp.sqrt(tr)) * (mp.mpf("0.7") - tr))


def mathias_copeman(tr, c1, c2, c3):
    x = 1 - mp.sqrt(tr)
    return (1 + c1 * x + c2 * x**2 + c3 * x**3) ** 2


def twu(tr, L, M, N):
    return tr ** (N * (M - 1)) * mp.exp(L * (1 - tr ** (M * N)))


def twu_pair(tr, omega, L0, M0, N0, L1, M1, N1):
    return twu(tr, L0, M0, N0) + omega * (twu(tr, L1, M1, N1) - twu(tr, L0, M0, N0))


def schmidt_wenzel(tr, omega):
    w = mp.mpf(omega)
    m0 = 0.465 + 1.347 * w - 0.528 * w**2 if omega <= 0.3671 else 0.5361 + 0.9593 * w
    light, heavy = m0 + (5 * tr - 3 * m0 - 1) ** 2 / 70, m0 + 0.71 * (tr - 0.779) ** 2
    share = min(max((w - 0.4) / 0.15, 0), 1)
    return soave(tr, (1 - share) * light + share * heavy)


FORMULAS = {
    "constant": lambda _tr: mp.mpf(1),
    "power": lambda tr, n: tr ** (-n),
    "Soave": soave,
    "Stryjek-Vera": stryjek_vera,
    "Mathias-Copeman": mathias_copeman,
    "Twu": twu,
    "Twu pair": twu_pair,
    "Gasem": lambda tr, A, B, C: mp.exp((A + B * tr) * (1 - tr**C)),
    "Cismondi-Mollerup": lambda tr, k: (3 / (2 + tr)) ** k,
    "Schmidt-Wenzel": schmidt_wenzel,
}
