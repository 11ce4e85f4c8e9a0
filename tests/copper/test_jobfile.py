"""Job files: fields as numbers or strings, split dielectrics, gaps and errors."""

from __future__ import annotations

import json
from contextlib import suppress
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import jobfile
from splitcheck.copper.jobfile import Job, JobEntry, JobLayer
from splitcheck.errors import SplitcheckError


def _read(**parts: Any) -> Job:
    return jobfile.read(json.dumps(parts), "radio.gbrjob")


def test_whole_job_file() -> None:
    """Name, size, counts, files and stack-up are taken as they stand."""
    job = _read(
        GeneralSpecs={
            "ProjectId": {"Name": "radio"}, "Size": {"X": 55.1, "Y": "73.6"},
            "LayerNumber": 2, "BoardThickness": 1.6,
        },
        FilesAttributes=[
            {"Path": "sub/a.gtl", "FileFunction": "Copper,L1,Top", "FilePolarity": "Positive"},
            {"Path": "a.gbl", "FileFunction": "Copper,L2,Bot"},
        ],
        MaterialStackup=[
            {"Type": "Copper", "Thickness": 0.035, "Name": "Top"},
            {"Type": "Dielectric", "Thickness": "1.5", "Material": "FR4", "Name": "core",
             "DielectricConstant": "4.5", "LossTangent": 0.02},
            {"Type": "Copper", "Thickness": 0.035, "Name": "Bottom"},
        ],
    )  # fmt: skip
    assert job == Job(
        "radio", "radio.gbrjob", (55.1, 73.6), 2, 1.6,
        (JobEntry("a.gtl", ("Copper", "L1", "Top"), "Positive"),
         JobEntry("a.gbl", ("Copper", "L2", "Bot"), None)),
        (JobLayer("Copper", "Top", 0.035, None, None),
         JobLayer("Dielectric", "core", 1.5, "FR4", 4.5, 0.02),
         JobLayer("Copper", "Bottom", 0.035, None, None)),
        (),
    )  # fmt: skip
    assert job.copper_names() == ("Top", "Bottom")
    assert job.entry("x/A.GTL") == job.files[0]
    assert job.entry("b.gtl") is None


def test_split_dielectric_is_summed() -> None:
    """Parts of one dielectric join: thicknesses add, permittivities as capacitors in series."""
    part = {"Type": "Dielectric", "Material": "FR4"}
    job = _read(MaterialStackup=[
        part | {"Name": "A/B (1/2)", "Thickness": 0.1, "DielectricConstant": "4.0"},
        part | {"Name": "A/B (2/2)", "Thickness": 0.3, "DielectricConstant": 3.0, "Material": "PP"},
        part | {"Name": "B/C (1/1)", "Thickness": 0.2},
    ])  # fmt: skip
    first, second = job.stackup
    assert (first.name, first.thickness_mm, first.material) == ("A/B", 0.4, "FR4 + PP")
    # Two slabs in series: C = e0 / (d1/e1 + d2/e2), so er = (0.1 + 0.3)/(0.1/4 + 0.3/3) = 3.2.
    assert first.er == pytest.approx(3.2)
    assert (second.name, second.thickness_mm) == ("B/C", 0.2)


def test_gaps_are_remarked() -> None:
    """A job file without stack-up or thickness is read, and that is said."""
    job = _read(FilesAttributes=[], MaterialStackup=[{"Type": "Copper", "Name": "Top"}])
    assert job.stackup[0].thickness_mm is None
    assert any("no thickness for copper Top" in remark for remark in job.remarks)
    bare = _read(GeneralSpecs={"LayerNumber": "4"})
    assert (bare.layer_count, bare.size_mm, bare.name) == (4, None, "radio")
    assert len(bare.remarks) == 2


@pytest.mark.parametrize("value", ["x", "", None, True, "nan", float("inf"), [], -1])
def test_thickness_that_is_none(value: object) -> None:
    """A thickness that is no positive number counts as not given."""
    job = _read(MaterialStackup=[{"Type": "Copper", "Name": "Top", "Thickness": value}])
    assert job.stackup[0].thickness_mm is None


@pytest.mark.parametrize(
    ("text", "wrong"),
    [
        ("", r"radio\.gbrjob:1: is named as a job file but is not JSON"),
        ('{"GeneralSpecs": {},\n', r"radio\.gbrjob:2: .*not JSON"),
        ("%TF.FileFunction,x*%\n%TJ.B_Layer*%", "job file of the old kind"),
        ("[1, 2]", "holds a JSON list where a job file holds an object"),
        ('{"name": "package"}', "none of the parts of a job file"),
        ("[" * 200_000, "beyond reason"),
        ('{"GeneralSpecs": ' + "9" * 10_000 + "}", "beyond reason"),
        ('{"FilesAttributes": {"Path": "a"}}', "FilesAttributes is not a list of objects"),
        ('{"MaterialStackup": [1]}', "MaterialStackup is not a list of objects"),
        (json.dumps({"FilesAttributes": [{}] * 1001}), "1001 entries, over 1000"),
    ],
)
def test_errors(text: str, wrong: str) -> None:
    """What is no job file is said to be none, with what to do."""
    with pytest.raises(SplitcheckError, match=wrong):
        jobfile.read(text, "radio.gbrjob")


json_values = st.recursive(
    st.none() | st.booleans() | st.floats() | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner),
    max_leaves=10,
)


@given(json_values, json_values, json_values)
def test_any_json_ends_in_a_job_or_an_error_of_ours(a: object, b: object, c: object) -> None:
    """Whatever JSON stands there, reading ends without a crash."""
    with suppress(SplitcheckError):
        job = _read(GeneralSpecs=a, FilesAttributes=b, MaterialStackup=[{"Thickness": c}])
        assert job.source == "radio.gbrjob"
