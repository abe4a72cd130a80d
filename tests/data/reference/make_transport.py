"""Reference values for transport (linear, fused Gromov-Wasserstein, semi-relaxed)
and for landmark fingerprints.

Regenerate with

    python3 tests/data/reference/make_transport.py

which overwrites transport.json beside this file.  Needs numpy, scipy,
scikit-learn and POT (Python Optimal Transport); versions are stored under "versions".  Seeds are
fixed.  Costs are drawn from continuous distributions, so optima are unique.

Plans of fused transport are local minima.  POT starts from the plan of
independence and takes the same kind of steps (conditional gradient), with its
tolerances set so that it goes on until nothing changes; a solver that does the
same must reach the same plan.
"""

import json
import platform
from pathlib import Path

import numpy as np
import ot
import scipy
import sklearn
from scipy.optimize import linprog
from scipy.stats import zscore
from sklearn.metrics.pairwise import cosine_similarity


def network(rng, n, symmetric):
    """A sparse weighted network with an empty diagonal."""
    links = rng.gamma(1.0, 1.0, (n, n)) * (rng.uniform(size=(n, n)) < 0.5)
    if symmetric:
        links = (links + links.T) / 2
    np.fill_diagonal(links, 0)
    return links


def by_linear_program(cost, p, q):
    """The cost of an optimal plan, by scipy's HiGHS."""
    n, m = cost.shape
    rows = np.kron(np.eye(n), np.ones(m))
    columns = np.kron(np.ones(n), np.eye(m))
    found = linprog(cost.ravel(), A_eq=np.vstack([rows, columns]), b_eq=np.concatenate([p, q]))
    assert found.success
    return found.fun


def linear(rng, n, m, uniform):
    cost = rng.normal(size=(n, m))
    p = np.full(n, 1 / n) if uniform else rng.dirichlet(np.ones(n))
    q = np.full(m, 1 / m) if uniform else rng.dirichlet(np.ones(m))
    plan = ot.emd(p, q, cost)
    assert abs((plan * cost).sum() - by_linear_program(cost, p, q)) < 1e-9
    return {
        "inputs": {"cost": cost.tolist(), "p": p.tolist(), "q": q.tolist(), "uniform": uniform},
        "expected": {"plan": plan.tolist(), "cost": (plan * cost).sum()},
    }


def fused(rng, n, m, symmetric, alpha, uniform):
    a, b = network(rng, n, symmetric), network(rng, m, symmetric)
    cost = rng.uniform(size=(n, m))
    p = np.full(n, 1 / n) if uniform else rng.dirichlet(np.full(n, 5.0))
    q = np.full(m, 1 / m) if uniform else rng.dirichlet(np.full(m, 5.0))
    plan, log = ot.gromov.fused_gromov_wasserstein(
        cost, a, b, p, q, "square_loss", alpha=alpha, symmetric=symmetric,
        max_iter=2000, tol_rel=1e-14, tol_abs=1e-14, log=True,
    )
    return {
        "inputs": {
            "a": a.tolist(), "b": b.tolist(), "cost": cost.tolist(),
            "p": p.tolist(), "q": q.tolist(), "uniform": uniform, "alpha": alpha,
        },
        "expected": {"plan": plan.tolist(), "objective": float(log["fgw_dist"])},
    }


def semirelaxed(rng, n, m, symmetric, alpha):
    a, b = network(rng, n, symmetric), network(rng, m, symmetric)
    cost = rng.uniform(size=(n, m))
    plan, log = ot.gromov.semirelaxed_fused_gromov_wasserstein(
        cost, a, b, np.full(n, 1 / n), "square_loss", symmetric=symmetric, alpha=alpha,
        max_iter=2000, tol_rel=1e-14, tol_abs=1e-14, log=True,
    )
    return {
        "inputs": {"a": a.tolist(), "b": b.tolist(), "cost": cost.tolist(), "alpha": alpha},
        "expected": {"plan": plan.tolist(), "objective": float(log["srfgw_dist"])},
    }


def affinity(links):
    """Cosines of profiles sent and received, one on the diagonal."""
    profiles = np.hstack([links, links.T])
    cosines = cosine_similarity(profiles)
    np.fill_diagonal(cosines, 1)
    return np.maximum(cosines, 0)


def fingerprint(rng, n, m):
    """Unlikeness by strengths and by affinities, summed; the last landmark is left out."""
    links = {"a": network(rng, n, False), "b": network(rng, m, False)}
    landmarks = {"a": [0, 3, 4, 7], "b": [2, 1, 6, 5]}
    weights = np.array([1.0, 0.5, 0.8, 0.0])
    kept = weights > 0
    roots = np.sqrt(weights[kept] * kept.sum() / weights[kept].sum())
    total = np.zeros((n, m))
    for basis in ["strengths", "affinity"]:
        prints = {}
        for side in "ab":
            at = np.array(landmarks[side])[kept]
            if basis == "strengths":
                columns = np.hstack([links[side][:, at], links[side][at].T])
                factors = np.tile(roots, 2)
            else:
                columns, factors = affinity(links[side])[:, at], roots
            prints[side] = zscore(columns, axis=0) * factors
        total += 1 - cosine_similarity(prints["a"], prints["b"])
    return {
        "inputs": {
            "a": links["a"].tolist(), "b": links["b"].tolist(),
            "landmarks": landmarks, "weights": weights.tolist(),
        },
        "expected": {"unlikeness": total.tolist()},
    }


def main():
    rng = np.random.default_rng(20)
    out = {
        "versions": {
            "python": platform.python_version(), "numpy": np.__version__,
            "scipy": scipy.__version__, "scikit-learn": sklearn.__version__,
            "POT": ot.__version__,
        },
        "linear": [
            linear(rng, n, m, uniform)
            for n, m in [(6, 6), (5, 8), (9, 4), (12, 15)] for uniform in [True, False]
        ],
        "fused": [
            fused(rng, n, m, symmetric, alpha, uniform)
            for n, m in [(8, 8), (7, 10), (12, 9)]
            for symmetric in [True, False]
            for alpha in [0.2, 0.6]
            for uniform in [True, False]
        ],
        "semirelaxed": [
            semirelaxed(rng, n, m, symmetric, 0.4)
            for n, m in [(7, 10), (10, 7)] for symmetric in [True, False]
        ],
        "fingerprint": [fingerprint(rng, n, m) for n, m in [(9, 11), (12, 8)]],
    }
    here = Path(__file__).parent / "transport.json"
    here.write_text(json.dumps(out, indent=0) + "\n")


main()
