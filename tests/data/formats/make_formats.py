"""Writes one small directed matrix in every format kinmark reads, by the programs people use.

    python3 tests/data/formats/make_formats.py

needs numpy, scipy and nibabel, and overwrites the files beside it; versions.txt says which versions
wrote them. The same versions write the same bytes.
"""

import gzip
import io
import platform
import zipfile
from pathlib import Path

import nibabel
import numpy
import scipy
import scipy.io
from nibabel.cifti2 import Cifti2Image, ParcelsAxis

HERE = Path(__file__).parent
LABELS = ["V1", "A1", "M1", "hippocampus", "Tê, <lateral>"]
# Row = source, column = target. Every value is exact in single precision and no row or column is
# like another, so that a transposed or shifted matrix is noticed.
MATRIX = numpy.array(
    [
        [0, 12, 3, 0, 0.5],
        [8, 0, 0, 5, 0.25],
        [1, 0, 0, 410, 2],
        [0, 7, 380, 0, 0.125],
        [6, 0, 9, 4, 0],
    ]
)
WHOLE = numpy.floor(MATRIX)


def write(name, data):
    (HERE / name).write_bytes(data.encode() if isinstance(data, str) else data)


def number(value):
    return format(value, "g")


def cell(label, separator):
    return f'"{label}"' if separator in label else label


def table(separator, header=True, column=True, missing=None):
    lines = []
    if header:
        lines.append(([""] if column else []) + [cell(x, separator) for x in LABELS])
        if column:
            lines[0][0] = "parcel"
    for i, label in enumerate(LABELS):
        cells = [number(v) for v in MATRIX[i]]
        if missing is not None:
            cells[i] = missing
        lines.append(([cell(label, separator)] if column else []) + cells)
    return "".join(separator.join(line) + "\n" for line in lines)


def text():
    write("labels.txt", "".join(label + "\n" for label in LABELS))
    write("labelled.csv", table(","))
    write("labelled.tsv", table("\t"))
    write("header-only.csv", table(",", column=False))
    write("column-only.csv", table(",", header=False))
    write("bare.csv", table(",", header=False, column=False))
    bids = table("\t", column=False, missing="n/a")
    write("sub-1_relmat.tsv", bids)
    write("sub-2_relmat.tsv", table("\t", missing="n/a"))
    saved = io.StringIO()
    numpy.savetxt(saved, MATRIX)
    write("savetxt.txt", saved.getvalue())
    write("labelled.csv.gz", gzip.compress(table(",").encode(), mtime=0))
    write("bare.csv.gz", gzip.compress(table(",", header=False, column=False).encode(), mtime=0))
    for name, separator in [("edges.csv", ","), ("edges.tsv", "\t")]:
        lines = [separator.join(["source", "target", "weight"])]
        # Backwards, so that the order must come from the labels.
        for i in reversed(range(len(LABELS))):
            for j in range(len(LABELS)):
                if MATRIX[i, j] != 0:
                    ends = [cell(LABELS[k], separator) for k in (i, j)]
                    lines.append(separator.join(ends + [number(MATRIX[i, j])]))
        write(name, "\n".join(lines) + "\n")


def npy(array):
    out = io.BytesIO()
    numpy.save(out, array)
    return out.getvalue()


def npz(arrays, compression):
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", compression) as archive:
        for name, array in arrays.items():
            archive.writestr(zipfile.ZipInfo(name + ".npy"), npy(array), compression)
    return out.getvalue()


