"""Reference values for the quadrature tests, by mpmath at 25 digits.

Run: python3 oracle.py > oracle.json

double well   dy = (y - y^3) dt + sqrt(2T) dW; <y Phi> by the one-dimensional
              cell formula (Pavliotis, Stuart, Multiscale Methods, ch. 11).
tilted        dy = (F + V sin y) dt + sqrt(2D) dW on the circle; mean velocity
              by Stratonovich 1958 and effective diffusion by P. Reimann et al.,
              Phys. Rev. Lett. 87 (2001) 010602 (both from memory).
"""
import json
from mpmath import mp, mpf, quad, exp, erfc, sqrt, cos, pi, inf, linspace

mp.dps = 25
def gauss_legendre(n):
    r = []
    for k in range(1, n + 1):
        x = cos(pi * (k - mpf(1) / 4) / (n + mpf(1) / 2))
        for _ in range(8):
            p0, p1 = mpf(1), x
            for j in range(2, n + 1):
                p0, p1 = p1, ((2 * j - 1) * x * p1 - (j - 1) * p0) / j
            dp = n * (x * p1 - p0) / (x * x - 1)
            x -= p1 / dp
        r.append((x, 2 / ((1 - x * x) * dp * dp)))
    return r


GL = gauss_legendre(24)
out = {"double_well": [], "tilted": []}
for T in ("0.5", "0.15", "0.05"):
    t = mpf(T)
    V = lambda y: (y * y - 1) ** 2 / 4
    pts = [-4, -2, -1, 0, 1, 2, 4]
    Z = quad(lambda y: exp(-V(y) / t), pts)
    # int_-inf^y s exp(-V/T) ds = -sqrt(pi T)/2 erfc((1-y^2)/(2 sqrt T)) up to
    # the substitution u = s^2 - 1, which is exact because s ds = du/2.
    F = lambda y: -sqrt(pi * t) / 2 * erfc((y * y - 1) / (2 * sqrt(t)))
    val = quad(lambda y: exp(V(y) / t) * F(y) ** 2, linspace(-8, 8, 65)) / (t * Z)
    out["double_well"].append({"T": float(T), "value": mp.nstr(val, 20)})
for F, V, D in (("0.5", "0.9", "0.4"), ("1.3", "0.8", "0.9"), ("0.05", "2", "0.2"), ("-0.7", "1", "0.05"), ("3", "1", "0.02")):
    f, v, d = mpf(F), mpf(V), mpf(D)
    W = lambda y: v * cos(y) - f * y  # potential: force = F + V sin y
    L = 2 * pi
    # I+(x) = 1/D int_0^L exp((W(x) - W(x-y))/D); for F < 0 use the mirror image.
    s = 1 if f > 0 else -1
    U = lambda y: v * cos(y) - abs(f) * y
    # Inner integrals by composite Gauss-Legendre, outer ones by the trapezoidal
    # rule (spectrally accurate for periodic functions).
    M = 12 if d > mpf("0.04") else 60
    nodes = [(L * (k + (1 + x) / 2) / M, w * L / (2 * M)) for k in range(M) for x, w in GL]
    N = 160
    Ip, Im = [], []
    for i in range(N):
        x = L * i / N
        Ip.append(sum(w * exp((U(x) - U(x - y)) / d) for y, w in nodes) / d)
        Im.append(sum(w * exp((U(x + y) - U(x)) / d) for y, w in nodes) / d)
    A = sum(Ip) / N
    B = sum(p * p * m for p, m in zip(Ip, Im)) / N
    vel = s * (1 - exp(-L * abs(f) / d)) / A
    deff = d * B / A ** 3
    out["tilted"].append({"F": float(F), "V": float(V), "D": float(D), "velocity": mp.nstr(vel, 18), "diffusion": mp.nstr(deff, 18)})
print(json.dumps(out, indent=1))
