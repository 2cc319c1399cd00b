"""Eigenvalues by numpy of the matrices that matrices.ts builds by the same recipe; writes eigenvalues.json.

    python3 eigenvalues.py > eigenvalues.json
"""

import json

import numpy as np


class Mulberry:
    """mulberry32 (Tommy Ettinger, public domain), as in matrices.ts."""

    def __init__(self, seed):
        self.state = seed & 0xFFFFFFFF

    def uniform(self):
        self.state = (self.state + 0x6D2B79F5) & 0xFFFFFFFF
        t = self.state
        t = ((t ^ (t >> 15)) * (t | 1)) & 0xFFFFFFFF
        t ^= (t + (((t ^ (t >> 7)) * (t | 61)) & 0xFFFFFFFF)) & 0xFFFFFFFF
        return ((t ^ (t >> 14)) & 0xFFFFFFFF) / 4294967296

    def centred(self):
        return 2 * self.uniform() - 1


def symmetric(draw, n):
    a = np.zeros((n, n))
    for i in range(n):
        for j in range(i + 1):
            a[i, j] = a[j, i] = draw.centred()
    return a


def correlation(draw, n, frames):
    x = np.zeros((n, frames))
    for t in range(frames):
        common = draw.centred()
        for i in range(n):
            x[i, t] = 0.5 * common + draw.centred()
    x /= np.sqrt((x * x).sum(axis=1))[:, None]
    return x @ x.T


def graded(draw, n, decades, upwards):
    a = symmetric(draw, n)
    for i in range(n):
        a[i, i] += 2
    power = np.arange(n) / n
    if upwards:
        power = power[::-1]
    d = 10.0 ** (-decades * power)
    return a * d[:, None] * d[None, :]


def repeated(draw, n, values):
    """Eigenvalues given, each n/len(values) times, turned by two reflections."""
    a = np.diag(np.repeat(np.array(values, dtype=float), n // len(values)))
    for _ in range(2):
        u = np.array([draw.centred() for _ in range(n)])
        h = np.eye(n) - 2 * np.outer(u, u) / (u @ u)
        a = h @ a @ h
    return (a + a.T) / 2


def hilbert(n):
    i = np.arange(n)
    return 1.0 / (i[:, None] + i[None, :] + 1)


def wilkinson(n):
    """W+ of odd order: pairs of eigenvalues that agree to many digits (Wilkinson 1965)."""
    a = np.diag(np.abs(np.arange(n) - n // 2).astype(float))
    for i in range(1, n):
        a[i, i - 1] = a[i - 1, i] = 1
    return a


cases = {
    "random 2": lambda: symmetric(Mulberry(2), 2),
    "random 7": lambda: symmetric(Mulberry(7), 7),
    "random 60": lambda: symmetric(Mulberry(60), 60),
    "random 101": lambda: symmetric(Mulberry(101), 101),
    "correlation 30 x 100": lambda: correlation(Mulberry(30), 30, 100),
    "correlation 100 x 200": lambda: correlation(Mulberry(100), 100, 200),
    "graded downwards 40": lambda: graded(Mulberry(40), 40, 6, False),
    "graded upwards 41": lambda: graded(Mulberry(41), 41, 6, True),
    "repeated 24": lambda: repeated(Mulberry(24), 24, [5, 2, 2, 0.5]),
    "repeated 60": lambda: repeated(Mulberry(61), 60, [1, 1, 1, 1 - 1e-9]),
    "near-singular: 50 signals, 20 frames": lambda: correlation(Mulberry(50), 50, 20),
    "near-singular: Hilbert 12": lambda: hilbert(12),
    "Wilkinson 21": lambda: wilkinson(21),
    "tiny 20": lambda: symmetric(Mulberry(20), 20) * 2.0**-900,
    "huge 20": lambda: symmetric(Mulberry(20), 20) * 2.0**900,
}
figures = {name: np.linalg.eigvalsh(make())[::-1].tolist() for name, make in cases.items()}
print(json.dumps({"made": f"eigenvalues.py, numpy {np.__version__}", "values": figures}, indent=1))
