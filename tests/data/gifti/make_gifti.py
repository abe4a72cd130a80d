"""Writes one small surface of labels in every coding of GIFTI, by nibabel.

    python3 tests/data/gifti/make_gifti.py

needs numpy and nibabel, and overwrites the files beside it; versions.txt says which versions wrote
them. expected.csv holds the label of each vertex as nibabel reads it back.
"""

import csv
import gzip
import platform
from pathlib import Path

import nibabel
import numpy
from nibabel.gifti import (
    GiftiCoordSystem,
    GiftiDataArray,
    GiftiImage,
    GiftiLabel,
    GiftiLabelTable,
    GiftiMetaData,
)

HERE = Path(__file__).parent
NAMES = {0: "???", 3: "calcarine", 7: "auditory", 12: "Tê, <lateral> & \"so\"", 300: "motor"}
KEYS = numpy.array([3, 3, 0, 7, 12, 300, 3, 7, 12, 12, 0, 300, 7], dtype=numpy.int32)
CODINGS = {
    "ascii": "GIFTI_ENCODING_ASCII",
    "base64": "GIFTI_ENCODING_B64BIN",
    "gzip": "GIFTI_ENCODING_B64GZ",
}


def table(names=NAMES):
    labels = GiftiLabelTable()
    for key, name in names.items():
        label = GiftiLabel(key=key, red=0.5, green=0.25, blue=0, alpha=1)
        label.label = name
        labels.labels.append(label)
    return labels


def array(keys, encoding="GIFTI_ENCODING_B64GZ", intent="NIFTI_INTENT_LABEL", datatype=None):
    return GiftiDataArray(
        keys,
        intent=intent,
        datatype=datatype,
        encoding=encoding,
        coordsys=GiftiCoordSystem(),
        meta=GiftiMetaData({"Name": "parcels"}),
    )


def image(arrays, labels=None):
    return GiftiImage(
        darrays=arrays,
        labeltable=labels or table(),
        meta=GiftiMetaData({"AnatomicalStructurePrimary": "CortexLeft"}),
    )


def write(name, built):
    (HERE / name).write_bytes(built.to_bytes())


for word, encoding in CODINGS.items():
    write(f"{word}.label.gii", image([array(KEYS, encoding)]))
    if word != "ascii":
        # nibabel writes the machine's own order of bytes, but reads either.
        turned = image([array(KEYS.astype(">i4").view("<i4"), encoding)]).to_bytes()
        assert turned.count(b'"LittleEndian"') == 1
        (HERE / f"{word}-big.label.gii").write_bytes(turned.replace(b'"LittleEndian"', b'"BigEndian"'))
# nibabel makes these types only if told so, and other programs do write them.
NARROW = {0: "???", 3: "calcarine", 7: "auditory", 12: "Tê, <lateral> & \"so\"", 200: "motor"}
SMALL = numpy.where(KEYS == 300, 200, KEYS)
write("uint8.label.gii", image([array(SMALL.astype("u1"), datatype="NIFTI_TYPE_UINT8")], table(NARROW)))
write("float32.label.gii", image([array(KEYS.astype("f4"), datatype="NIFTI_TYPE_FLOAT32")]))
# Maps that are no labels stand before, other labels behind.
values = array(numpy.linspace(0, 1, len(KEYS), dtype="f4"), intent="NIFTI_INTENT_SHAPE")
write("several.label.gii", image([values, array(KEYS), array(KEYS[::-1].copy())]))
write("shape.shape.gii", image([values]))
plain = image([array(KEYS)]).to_bytes()
(HERE / "gzipped.label.gii.gz").write_bytes(gzip.compress(plain, mtime=0))

expected = None
for path in sorted(HERE.glob("*.label.gii")):
    read = nibabel.load(path)
    names = read.labeltable.get_labels_as_dict()
    darray = read.get_arrays_from_intent("NIFTI_INTENT_LABEL")[0]
    labels = [names[int(key)] for key in darray.data]
    assert expected in (None, labels), path
    expected = labels
with open(HERE / "expected.csv", "w", newline="") as out:
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(["vertex", "label"])
    writer.writerows(enumerate(expected))
(HERE / "versions.txt").write_text(
    f"Python {platform.python_version()}\nnumpy {numpy.__version__}\nnibabel {nibabel.__version__}\n"
)
