"""The full spectrum every frame as one would write it on numpy and scipy: the moments exchanged in place by dsyr2, correlation from them, all eigenvalues by dsyevd. Writes `N median-milliseconds largest-eigenvalue` to stderr.
usage: OPENBLAS_NUM_THREADS=1 python spectra.py N FRAMES"""
import sys, time, numpy as np
from scipy.linalg import lapack as L, blas as B
N, frames = int(sys.argv[1]), int(sys.argv[2]); T = 2 * N
rng = np.random.default_rng(4); X = rng.standard_normal((T, N)) + .5 * rng.standard_normal((T, 1))
S = np.asfortranarray(X.T @ X); total = X.sum(0); C = np.empty((N, N), order='F')
lw = L.dsyevd_lwork(N, compute_v=0, lower=1); lwork, liwork = int(lw[0]), int(lw[1]); times = []
for k in range(frames):
    x = rng.standard_normal(N) + .5 * rng.standard_normal(); j = k % T
    start = time.perf_counter()
    y = X[j]; total += x - y; S = B.dsyr2(.5, x + y, x - y, a=S, lower=1, overwrite_a=1); X[j] = x
    np.divide(S, T, out=C); C = B.dsyr(-1., total / T, a=C, lower=1, overwrite_a=1)
    d = 1 / np.sqrt(C.diagonal()); C *= d; C *= d[:, None]
    w, _, info = L.dsyevd(C, compute_v=0, lower=1, lwork=lwork, liwork=liwork, overwrite_a=1)
    times.append(time.perf_counter() - start)
    assert info == 0
print(N, np.median(times) * 1000, w[-1], file=sys.stderr)
