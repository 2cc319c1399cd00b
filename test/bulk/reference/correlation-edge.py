"""Mean and standard deviation of the largest eigenvalue of a correlation matrix of independent normal signals,
simulated with numpy: what correlation-centring.ts was fitted to. Writes correlation-edge.json.

    python3 correlation-edge.py > correlation-edge.json

`frames` are degrees of freedom: the mean is known here, and costs one frame where it is not.
"""

import json

import numpy as np

random = np.random.default_rng(20261201)
cases = [(5, 19), (5, 99), (10, 19), (10, 99), (30, 29), (30, 99), (30, 299), (60, 29), (60, 199), (100, 49)]
cases += [(100, 199), (200, 399)]
rows = []
for p, frames in cases:
    draws = 20_000 if p <= 10 else 4_000 if p <= 60 else 1_000 if p <= 100 else 400
    largest = np.empty(draws)
    for k in range(draws):
        x = random.standard_normal((p, frames))
        x /= np.sqrt((x * x).sum(axis=1))[:, None]
        largest[k] = np.linalg.eigvalsh(x @ x.T)[-1]
    rows.append(
        {
            "p": p,
            "frames": frames,
            "draws": draws,
            "mean": round(float(largest.mean()), 5),
            "deviation": round(float(largest.std(ddof=1)), 5),
        }
    )
print(json.dumps({"made": f"correlation-edge.py, numpy {np.__version__}", "rows": rows}, indent=1))
