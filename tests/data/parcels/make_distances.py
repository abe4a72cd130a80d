"""Connection strength over distance: a small invented species for the tests of kinmark.

Regenerate with

    python3 tests/data/parcels/make_distances.py

which overwrites the other files beside this one: a directed matrix with absent
connections and ties, its table of parcels, a matrix of distances in another
order of the parcels and with a parcel too many, and expected.json with the rank
correlations that scipy gives. Needs numpy and scipy; the versions used are
stored in expected.json. The seed is fixed.
"""

import json
import platform
from pathlib import Path

import numpy as np
import scipy
from scipy.spatial.distance import pdist, squareform
from scipy.stats import spearmanr

HERE = Path(__file__).parent
N = 14
rng = np.random.default_rng(20)

labels = [f"p{i:02d}" for i in range(N)]
places = np.round(rng.normal(scale=20.0, size=(N, 3)), 2)
straight = squareform(pdist(places))
# Along a folded surface everything is further apart, and not everything by as much.
bend = rng.uniform(1.1, 1.9, size=(N, N))
along = np.round(straight * (bend + bend.T) / 2, 3)

strength = np.exp(-along / 25.0) * rng.lognormal(sigma=0.7, size=(N, N))
weights = np.round(40 * strength)  # few values: many ties, many zeros
np.fill_diagonal(weights, 0)


def write(name, labels, values):
    rows = [",".join(["parcel", *labels])]
    rows += [",".join([label, *(repr(float(v)) for v in row)]) for label, row in zip(labels, values)]
    (HERE / name).write_text("\n".join(rows) + "\n")


write("weights.csv", labels, weights)
order = rng.permutation(N + 1)
wider = np.pad(along, (0, 1), constant_values=99.0)
wider[N, N] = 0.0
all_labels = [*labels, "elsewhere"]
write("distances.csv", [all_labels[i] for i in order], wider[np.ix_(order, order)])
rows = ["label,x,y,z"] + [",".join([l, *map(repr, map(float, p))]) for l, p in zip(labels, places)]
(HERE / "places.csv").write_text("\n".join(rows) + "\n")

off = ~np.eye(N, dtype=bool)
linked = off & (weights != 0)
upper = np.triu(off)


def figures(distance):
    return {
        "connections": int(linked.sum()),
        "smallest": float(distance[upper].min()),
        "largest": float(distance[upper].max()),
        "over_connections": float(spearmanr(weights[linked], distance[linked]).statistic),
        "over_all": float(spearmanr(weights[off], distance[off]).statistic),
    }


expected = {
    "versions": {
        "python": platform.python_version(),
        "numpy": np.__version__,
        "scipy": scipy.__version__,
    },
    "file": figures(along),
    "coordinates": figures(straight),
}
(HERE / "expected.json").write_text(json.dumps(expected, indent=2) + "\n")