def numpy_files():
    write("f8.npy", npy(MATRIX))
    write("f4.npy", npy(MATRIX.astype("<f4")))
    write("f8-big.npy", npy(MATRIX.astype(">f8")))
    write("f8-fortran.npy", npy(numpy.asfortranarray(MATRIX)))
    for kind in ["u1", "i1", "u2", "i2", "u4", "i4", "u8", "i8"]:
        # 8 bits hold no 410; the tests compare with the remainder.
        whole = WHOLE % 100 if kind.endswith("1") else WHOLE
        write(f"{kind}.npy", npy(whole.astype(kind)))
    write("i4-big.npy", npy(WHOLE.astype(">i4")))
    write("bool.npy", npy(MATRIX > 0))
    write("complex.npy", npy(MATRIX.astype("c16")))
    write("cube.npy", npy(numpy.stack([MATRIX, MATRIX])))
    write("list.npy", npy(MATRIX[0]))
    write("records.npy", npy(numpy.zeros(3, dtype=[("x", "<f8"), ("y", "<i4")])))
    labels = numpy.array(LABELS)
    encoded = numpy.array([label.encode() for label in LABELS])
    arrays = {"weights": MATRIX, "labels": labels, "lengths": MATRIX[0]}
    write("stored.npz", npz(arrays, zipfile.ZIP_STORED))
    write("deflated.npz", npz(arrays, zipfile.ZIP_DEFLATED))
    write("bytes.npz", npz({"weights": MATRIX, "labels": encoded}, zipfile.ZIP_DEFLATED))
    several = {
        "weights": MATRIX,
        "lengths": MATRIX.T,
        "labels": labels,
        "lobes": numpy.array(["o", "t", "f", "t", "t"]),
        "cube": numpy.zeros((2, 2, 2)),
    }
    write("several.npz", npz(several, zipfile.ZIP_DEFLATED))
    write("nothing.zip", zipped({"readme.txt": b"no arrays here\n"}))


def zipped(files):
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w") as archive:
        for name, data in files.items():
            archive.writestr(zipfile.ZipInfo(name), data)
    return out.getvalue()


def mat(variables, compressed):
    out = io.BytesIO()
    scipy.io.savemat(out, variables, do_compression=compressed)
    data = bytearray(out.getvalue())
    # The header holds the time of writing.
    data[:116] = b"MATLAB 5.0 MAT-file, written by scipy".ljust(116)
    return bytes(data)


def matlab_files():
    cells = numpy.array(LABELS, dtype=object)
    variables = {"weights": MATRIX, "names": cells, "threshold": 0.5}
    write("plain.mat", mat(variables, False))
    write("compressed.mat", mat(variables, True))
    write("single.mat", mat({"weights": MATRIX.astype("f4"), "names": cells}, True))
    write("integers.mat", mat({"weights": WHOLE.astype("i2"), "names": cells}, False))
    # Texts of one length become rows of characters.
    write("characters.mat", mat({"weights": MATRIX, "names": numpy.array(["ab", "c", "de", "f", "g"])}, False))
    several = {
        "weights": MATRIX,
        "lengths": MATRIX.T,
        "names": cells,
        "cube": numpy.zeros((2, 2, 2)),
        "mask": MATRIX > 0,
        "phase": MATRIX * 1j,
        "thin": scipy.sparse.csc_matrix(MATRIX),
        "about": {"by": "nobody"},
    }
    write("several.mat", mat(several, True))


def parcels():
    voxels = [numpy.array([[i, 0, 0]]) for i in range(len(LABELS))]
    return ParcelsAxis(LABELS, voxels, [{}] * len(LABELS), affine=numpy.eye(4), volume_shape=(5, 1, 1), nvertices={})


def cifti_files():
    # nibabel's first axis is CIFTI's matrix dimension 0, that along a row: the target.
    for name, kind in [("f4.pconn.nii", "<f4"), ("f8.pconn.nii", "<f8")]:
        image = Cifti2Image(MATRIX.T.astype(kind), (parcels(), parcels()))
        image.update_headers()
        image.nifti_header.set_data_dtype(kind)
        image.nifti_header.set_intent("ConnParcels")
        write(name, image.to_bytes())
    scalars = nibabel.cifti2.ScalarAxis(["one", "two"])
    image = Cifti2Image(MATRIX[:2].astype("<f4"), (scalars, parcels()))
    image.update_headers()
    write("pscalar.nii", image.to_bytes())
    image = nibabel.Nifti2Image(numpy.zeros((4, 4, 4), dtype="f4"), numpy.eye(4))
    write("image2.nii", image.to_bytes())
    image = nibabel.Nifti1Image(numpy.zeros((4, 4, 4), dtype="f4"), numpy.eye(4))
    write("image1.nii", image.to_bytes())


text()
numpy_files()
matlab_files()
cifti_files()
write(
    "versions.txt",
    f"Python {platform.python_version()}\nnumpy {numpy.__version__}\n"
    f"scipy {scipy.__version__}\nnibabel {nibabel.__version__}\n",
)
