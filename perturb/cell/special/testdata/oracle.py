"""Reference values by mpmath at 40 digits. Run: python3 oracle.py > oracle.json"""
import json
from mpmath import mp, mpf, besseli, exp, gammainc, ei, coth, nstr

mp.dps = 40
X = ["1e-8", "0.01", "0.3", "1", "1.5", "7", "25", "59", "61", "100", "300", "1200", "1e5", "1e9"]
N = ["0", "1", "2", "3", "7", "20", "60"]
R = ["0.5", "1.25", "2.7", "11.5", "40.3"]
s = lambda v: nstr(v, 20)
out = {"scaled": [], "ratio": [], "lower": [], "upper": [], "ei": [], "langevin": []}
for n in N + R:
    for x in X:
        a, b = mpf(n), mpf(x)
        if b > 1e4 and a > 20:
            continue
        v = besseli(a, b) * exp(-b)
        if v > mpf("1e-290"):
            out["scaled"].append([n, x, s(v)])
            out["ratio"].append([n, x, s(besseli(a + 1, b) / besseli(a, b))])
for a in ["0.05", "0.54", "1", "2.5", "13", "80"]:
    for x in ["1e-6", "0.05", "0.54", "1", "3", "20", "90"]:
        out["lower"].append([a, x, s(gammainc(mpf(a), 0, mpf(x)))])
        out["upper"].append([a, x, s(gammainc(mpf(a), mpf(x)))])
for x in ["-30", "-5", "-1.1", "-0.9", "-0.01", "1e-6", "0.37", "0.38", "1", "1.3", "10", "44", "46", "300"]:
    out["ei"].append(["0", x, s(ei(mpf(x)))])
for x in ["-1e-9", "1e-4", "0.1", "0.49", "0.51", "1.7", "-5", "40", "1e6"]:
    out["langevin"].append(["0", x, s(coth(mpf(x)) - 1 / mpf(x))])
print(json.dumps(out))
