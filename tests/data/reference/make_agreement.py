"""Agreement of parcels whose links are carried over by shares, pair by pair with numpy's weighted covariance.

Writes agreement.json beside itself. Needs numpy.
"""

import json
from pathlib import Path

import numpy as np


def weighted_correlation(x, y, w):
    c = np.cov(np.array(x), np.array(y), aweights=np.array(w), ddof=0)
    return c[0, 1] / np.sqrt(c[0, 0] * c[1, 1])


def among(a, seen_a, b, seen_b, shares):
    """Pairs (i, j) by what is seen among a's parcels; shares (a, b) have rows that sum to 1."""
    n, m = shares.shape
    found = np.zeros((n, m))
    for i in range(n):
        for j in range(m):
            xs, ys, ws = [], [], []
            for own, seen_own, other, seen_other in ((a, seen_a, b, seen_b), (a.T, seen_a.T, b.T, seen_b.T)):
                for k in range(n):
                    if k == i or not seen_own[i, k]:
                        continue
                    partners = [l for l in range(m) if l != j and seen_other[j, l]]
                    weight = sum(shares[k, l] for l in partners)
                    xs.append(own[i, k])
                    ys.append(sum(shares[k, l] * other[j, l] for l in partners) / weight)
                    ws.append(weight)
            found[i, j] = weighted_correlation(xs, ys, ws)
    return found


def case(rng, n, m, missing, symmetric):
    def network(size):
        x = rng.normal(size=(size, size)) ** 2
        seen = rng.random((size, size)) >= missing
        if symmetric:
            x, seen = x + x.T, seen & seen.T
        np.fill_diagonal(x, 0)
        np.fill_diagonal(seen, True)
        return np.where(seen, x, 0), seen

    (a, seen_a), (b, seen_b) = network(n), network(m)
    plan = rng.random((n, m)) ** 3
    rows, columns = plan / plan.sum(1, keepdims=True), plan / plan.sum(0)
    expected = (among(a, seen_a, b, seen_b, rows) + among(b, seen_b, a, seen_a, columns.T).T) / 2
    lists = {"a": a, "seen_a": seen_a.astype(float), "b": b, "seen_b": seen_b.astype(float)}
    lists |= {"rows": rows, "columns": columns, "expected": expected}
    return {"complete": missing == 0} | {key: value.tolist() for key, value in lists.items()}


rng = np.random.default_rng(20)
cases = [case(rng, 7, 6, 0, False), case(rng, 6, 8, 0, True), case(rng, 8, 7, 0.15, False), case(rng, 7, 7, 0.1, True)]
out = {"versions": {"numpy": np.__version__}, "cases": cases}
Path(__file__).with_name("agreement.json").write_text(json.dumps(out, indent=1) + "\n")
