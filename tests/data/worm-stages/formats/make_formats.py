#!/usr/bin/env python3
"""Writes the worm matrices of the folder above in every format, with the programs people use.

    python3 tests/data/worm-stages/formats/make_formats.py

needs numpy, scipy and nibabel; versions.txt says which versions wrote what is here. A square table of
one-letter codes would do for most tests; this one shows that a real study does not depend on how its
matrices were saved.
"""

import csv
import gzip
import platform
from pathlib import Path

import nibabel
import numpy
import scipy
import scipy.io
from nibabel.cifti2 import Cifti2Image, ParcelsAxis

HERE = Path(__file__).parent


def write(name, data):
    (HERE / name).write_bytes(data)


def parcels(labels):
    none = numpy.empty((0, 3), dtype=int)
    return ParcelsAxis(labels, [none] * len(labels), [{}] * len(labels))


for side in "ab":
    text = (HERE.parent / f"{side}.csv").read_text()
    rows = list(csv.reader(text.splitlines()))
    labels = rows[0][1:]
    assert labels == [row[0] for row in rows[1:]]
    matrix = numpy.array([[float(cell) for cell in row[1:]] for row in rows[1:]])
    write(f"{side}.txt", "".join(label + "\n" for label in labels).encode())
    write(f"{side}.csv.gz", gzip.compress(text.encode(), mtime=0))
    tabs = "\n".join("\t".join(row) for row in rows) + "\n"
    write(f"{side}.tsv.gz", gzip.compress(tabs.encode(), mtime=0))
    semicolons = "\n".join(";".join(row[1:]) for row in rows[1:]) + "\n"
    write(f"{side}_bare.csv.gz", gzip.compress(semicolons.encode(), mtime=0))
    edges = "source,target,weight\n" + "".join(
        f"{labels[i]},{labels[j]},{matrix[i, j]:g}\n" for i, j in zip(*numpy.nonzero(matrix))
    )
    write(f"{side}_edges.csv", edges.encode())
    numpy.save(HERE / f"{side}.npy", numpy.asfortranarray(matrix.astype("u1")))
    numpy.savez_compressed(
        HERE / f"{side}.npz", weights=matrix.astype("f4"), neurons=numpy.array(labels)
    )
    scipy.io.savemat(
        HERE / f"{side}.mat",
        {"weights": matrix, "neurons": numpy.array(labels, dtype=object)},
        do_compression=True,
    )
    image = Cifti2Image(matrix.T.astype("<f4"), (parcels(labels), parcels(labels)))
    image.update_headers()
    image.nifti_header.set_data_dtype("<f4")
    image.nifti_header.set_intent("ConnParcels")
    write(f"{side}.pconn.nii", image.to_bytes())

write(
    "versions.txt",
    (
        f"Python {platform.python_version()}\nnumpy {numpy.__version__}\n"
        f"scipy {scipy.__version__}\nnibabel {nibabel.__version__}\n"
    ).encode(),
)
