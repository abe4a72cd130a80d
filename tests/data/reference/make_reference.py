"""Reference values for the tests of kinmark.

Regenerate with

    python3 tests/data/reference/make_reference.py

which overwrites reference.json beside this file.  Needs numpy, scipy,
scikit-learn and statsmodels; the versions used are stored under "versions".
Seeds are fixed and one thread is used, so two runs on one machine give the same
bytes; other versions or processors may differ in the last digits.

Matrices are lists of rows.  Landmarks and parcels are rows, variables and axes
are columns, and observation weights sum to one.  Every case has "inputs" and
"expected"; where one input serves several settings, "expected" is a list with
one object per setting.

Sign rule, wherever one is applied: the entry of largest absolute value of a
vector is positive.  The cases are checked to lie away from ties, so that signs
and directions do not hang on rounding.

The Linnerud data are the exercise and physiological measurements of twenty
men in a fitness club (A. C. Linnerud), as shipped with scikit-learn.
"""

import os

# Summation order depends on the number of threads; set before numpy is loaded.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"

import json
import math
import platform
from pathlib import Path

import numpy as np
import scipy
import scipy.linalg
import scipy.stats
import sklearn
import statsmodels
from sklearn.datasets import load_linnerud
from sklearn.metrics.pairwise import cosine_similarity
from statsmodels.multivariate.cancorr import CanCorr

# Smallest relative distance from a tie accepted in a reference case.
MARGIN = 1e-3


# ---------------------------------------------------------------- helpers


def fix_sign(v):
    """Apply the sign rule to a vector, refusing one where it is ambiguous."""
    high, low = v.max(), -v.min()
    assert abs(high - low) > MARGIN * max(high, low), "sign rule near a tie"
    return v if high > low else -v


def check_gaps(values):
    """Refuse a decreasing spectrum with two values close to each other."""
    gaps = -np.diff(values)
    assert np.all(gaps > MARGIN * values[0]), f"close spectrum: {values}"


def off_diagonal(n):
    return ~np.eye(n, dtype=bool)


def clipped(matrix):
    return np.where(matrix > 0, matrix, 0.0)


def random_orthogonal(rng, k, det):
    q, r = np.linalg.qr(rng.standard_normal((k, k)))
    q = q * np.sign(np.diag(r))
    if np.sign(np.linalg.det(q)) != det:
        q[:, 0] = -q[:, 0]
    return q


def random_correlation(rng, n, length):
    """Correlations of n series with two shared sources, exactly symmetric."""
    sources = rng.standard_normal((2, length))
    series = rng.standard_normal((n, 2)) @ sources
    series += 1.2 * rng.standard_normal((n, length))
    c = np.corrcoef(series)
    c = (c + c.T) / 2
    np.fill_diagonal(c, 1.0)
    return c


# ------------------------------------------------------------- procrustes


def procrustes_case(name, seed, n, k, det, scale, noise, uniform):
    rng = np.random.default_rng(seed)
    x = rng.standard_normal((n, k)) * np.linspace(1.6, 0.7, k) + rng.standard_normal(k)
    y = scale * x @ random_orthogonal(rng, k, det) + rng.standard_normal(k)
    y = y + noise * rng.standard_normal((n, k))
    w = np.full(n, 1.0 / n) if uniform else rng.dirichlet(np.full(n, 3.0))

    mean_x, mean_y = w @ x, w @ y
    xc, yc = x - mean_x, y - mean_y
    root = np.sqrt(w)[:, None]
    r, trace = scipy.linalg.orthogonal_procrustes(root * xc, root * yc)
    s = trace / np.sum(w[:, None] * xc**2)

    def residual(factor):
        return np.sum(w[:, None] * (factor * xc @ r - yc) ** 2)

    determinant = round(float(np.linalg.det(r)))
    assert determinant == det
    return {
        "name": name,
        "inputs": {"x": x, "y": y, "weights": w},
        "expected": {
            "rotation": r,
            "determinant": determinant,
            "mean_x": mean_x,
            "mean_y": mean_y,
            # The rotation is the same with and without scaling.
            "scaled": {
                "scale": s,
                "translation": mean_y - s * mean_x @ r,
                "residual": residual(s),
            },
            "unscaled": {
                "scale": 1.0,
                "translation": mean_y - mean_x @ r,
                "residual": residual(1.0),
            },
        },
    }


