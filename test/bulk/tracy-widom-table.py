"""Writes src/bulk/tracy-widom-table.ts: the distribution function of the Tracy-Widom law for beta = 1 on a grid,
F1(s) = det(1 - B_s), B_s(x, y) = Ai(x + y + s) on L2(0, inf) (Ferrari & Spohn 2005), the determinant by
Gauss-Legendre quadrature (Bornemann 2010). Needs numpy and scipy.
usage: python tracy-widom-table.py > ../../src/bulk/tracy-widom-table.ts"""
import numpy as np
from scipy.special import airy

nodes, weights = np.polynomial.legendre.leggauss(120)


def upper_tail_and_cdf(s):
    """The nodes are carried to (0, L): beyond L the kernel is below 1e-17."""
    length = 16.0 + max(0.0, -s)
    x = length * (nodes + 1) / 2
    w = np.sqrt(weights * length / 2)
    kernel = w[:, None] * airy(x[:, None] + x[None, :] + s)[0] * w[None, :]
    return np.linalg.det(np.eye(len(x)) - kernel)


first, last, step = -8.0, 6.0, 0.05
grid = np.round(np.arange(first, last + step / 2, step), 10)
values = [upper_tail_and_cdf(s) for s in grid]
print("/**")
print(" * Distribution function of the Tracy–Widom law, β = 1, on an even grid; made by")
print(" * test/bulk/tracy-widom-table.py (Fredholm determinant: Ferrari & Spohn 2005, Bornemann 2010).")
print(" */")
print(f"export const gridStart = {first:g}\nexport const gridStep = {step:g}")
print("export const distribution: readonly number[] = [")
for v in values:
    print(f"  {max(v, 0.0):.13g},")
print("]")
