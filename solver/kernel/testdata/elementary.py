# Writes elementary.txt: python3 elementary.py > elementary.txt (needs mpmath).
import random
from mpmath import mp, mpf, sin, cos, exp, log, besseli

mp.dps = 400
random.seed(1)
print("# function argument value, by mpmath", "at", mp.dps, "digits")


def put(name, f, x):
    print(name, float(x).hex(), float(f(mpf(x))).hex())


hard = [6381956970095103.0 * 2.0**797, 1e22, 1e300, 2.0**1023, 1.0e16, 2.0**30 + 0.5, 2.0**30 - 0.5, 3.0, 11.0, 22.0, 355.0,
        103993.0, 5419351.0, 411557987.0, 1e-310, 1e-8, 1.5707963267948966, 3.141592653589793, 0.7853981633974483]
args = hard + [-x for x in hard] + [random.uniform(-1, 1) * 2.0**random.randint(-20, 1023) for _ in range(40)]
for x in args:
    put("sin", sin, x)
    put("cos", cos, x)
for x in [random.uniform(-708, 709) for _ in range(30)] + [709.78, -708.5, -740.0, -744.0, 1e-300, -1e-17, 0.34657359027997264, 708.0]:
    put("exp", exp, x)
for x in [random.uniform(0, 2) for _ in range(20)] + [1e-310, 5e-324, 1.7976931348623157e308, 0.7071067811865475, 0.7071067811865476, 1.0000000000000002, 0.9999999999999999]:
    put("log", log, x)
for n in (0, 1, 5):
    for x in (1e-3, 0.5, 3.0, 12.0, 39.0, 41.0, 120.0, 600.0, 700.0):
        put("I%d" % n, lambda y: besseli(n, y), x)