def procrustes():
    return [
        procrustes_case("uniform_12x5", 101, 12, 5, 1, 1.7, 0.3, True),
        procrustes_case("reflection_6x3", 102, 6, 3, -1, 0.6, 0.1, False),
        procrustes_case("weighted_14x8", 103, 14, 8, 1, 1.2, 0.4, False),
    ]


# ----------------------------------------------- canonical correlation


def canonical(x, y):
    """Correlations and absolute variates; the signs of variates are arbitrary."""
    n = len(x)
    fit = CanCorr(endog=y, exog=x)
    check_gaps(fit.cancorr)
    # The coefficients give variates of unit length; scale to unit variance
    # with divisor n.
    u = math.sqrt(n) * (x - x.mean(0)) @ fit.x_cancoef
    v = math.sqrt(n) * (y - y.mean(0)) @ fit.y_cancoef
    return {
        "correlations": fit.cancorr,
        "abs_variates_x": np.abs(u),
        "abs_variates_y": np.abs(v),
    }


def cca_linnerud():
    data = load_linnerud()
    x, y = np.asarray(data.data, float), np.asarray(data.target, float)
    expected = canonical(x, y)
    published = [0.7956, 0.2006, 0.0726]
    assert np.allclose(expected["correlations"], published, rtol=0, atol=5e-5)
    expected["published_correlations"] = published
    expected["published_source"] = (
        "SAS/STAT User's Guide, CANCORR procedure, fitness club example; "
        "cited from memory to four decimals"
    )
    return {
        "name": "linnerud_20x3",
        "inputs": {"x": x, "y": y},
        "expected": expected,
    }


def cca_random_case(name, seed, n, p, q, strengths):
    rng = np.random.default_rng(seed)
    k = len(strengths)
    x = rng.standard_normal((n, p))
    y = rng.standard_normal((n, q))
    y[:, :k] += x[:, :k] * strengths
    # Mix the variables, so that canonical axes are not the coordinate axes.
    x = x @ rng.standard_normal((p, p)) + rng.standard_normal(p)
    y = y @ rng.standard_normal((q, q)) + rng.standard_normal(q)
    return {"name": name, "inputs": {"x": x, "y": y}, "expected": canonical(x, y)}


def cca_random():
    return [
        cca_random_case("random_40x4x6", 201, 40, 4, 6, [2.0, 1.0, 0.5]),
        cca_random_case("random_15x3x3", 202, 15, 3, 3, [1.5, 0.7]),
    ]


# ------------------------------------------------------------- ridge CCA


def ridge_result(x, y, w, kappa):
    p, q = x.shape[1], y.shape[1]
    xc, yc = x - w @ x, y - w @ y
    sxx = xc.T @ (w[:, None] * xc)
    syy = yc.T @ (w[:, None] * yc)
    sxy = xc.T @ (w[:, None] * yc)
    rxx = sxx + kappa * np.trace(sxx) / p * np.eye(p)
    ryy = syy + kappa * np.trace(syy) / q * np.eye(q)

    to_y = np.linalg.solve(ryy, sxy.T)
    values, vectors = np.linalg.eig(np.linalg.solve(rxx, sxy) @ to_y)
    assert np.all(np.abs(values.imag) < 1e-9)
    order = np.argsort(-values.real, kind="stable")
    # Rounding can carry a value just past one when there is no ridge.
    rho = np.sqrt(np.minimum(values.real[order], 1.0))
    vectors = vectors[:, order]

    # Without ridge, and with more variables than centred observations, the two
    # column spaces meet: that many correlations are one and have no directions
    # of their own.
    n_tied = max(p + q - (len(x) - 1), 0) if kappa == 0 else 0
    assert np.all(rho[:n_tied] > 1 - 1e-9)
    rho[:n_tied] = 1.0
    check_gaps(rho[max(n_tied - 1, 0) :])

    tied = None
    if n_tied > 0:
        # Only the sum of a_k a_k' over the tied set is determined.
        span = np.hstack([vectors[:, :n_tied].real, vectors[:, :n_tied].imag])
        span = np.linalg.svd(span)[0][:, :n_tied]
        outer = span @ np.linalg.solve(span.T @ rxx @ span, span.T)
        tied = {
            "count": n_tied,
            "outer_x": outer,
            "outer_y": to_y @ outer @ to_y.T,
        }

    a_rows, b_rows = [], []
    correlations = [1.0] * n_tied
    for k in range(n_tied, len(rho)):
        a = vectors[:, k].real
        a = fix_sign(a / math.sqrt(a @ rxx @ a))
        b = to_y @ a / rho[k]
        assert abs(b @ ryy @ b - 1) < 1e-9
        a_rows.append(a)
        b_rows.append(b)
        u, v = xc @ a, yc @ b
        correlations.append((w * u) @ v / math.sqrt((w * u) @ u * ((w * v) @ v)))

    return {
        "kappa": kappa,
        "regularised_correlations": rho,
        "plain_correlations": correlations,
        "tied": tied,
        # One row per component, starting after the tied ones.
        "weights_x": a_rows,
        "weights_y": b_rows,
    }


