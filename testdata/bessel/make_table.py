#!/usr/bin/env python3
"""Writes ratios.json: Bessel functions with mpmath at 50 digits, printed with 17."""
import json
import mpmath as mp

mp.mp.dps = 50
ratios = []
for n in range(0, 6):
    for x in ("1e-4", "0.03", "0.5", "1", "2.5", "5", "9", "15", "24", "29", "60", "400"):
        z = mp.mpf(x) * mp.mpc(1, -1)
        mp.mp.dps = 50 + int(abs(z))
        r = mp.besselj(n + 1, z) / mp.besselj(n, z)
        mp.mp.dps = 50
        ratios.append({"n": n, "x": float(x), "re": mp.nstr(r.real, 17), "im": mp.nstr(r.imag, 17)})
reduced = []
for nu, label in ((mp.mpf(1) / 6, "1/6"), (mp.mpf(0), "0"), (mp.mpf(-1) / 3, "-1/3")):
    for x in ("0.01", "0.7", "3", "8", "12.9", "13.1", "25", "80", "500"):
        v = mp.gamma(nu + 1) * (2 / mp.mpf(x)) ** nu * mp.besselj(nu, mp.mpf(x))
        reduced.append({"nu": label, "x": float(x), "value": mp.nstr(v, 17)})
json.dump({
    "title": "Bessel function check values",
    "source": "mpmath %s, 50 digits and more, made by make_table.py beside this file" % mp.__version__,
    "units": "ratios: J_(n+1)(z)/J_n(z) at z = x (1 - j); reduced: Gamma(nu+1) (2/x)^nu J_nu(x)",
    "accuracy": "all 17 printed digits",
    "ratios": ratios, "reduced": reduced}, open("ratios.json", "w"), indent=1)
