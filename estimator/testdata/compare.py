"""Times with SciPy (LAPACK) what one redesign of an estimator takes.

Reads {"budget": seconds, "cases": [{A, B, C, K, W, R, poles, L}]} as JSON from standard
input and writes one object per case: least times in microseconds and the answers for
the gain L of the case. Called by compare_test.go.
"""
import json
import sys
import time

import numpy as np
import scipy.linalg as la
import scipy.signal as sig


def least(work, budget):
    times = []
    until = time.perf_counter() + budget
    while len(times) < 3 or (time.perf_counter() < until and len(times) < 1000):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
        if times[-1] > budget:
            break
    return 1e6 * float(np.min(times))


def left_condition(f):
    _, v = la.eig(f.T)
    return float(np.linalg.cond(v / np.linalg.norm(v, axis=0)))


def case(c, budget):
    a, b, cc, k = (np.array(c[x], dtype=float) for x in ("A", "B", "C", "K"))
    w, r, gain = (np.array(c[x], dtype=float) for x in ("W", "R", "L"))
    poles = np.array([complex(*p) for p in c["poles"]])
    n = len(a)
    f = a - gain @ cc
    noise = -(w + gain @ r @ gain.T)

    def robust():
        return sig.place_poles(a.T, cc.T, poles, method="YT", maxiter=30)

    def judge():
        la.eigvals(f)
        left_condition(f)
        return la.solve_continuous_lyapunov(f, noise)

    def floor():
        return la.solve_continuous_are(a.T, cc.T, w, r)

    loop_a = np.block([[a, np.zeros((n, n))], [gain @ cc, f - b @ k]])
    loop_b = np.vstack([b, np.zeros_like(b)])
    loop_c = np.hstack([np.zeros_like(k), k])
    at = 1j * np.logspace(-2, 2, 200)
    eye = np.eye(2 * n)

    def margins():
        resolvent = at[:, None, None] * eye - loop_a
        loop = (loop_c @ np.linalg.solve(resolvent, np.broadcast_to(loop_b, (len(at), 2 * n, 1))))[:, 0, 0]
        return float(np.max(1 / np.abs(1 + loop)))

    def settle():
        step = la.expm(f * (5 / np.min(np.abs(poles)) / 200))
        x, norms = np.eye(n), []
        for _ in range(200):
            x = step @ x
            norms.append(np.linalg.norm(x, 2))
        return max(norms)

    import warnings

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        found = robust()
        out = {
            "gain_us": least(robust, budget),
            "judge_us": least(judge, budget),
            "floor_us": least(floor, budget),
            "margins_us": least(margins, budget),
            "settle_us": least(settle, budget),
            "variances": np.diag(judge()).tolist(),
            "floor": np.diag(floor()).tolist(),
            "condition": left_condition(f),
            "condition_yt": left_condition(a - found.gain_matrix.T @ cc),
            "peak": margins(),
        }
    return out


def main():
    task = json.load(sys.stdin)
    json.dump([case(c, task["budget"]) for c in task["cases"]], sys.stdout)


main()