def ridge_case(name, seed, n, p):
    rng = np.random.default_rng(seed)
    x = rng.standard_normal((n, p)) * np.linspace(1.5, 0.6, p)
    y = x * np.linspace(1.5, 0.3, p) + 0.8 * rng.standard_normal((n, p))
    y = y @ random_orthogonal(rng, p, 1) + rng.standard_normal(p)
    w = rng.dirichlet(np.full(n, 3.0))
    return {
        "name": name,
        "inputs": {"x": x, "y": y, "weights": w},
        "expected": [ridge_result(x, y, w, kappa) for kappa in (0.0, 0.1, 0.43)],
    }


def ridge_cca():
    return [
        ridge_case("ridge_12x4", 301, 12, 4),
        ridge_case("ridge_14x8", 302, 14, 8),
    ]


# -------------------------------------------------------------- diffusion


def diffusion_result(affinity, alpha, t):
    q = affinity.sum(1)
    k1 = affinity / np.outer(q, q) ** alpha
    d = k1.sum(1)
    values, vectors = np.linalg.eigh(k1 / np.sqrt(np.outer(d, d)))
    values, vectors = values[::-1], vectors[:, ::-1]
    assert abs(values[0] - 1) < 1e-12
    v0 = vectors[:, 0] * np.sign(vectors[:, 0].sum())
    assert v0.min() > 0

    lam = values[1:7]
    assert np.all(np.abs(lam) > MARGIN), "eigenvalue near zero"
    lam = lam[lam > 0]
    check_gaps(values[: len(lam) + 2])
    columns = []
    for k, value in enumerate(lam, start=1):
        factor = value / (1 - value) if t == 0 else value**t
        columns.append(fix_sign(vectors[:, k] / v0) * factor)
    return {
        "alpha": alpha,
        "t": t,
        "eigenvalues": lam,
        "coordinates": np.column_stack(columns),
    }


def diffusion_case(name, affinity):
    affinity = (affinity + affinity.T) / 2
    np.fill_diagonal(affinity, 1.0)
    assert affinity.min() >= 0
    settings = [(alpha, t) for alpha in (0.0, 0.5, 1.0) for t in (0.0, 1.0, 2.5)]
    return {
        "name": name,
        "inputs": {"affinity": affinity},
        "expected": [diffusion_result(affinity, alpha, t) for alpha, t in settings],
    }


def diffusion():
    rng = np.random.default_rng(401)
    dense = cosine_similarity(rng.gamma(0.6, 1.0, (12, 20)))

    # Directed sparse counts, denser between neighbours on a line.
    rng = np.random.default_rng(402)
    place = np.sort(rng.uniform(0, 1, 40))
    distance = np.abs(place[:, None] - place[None, :])
    counts = rng.poisson(3.0 * np.exp(-distance / 0.12)).astype(float)
    np.fill_diagonal(counts, 0.0)
    sparse = cosine_similarity(np.hstack([counts, counts.T]))
    assert np.any(sparse == 0)

    # Not positive semidefinite: fewer than six positive eigenvalues remain.
    rng = np.random.default_rng(403)
    indefinite = np.triu(rng.beta(0.5, 0.5, (8, 8)), 1)
    indefinite = indefinite + indefinite.T

    cases = [
        diffusion_case("dense_12", dense),
        diffusion_case("sparse_counts_40", sparse),
        diffusion_case("indefinite_8", indefinite),
    ]
    assert all(len(e["eigenvalues"]) < 6 for e in cases[2]["expected"])
    return cases


