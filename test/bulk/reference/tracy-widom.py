"""Makes src/bulk/tracy-widom-table.ts: the Tracy-Widom law for real symmetric matrices.

F1(s) = det(1 - B_s) on L2(0, oo), B_s(x, y) = Ai(x + y + s) (Ferrari & Spohn 2005), the determinant by
Gauss-Legendre quadrature (Bornemann 2010) from the eigenvalues of the symmetric quadrature matrix, so that
both ln F and ln(1 - F) keep their relative precision. Tabulated is the log odds ln(F/(1 - F)) and its
derivative, the latter by d ln F/ds = -tr((1 - B)^-1 B'), B'(x, y) = Ai'(x + y + s).

    python3 tracy-widom.py > ../../../src/bulk/tracy-widom-table.ts
"""

import numpy as np
from scipy.linalg import eigh, solve
from scipy.special import airy

NODES = 80
LENGTH = 20.0
FROM, TO, STEP = -8.0, 12.0, 0.125


def log_odds(s, nodes=NODES):
    x, w = np.polynomial.legendre.leggauss(nodes)
    # beyond x + y + s = 40 the kernel is below 1e-70
    length = max(LENGTH, LENGTH - s / 2)
    x = (x + 1) * length / 2
    root = np.sqrt(w * length / 2)
    ai, slope, _, _ = airy(x[:, None] + x[None, :] + s)
    kernel = root[:, None] * ai * root[None, :]
    change = root[:, None] * slope * root[None, :]
    log_f = np.log1p(-eigh(kernel, eigvals_only=True)).sum()
    log_f_slope = -np.trace(solve(np.eye(nodes) - kernel, change))
    log_rest = np.log(-np.expm1(log_f))
    # d/ds [ln F - ln(1 - F)] = (ln F)' (1 + F/(1 - F)) = (ln F)'/(1 - F)
    return log_f - log_rest, log_f_slope / np.exp(log_rest)


points = np.arange(round((TO - FROM) / STEP) + 1) * STEP + FROM
rows = [log_odds(s) for s in points]
check = [log_odds(s, NODES + 24) for s in points]
worst = max(abs(a[0] - b[0]) for a, b in zip(rows, check))
assert worst < 1e-4, worst
middle = max(abs(a[0] - b[0]) for a, b, s in zip(rows, check, points) if -6 <= s <= 9)
assert middle < 1e-10, middle


def block(name, column):
    cells = [f"{v[column]:.12g}" for v in rows]
    lines = ["  " + ", ".join(cells[i : i + 6]) + "," for i in range(0, len(cells), 6)]
    return f"export const {name} = Float64Array.of(\n" + "\n".join(lines) + "\n)\n"


print("// Made by test/bulk/reference/tracy-widom.py; do not edit.\n")
print("/** First point and step of the table. */")
print(f"export const tableStart = {FROM:g}\nexport const tableStep = {STEP:g}\n")
print("/** ln(F1/(1 - F1)) at the points. */")
print(block("logOdds", 0))
print("/** Its derivative. */")
print(block("logOddsSlope", 1), end="")
