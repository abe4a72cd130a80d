"""Opens maps painted by kinmark with nibabel, warnings being errors, and compares every vertex with
the tables of the run.

    kinmark locate species-demo/study.toml --out demo-run
    kinmark paint demo-run --species Pellivane --labels species-demo/b.label.gii --parcel Plalo
    python3 tests/data/gifti/check_painted.py demo-run Pellivane species-demo/b.label.gii demo-run-maps/b.*.func.gii

needs numpy and nibabel.
"""

import csv
import json
import sys
import warnings
from pathlib import Path

warnings.simplefilter("error")

import nibabel  # noqa: E402
import numpy  # noqa: E402


def table(path):
    with open(path, newline="") as file:
        return list(csv.DictReader(file))


def expected(run, species, name):
    """From the name of a map to the value of each parcel that has one."""
    record = json.loads((run / "run.json").read_text())
    names = [record["species"][side]["name"] for side in "ab"]
    other = names[1 - names.index(species)]
    positions = [r for r in table(run / "positions.csv") if r["species"] == species]
    counterparts = table(run / "counterparts.csv")
    if name in positions[0]:
        return {r["parcel"]: float(r[name]) for r in positions}
    if name.startswith("first_"):
        column = name.removeprefix("first_")
        firsts = [r for r in counterparts if r["from"] == species and r["rank"] == "1"]
        return {r["parcel"]: float(r[column]) for r in firsts}
    column, asked = name.split(" for ")
    parcel = asked.removesuffix(f" of {other}")
    listed = [r for r in counterparts if r["from"] == other and r["parcel"] == parcel]
    return {r["counterpart"]: float(r[column]) for r in listed}


def main(run, species, label_file, *maps):
    run = Path(run)
    labels = nibabel.load(label_file)
    names = labels.labeltable.get_labels_as_dict()
    label = [names.get(int(k), "") for k in labels.get_arrays_from_intent("NIFTI_INTENT_LABEL")[0].data]
    checked = 0
    for path in maps:
        image = nibabel.load(path)
        assert image.meta.get("AnatomicalStructurePrimary") == labels.meta.get("AnatomicalStructurePrimary")
        assert "not a target" in image.meta["Caution"], path
        for array in image.darrays:
            assert array.data.dtype == numpy.float32 and array.data.shape == (len(label),), path
            values = expected(run, species, array.meta["Name"])
            assert values, array.meta["Name"]
            should = numpy.array([values.get(x, numpy.nan) for x in label]).astype("f4")
            numpy.testing.assert_array_equal(array.data, should, err_msg=f"{path} {array.meta['Name']}")
            checked += int(numpy.isfinite(should).sum())
            print(f"{path}: {array.meta['Name']}: {numpy.isfinite(should).sum()} of {len(should)} vertices with a value")
        # What nibabel writes again is what it reads again.
        again = nibabel.GiftiImage.from_bytes(image.to_bytes())
        for one, two in zip(image.darrays, again.darrays):
            numpy.testing.assert_array_equal(one.data, two.data)
    assert checked
    print(f"{checked} values equal, nibabel {nibabel.__version__}, numpy {numpy.__version__}")


main(*sys.argv[1:])