# ------------------------------------------------------------- components


def components_case(name, seed, n, p):
    rng = np.random.default_rng(seed)
    x = rng.standard_normal((n, 8)) * np.geomspace(3, 0.6, 8) @ rng.standard_normal((8, p))
    x += 0.8 * rng.standard_normal((n, p)) + rng.standard_normal(p)
    u, s, _ = np.linalg.svd(x - x.mean(0), full_matrices=False)
    # Centring takes one dimension away; drop the singular value that is zero
    # up to rounding when there are more columns than rows.
    rank = min(n - 1, p)
    assert np.all(s[rank:] < 1e-10 * s[0])
    s = s[:rank]
    check_gaps(s[:7])
    scores = np.column_stack([fix_sign(u[:, k] * s[k]) for k in range(6)])
    return {
        "name": name,
        "inputs": {"profiles": x},
        "expected": {
            "scores": scores,
            "singular_values": s,
            "variances": s**2 / (n - 1),
            "shares": s**2 / np.sum(s**2),
        },
    }


def components():
    return [
        components_case("wide_30x50", 501, 30, 50),
        components_case("tall_60x20", 502, 60, 20),
    ]


# --------------------------------------------------------------- affinity


def directed_weights(rng, n):
    w = rng.gamma(0.8, 2.0, (n, n)) * (rng.uniform(0, 1, (n, n)) < 0.6)
    np.fill_diagonal(w, 0.0)
    return w


def affinity_directed():
    rng = np.random.default_rng(601)
    w = directed_weights(rng, 8)
    profiles = np.hstack([w, w.T])
    assert np.all(profiles.sum(1) > 0)
    pearson = np.corrcoef(profiles)
    assert pearson.min() < 0
    return {
        "name": "directed_8",
        "inputs": {"weights": w},
        "expected": {
            "profiles": profiles,
            "cosine": clipped(cosine_similarity(profiles)),
            "pearson": clipped(pearson),
        },
    }


def strongest(z, share):
    """Rows of z cut to their strongest positive off-diagonal entries."""
    n = len(z)
    count = math.ceil(share * (n - 1))
    kept = np.zeros_like(z)
    for i in range(n):
        positive = np.sort([z[i, j] for j in range(n) if j != i and z[i, j] > 0])[::-1]
        # A row with too few positive entries keeps all of them.
        cut = positive[min(count, len(positive)) - 1]
        # Entries equal to the cut are all kept.
        for j in range(n):
            if j != i and z[i, j] >= cut:
                kept[i, j] = z[i, j]
    return kept


def fisher(c):
    z = np.zeros_like(c)
    mask = off_diagonal(len(c))
    z[mask] = np.arctanh(c[mask])
    return z


def affinity_correlation(name, c):
    z = fisher(c)
    assert c.min() < 0 and np.all((z > 0).any(1))
    expected = []
    for share in (0.1, 0.3, 0.5, 1.0):
        kept = strongest(z, share)
        expected.append(
            {"share": share, "kept": kept, "cosine": clipped(cosine_similarity(kept))}
        )
    return {
        "name": name,
        "inputs": {"correlation": c},
        "expected": expected,
    }


def affinity():
    distinct = random_correlation(np.random.default_rng(602), 8, 40)
    # One decimal, so that values tie within a row.
    tied = np.round(random_correlation(np.random.default_rng(629), 8, 40), 1)
    cases = [
        affinity_correlation("correlation_8", distinct),
        affinity_correlation("correlation_ties_8", tied),
    ]
    for result in cases[1]["expected"][:3]:
        count = math.ceil(result["share"] * 7)
        assert np.any((result["kept"] > 0).sum(1) > count), "no tie at the cut"
    return {"directed": [affinity_directed()], "correlation": cases}


# ------------------------------------------------------------- transforms


def transform_case(name, m, logs, z):
    n = len(m)
    mask = off_diagonal(n)
    entries = m[mask]

    def placed(values):
        out = np.zeros((n, n))
        out[mask] = values
        return out

    ranks = scipy.stats.rankdata(entries, method="average") / len(entries)
    zeros = entries == 0
    if zeros.any() and entries.min() >= 0:
        # Absent connections stay at zero.
        ranks = ranks - ranks[zeros][0]
    expected = {"ranks": placed(ranks), "log1p": None, "log_floor": None, "fisher_z": None}
    if logs:
        positive = entries[entries > 0]
        expected["log1p"] = placed(np.log1p(entries / np.median(positive)))
        floor = np.zeros_like(entries)
        floor[entries > 0] = 1 + np.log10(positive / positive.min())
        expected["log_floor"] = placed(floor)
    if z:
        expected["fisher_z"] = fisher(m)
    return {"name": name, "inputs": {"matrix": m}, "expected": expected}


def transforms():
    rng = np.random.default_rng(701)
    counts = rng.poisson(2.0, (6, 6)).astype(float)
    # A diagonal that has to be left out of medians, minima and ranks.
    np.fill_diagonal(counts, [0.0, 50.0, 0.5, 0.0, 7.0, 1.0])

    sparse = directed_weights(np.random.default_rng(702), 5)

    full = np.random.default_rng(703).lognormal(0, 2, (5, 5))
    np.fill_diagonal(full, 0.0)

    signed = random_correlation(np.random.default_rng(704), 6, 30)

    # Zeros beside negative entries: ranks are then left unshifted.
    signed_zeros = np.round(random_correlation(np.random.default_rng(705), 6, 30), 1) + 0.0
    mask = off_diagonal(6)
    assert np.any(signed_zeros[mask] == 0) and signed_zeros.min() < 0

    # The median is taken over an even and an odd number of entries.
    parity = {int((m[off_diagonal(len(m))] > 0).sum()) % 2 for m in (counts, sparse, full)}
    assert parity == {0, 1}

    return [
        transform_case("counts_diagonal_6", counts, True, False),
        transform_case("sparse_5", sparse, True, False),
        transform_case("full_5", full, True, False),
        transform_case("signed_6", signed, False, True),
        transform_case("signed_zeros_6", signed_zeros, False, True),
    ]


# ----------------------------------------------------------------- output


def plain(value):
    """Arrays to lists, numpy scalars to Python ones, negative zero to zero."""
    if isinstance(value, dict):
        return {key: plain(item) for key, item in value.items()}
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    if isinstance(value, (float, np.floating)):
        return float(value) + 0.0
    return value


def dumped(value, depth=0):
    """JSON with one matrix row per line."""
    nested = (dict, list)
    pad = "\n" + " " * (depth + 1)
    end = "\n" + " " * depth
    if isinstance(value, dict) and value:
        items = [f"{json.dumps(k)}: {dumped(v, depth + 1)}" for k, v in value.items()]
        return "{" + pad + ("," + pad).join(items) + end + "}"
    if isinstance(value, list) and any(isinstance(item, nested) for item in value):
        items = [dumped(item, depth + 1) for item in value]
        return "[" + pad + ("," + pad).join(items) + end + "]"
    return json.dumps(value, allow_nan=False)


def main():
    reference = {
        "versions": {
            "python": platform.python_version(),
            "numpy": np.__version__,
            "scipy": scipy.__version__,
            "scikit-learn": sklearn.__version__,
            "statsmodels": statsmodels.__version__,
        },
        "procrustes": procrustes(),
        "cca_linnerud": cca_linnerud(),
        "cca_random": cca_random(),
        "ridge_cca": ridge_cca(),
        "diffusion": diffusion(),
        "components": components(),
        "affinity": affinity(),
        "transforms": transforms(),
    }
    target = Path(__file__).resolve().parent / "reference.json"
    with open(target, "w", encoding="utf-8", newline="\n") as out:
        out.write(dumped(plain(reference)) + "\n")


if __name__ == "__main__":
    main()
