"""What each exported file is taken for, over small hand-made exports."""

from __future__ import annotations

import json
import os
import re
import stat
import struct
import zipfile
from contextlib import suppress
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import archive, intake, ordering
from splitcheck.copper.intake import Export, open_export
from splitcheck.errors import SplitcheckError

GERBER = "%FSLAX46Y46*%\n%MOMM*%\n%ADD10C,0.2*%\nD10*\nX0Y0D02*\nX1000000Y0D01*\nM02*\n"
DRILL = "M48\nMETRIC\nT1C0.3\n%\nT1\nX1.0Y1.0\nM30\n"
IPC = (
    "P  UNITS CUST 0\n"
    "327GND              R1    -1          A01X+010000Y-005000X0236Y0236R000 S2\n999\n"
)


def _gerber(extra: str = "") -> str:
    return extra + GERBER


def _fill(folder: Path, files: dict[str, str | bytes]) -> Path:
    folder.mkdir(parents=True, exist_ok=True)
    for name, content in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content.encode() if isinstance(content, str) else content)
    return folder


def _copper_names(export: Export) -> list[str]:
    return [f.name for f in export.copper()]


def _kinds(export: Export) -> dict[str, str]:
    return {f.name: f.kind for f in export.files}


def _function(*fields: str) -> str:
    return f"%TF.FileFunction,{','.join(fields)}*%\n"


def test_attributes_decide_over_names(tmp_path: Path) -> None:
    """A file whose attributes say L2 is layer 2 even if its name says bottom."""
    files: dict[str, str | bytes] = {
        "bottom.gbr": _gerber(_function("Copper", "L2", "Inr")),
        "a.gbr": _gerber(_function("Copper", "L1", "Top")),
        "b.gbr": _gerber("G04 #@! TF.FileFunction,Copper,L3,Bot*\n"),
        "c.gbr": _gerber(_function("Profile", "NP")),
        "d.gbr": _gerber(_function("Soldermask", "Top")),
        "e.drl": DRILL,
    }
    export = open_export(_fill(tmp_path, files))
    assert _copper_names(export) == ["a.gbr", "bottom.gbr", "b.gbr"]
    assert [f.copper_number for f in export.copper()] == [1, 2, 3]
    assert _kinds(export)["c.gbr"] == "profile"
    assert _kinds(export)["d.gbr"] == "mask"
    assert _kinds(export)["e.drl"] == "drill"
    assert "Copper,L2,Inr" in export.copper()[1].reason
    assert not export.assumptions


@pytest.mark.parametrize(
    "names",
    [
        ["x.GTL", "x.G1", "x.G2", "x.GBL"],
        ["x.gtl", "x.g2", "x.g3", "x.gbl"],
        ["x.GTL", "x.G2L", "x.G3L", "x.GBL"],
        ["x.cmp", "x.ly2", "x.ly15", "x.sol"],
        ["x-F_Cu.gbr", "x-In1_Cu.gbr", "x-In2_Cu.gbr", "x-B_Cu.gbr"],
        ["x-F.Cu.gbr", "x-In1.Cu.gbr", "x-In10.Cu.gbr", "x-B.Cu.gbr"],
        ["Top Layer.gbr", "Inner 1.gbr", "Inner 2.gbr", "Bottom Layer.gbr"],
        ["L01.art", "L02.art", "L03.art", "L04.art"],
        ["brd_layer1.ger", "brd_layer2.ger", "brd_layer3.ger", "brd_layer4.ger"],
        ["TOP.gbr", "GND.gbr", "PWR.gbr", "BOTTOM.gbr"],
        ["TOP.gbr", "L02_GND.gbr", "L03_PWR.gbr", "BOT.gbr"],
        ["CopperTop.gbr", "MidLayer1.gbr", "MidLayer2.gbr", "CopperBottom.gbr"],
        ["b.Top", "b.In1", "b.In2", "b.Bot"],
        ["01_TOP.gbr", "02_SIG.gbr", "03_GND.gbr", "04_BOTTOM.gbr"],
        ["art001.pho", "art002.pho", "art003.pho", "art004.pho"],
        ["EtchLayer1Top.gdo", "EtchLayer2.gdo", "EtchLayer3.gdo", "EtchLayer4Bottom.gdo"],
        [
            "Gerber_TopLayer.GTL",
            "Gerber_InnerLayer1.G1",
            "Gerber_InnerLayer2.G2",
            "Gerber_BottomLayer.GBL",
        ],
        ["Top Layer.gbr", "Internal Plane 1.gbr", "Internal Plane 2.gbr", "Bottom Layer.gbr"],
    ],
)
def test_order_from_names_of_the_trade(names: list[str], tmp_path: Path) -> None:
    """Each file-name convention gives the order top to bottom."""
    export = open_export(_fill(tmp_path, dict.fromkeys(names, GERBER)))
    assert _copper_names(export) == names


def test_other_films_are_not_copper(tmp_path: Path) -> None:
    """Masks, pastes, legends, drawings and outlines are told from copper by their names."""
    expected = {
        "b-F_Cu.gbr": "copper", "b-B_Cu.gbr": "copper", "b-F_Mask.gbr": "mask",
        "b-B_Paste.gbr": "paste", "b-F_SilkS.gbr": "legend", "b-Edge_Cuts.gbr": "profile",
        "b-F_Fab.gbr": "other", "b.GTS": "mask", "b.GTO": "legend", "b.GBP": "paste",
        "b-drill_map.gbr": "other", "b-drl.gbr": "other", "b-Top Solder.gbr": "mask",
        "b-Top Solder.gts": "mask", "b-Fab Notes.gm1": "other", "b-F_CrtYd.gbr": "other",
    }  # fmt: skip
    export = open_export(_fill(tmp_path, dict.fromkeys(expected, GERBER)))
    assert _kinds(export) == expected


def test_layer_order_in_a_writers_comment(tmp_path: Path) -> None:
    """A physical layer number in a comment orders layers whose names do not."""
    files: dict[str, str | bytes] = {
        "b.GTL": _gerber("G04 Layer_Physical_Order=1*\n"),
        "b.GP1": _gerber("G04 Layer_Physical_Order=3*\n"),
        "b.G1": _gerber("G04 Layer_Physical_Order=2*\n"),
        "b.GBL": _gerber("G04 Layer_Physical_Order=4*\n"),
    }
    export = open_export(_fill(tmp_path, files))
    assert _copper_names(export) == ["b.GTL", "b.G1", "b.GP1", "b.GBL"]
    assert not export.assumptions


def test_etch_layers_named_in_a_films_header(tmp_path: Path) -> None:
    """A film whose header names an etch layer is copper of that name; a coupon is not used."""
    films = {"f1.art": "TOP", "f2.art": "GND_L2", "f3.art": "PWR_L3", "f4.art": "BOTTOM"}
    files: dict[str, str | bytes] = {
        name: _gerber(f"G04 Layer:  PIN/{layer}*\nG04 Layer:  ETCH/{layer}*\n")
        for name, layer in films.items()
    }
    files["x.gbr"] = _gerber("%TF.Part,Coupon*%\n" + _function("Copper", "L1", "Top"))
    export = open_export(_fill(tmp_path, files))
    assert _copper_names(export) == list(films)
    assert [f.layer_name for f in export.copper()] == list(films.values())
    assert _kinds(export)["x.gbr"] == "other"


def test_roles_without_order_are_arranged_by_custom_and_said(tmp_path: Path) -> None:
    """Planes and signal layers without numbers are laid as stacks are, and it is an assumption."""
    names = ["TOP", "GND1", "SIG1-X", "SIG2-Y", "GND2", "PWR", "SIG3-X", "SIG4-Y", "GND3", "BOTTOM"]
    files: dict[str, str | bytes] = {f"b-{name}.gbr": GERBER for name in sorted(names)}
    export = open_export(_fill(tmp_path, files))
    assert [f.layer_name for f in export.copper()] == names
    assert any("--stack FILE.toml" in text for text in export.assumptions)


def test_arrangement_puts_planes_beside_signals() -> None:
    """Six layers with two planes: one plane under each outer layer, ground first."""
    rows = [
        ("SIG1", "signal", 1),
        ("SIG2", "signal", 2),
        ("PWR", "supply", None),
        ("GND", "ground", None),
    ]
    inner = [
        ordering.Candidate(n, n, "inner", role, number, role, "name")  # type: ignore[arg-type]
        for n, role, number in rows
    ]
    ends = [ordering.Candidate(n, n, n, "", None, None, "name") for n in ("top", "bottom")]
    stack, assumptions = ordering.order([*inner, *ends])
    assert [c.file for c in stack] == ["top", "GND", "SIG1", "SIG2", "PWR", "bottom"]
    assert assumptions


@given(st.permutations(range(6)))
def test_order_does_not_depend_on_the_order_of_files(order: list[int]) -> None:
    """The same candidates in any order give the same stack."""
    names = ["top", "gnd1", "sig1", "pwr", "gnd2", "bottom"]
    roles = {"gnd": "ground", "sig": "signal", "pwr": "supply"}
    rows = [
        ordering.Candidate(
            n, n, n if n in ("top", "bottom") else "inner", n[:3],
            int(n[3:]) if n[3:].isdecimal() else None, roles.get(n[:3]), "name",  # type: ignore[arg-type]
        )
        for n in names
    ]  # fmt: skip
    assert ordering.order([rows[i] for i in order]) == ordering.order(rows)


def test_missing_layer_number_is_an_error(tmp_path: Path) -> None:
    """Files that say L1 and L3 of a board lack L2, and that is said."""
    files: dict[str, str | bytes] = {
        "a.gbr": _gerber(_function("Copper", "L1", "Top")),
        "b.gbr": _gerber(_function("Copper", "L3", "Bot")),
    }
    with pytest.raises(SplitcheckError, match="no file is L2; add the missing file"):
        open_export(_fill(tmp_path, files))
    both = open_export(tmp_path, layers=[(1, "a.gbr"), (2, "b.gbr")])
    assert _copper_names(both) == ["a.gbr", "b.gbr"]


def test_two_files_for_one_layer(tmp_path: Path) -> None:
    """Two different files for one layer are an error that names both; equal ones are not."""
    _fill(tmp_path, {"a.gtl": GERBER, "b-top.gbr": _gerber("G04 other*\n"), "b.gbl": GERBER})
    with pytest.raises(SplitcheckError, match=r"b-top\.gbr: claims the same .*\(top\) as a\.gtl"):
        open_export(tmp_path)
    _fill(tmp_path, {"b-top.gbr": GERBER})
    export = open_export(tmp_path)
    assert _copper_names(export) == ["a.gtl", "b.gbl"]
    assert any("same file as a.gtl" in remark for remark in export.remarks)


def test_stack_option_overrides(tmp_path: Path) -> None:
    """The layers that the user lists decide; a listed file that is missing is an error."""
    _fill(tmp_path, {"x.gbr": GERBER, "y.gbr": _gerber("G04 y*\n"), "a.gtl": GERBER})
    export = open_export(tmp_path, layers=[(2, "x.gbr"), (1, "y.gbr")])
    assert _copper_names(export) == ["y.gbr", "x.gbr"]
    assert _kinds(export)["a.gtl"] == "other"
    for layers, text in [
        ([(1, "z.gbr")], "z.gbr: is listed as a copper layer but is not"),
        ([(1, "x.gbr"), (1, "y.gbr")], "second file listed for layer 1"),
        ([(1, "x.gbr"), (2, "x.gbr")], "listed for two copper layers"),
    ]:
        with pytest.raises(SplitcheckError, match=text):
            open_export(tmp_path, layers=layers)


def _job_text(files: list[tuple[str, str]], count: int, names: tuple[str, ...] = ()) -> str:
    stackup = [{"Type": "Copper", "Thickness": 0.035, "Name": name} for name in names]
    attributes = [{"Path": p, "FileFunction": f, "FilePolarity": "Positive"} for p, f in files]
    general = {"ProjectId": {"Name": "radio"}, "LayerNumber": count}
    return json.dumps(
        {"GeneralSpecs": general, "FilesAttributes": attributes, "MaterialStackup": stackup}
    )


def test_job_file_names_and_orders_layers(tmp_path: Path) -> None:
    """A job file tells copper from other films, and gives layers the names of its stack-up."""
    listed = [("p.gbr", "Copper,L1,Top"), ("q.gbr", "Copper,L5,Inr"), ("r.gbr", "Copper,L3,Bot"),
              ("s.gbr", "SolderMask,Top"), ("t.gbr", "Profile")]  # fmt: skip
    names = ("Top", "Ground", "Bottom")
    files: dict[str, str | bytes] = {name: _gerber(f"G04 {name}*\n") for name, _ in listed[:3]}
    files |= {"t.gbr": GERBER, "radio.gbrjob": _job_text(listed, 3, names)}
    export = open_export(_fill(tmp_path, files))
    assert _copper_names(export) == ["p.gbr", "q.gbr", "r.gbr"]
    assert tuple(f.layer_name for f in export.copper()) == names
    assert export.name == "radio"
    assert _kinds(export)["t.gbr"] == "profile"
    assert any("s.gbr" in remark for remark in export.remarks)
    assert open_export(tmp_path / "radio.gbrjob") == export


def test_job_file_that_lists_missing_copper(tmp_path: Path) -> None:
    """Copper that the job file lists and the folder lacks is an error."""
    listed = [("a.gtl", "Copper,L1,Top"), ("a.gbl", "Copper,L2,Bot")]
    _fill(tmp_path, {"a.gtl": GERBER, "a.gbrjob": _job_text(listed, 2)})
    with pytest.raises(SplitcheckError, match=r'a\.gbrjob: lists copper "a\.gbl"'):
        open_export(tmp_path)


def test_drill_prose_netlist_and_tools_are_told_apart(tmp_path: Path) -> None:
    """A .txt is a drill file, a netlist or prose by what stands in it."""
    files: dict[str, str | bytes] = {
        "b.gtl": GERBER, "b.gbl": _gerber("G04 b*\n"),
        "b.TXT": DRILL, "b-npth.txt": DRILL, "readme.txt": "Drill: 0.2 mm\nT1 is small.\nM48 no\n",
        "b.ipc": IPC, "b.Tool": "T1 0.300000mm  362x [-52.07 | 18.41]\n",
        "pos.csv": "Designator,Layer,X,Y,Rotation\nR1,top,1,2,90\n", "b.pos": "R1 1.0 2.0 90 top\n",
        "bom.csv": "Reference,Value,Box\nR1,10k,3\n",
        "cpl.csv": "Designator,Mid X,Mid Y,Layer\nR1,1,2,T\n",
        "picture.png": b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR",
    }  # fmt: skip
    export = open_export(_fill(tmp_path, files))
    found = _kinds(export)
    assert found == {
        "b.gtl": "copper", "b.gbl": "copper", "b.TXT": "drill", "b-npth.txt": "drill",
        "readme.txt": "readme", "b.ipc": "netlist", "b.Tool": "tools", "pos.csv": "placement",
        "b.pos": "placement", "bom.csv": "readme", "cpl.csv": "placement", "picture.png": "other",
    }  # fmt: skip
    assert export.drill_tools() == {1: 0.3}
    plated = {f.name: f.plated for f in export.of_kind("drill")}
    assert plated == {"b.TXT": True, "b-npth.txt": False}
    assert any("b.TXT" in text for text in export.assumptions)


def test_drill_plating_and_span_from_attributes(tmp_path: Path) -> None:
    """A drill file's attributes give its plating and the layers it goes through."""
    head = "M48\n; #@! TF.FileFunction,Plated,4,2,Buried\n"
    files: dict[str, str | bytes] = {"b.gtl": GERBER, "b.drl": head + DRILL[4:], "c-1-2.drl": DRILL}
    files["b.gbl"] = _gerber("G04 b*\n")
    export = open_export(_fill(tmp_path, files))
    assert {f.name: (f.plated, f.span) for f in export.of_kind("drill")} == {
        "b.drl": (True, (2, 4)),
        "c-1-2.drl": (None, (1, 2)),
    }


def test_likeliest_outline_is_kept(tmp_path: Path) -> None:
    """Of two files that might be the outline the one that says so is taken."""
    files: dict[str, str | bytes] = dict.fromkeys(("b.gtl", "b.gko", "b-outline.gbr"), GERBER)
    export = open_export(_fill(tmp_path, files))
    assert [f.name for f in export.of_kind("profile")] == ["b-outline.gbr"]
    assert any("b.gko" in remark for remark in export.remarks)


@pytest.mark.parametrize(
    ("text", "negative"),
    [
        (GERBER, None),
        ("%TF.FilePolarity,Negative*%\n" + GERBER, True),
        ("%IPNEG*%\n" + GERBER, True),
        ("%IPPOS*%\n" + GERBER, False),
        ("G04 Mode:      Negative*\n" + GERBER, True),
    ],
)
def test_stated_polarity(text: str, negative: bool | None, tmp_path: Path) -> None:
    """What a file states of its polarity is kept; nothing stated is None."""
    assert open_export(_fill(tmp_path, {"a.gtl": text})).copper()[0].negative is negative


def test_large_foreign_files_stay_unread(tmp_path: Path) -> None:
    """A large binary file that promises no layer costs nothing and hinders nothing."""
    _fill(tmp_path, {"a.gtl": GERBER, "film.mov": b"\0" * 2_000_000})
    assert [f.name for f in open_export(tmp_path).files] == ["a.gtl"]


def test_files_one_folder_down(tmp_path: Path) -> None:
    """Files may lie one folder deeper when the top holds no layer."""
    files: dict[str, str | bytes] = {
        "Gerber/a.gtl": GERBER,
        "Drill/a.drl": DRILL,
        "notes.txt": "hi",
    }
    export = open_export(_fill(tmp_path, files))
    assert _copper_names(export) == ["Gerber/a.gtl"]
    assert [f.name for f in export.of_kind("drill")] == ["Drill/a.drl"]
    _fill(tmp_path, {"b.gtl": GERBER})
    export = open_export(tmp_path)
    assert _copper_names(export) == ["b.gtl"]
    assert any("Gerber" in remark for remark in export.remarks)


def _zipped(path: Path, files: dict[str, str | bytes]) -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as out:
        for name, content in files.items():
            out.writestr(name, content)
    return path


def test_zip_reads_like_its_folder(tmp_path: Path) -> None:
    """A .zip gives the same files as the folder that was packed."""
    files: dict[str, str | bytes] = {"a.gtl": GERBER, "a.gbl": _gerber("G04 b*\n"), "a.drl": DRILL}
    plain = open_export(_fill(tmp_path / "board", files))
    packed = open_export(_zipped(tmp_path / "board.zip", files))
    assert packed == plain
    nested = {f"top/{name}": content for name, content in files.items()}
    inside = open_export(_zipped(tmp_path / "nested.zip", nested | {"__MACOSX/top/._a.gtl": b"\0"}))
    assert [f.sha256 for f in inside.files] == [f.sha256 for f in plain.files]


@pytest.mark.parametrize(
    "name", ["../a.gtl", "/etc/a.gtl", "C:\\a.gtl", "x\\..\\..\\a.gtl", "//h/s/a.gtl"]
)
def test_zip_that_reaches_outside(name: str, tmp_path: Path) -> None:
    """An entry that would leave the archive is refused by name."""
    with pytest.raises(SplitcheckError, match="points outside the archive"):
        open_export(_zipped(tmp_path / "a.zip", {name: GERBER}))


def test_zip_bomb(tmp_path: Path) -> None:
    """An entry that grows beyond reason is refused while it is unpacked."""
    with pytest.raises(SplitcheckError, match="grows more than 200 times"):
        open_export(_zipped(tmp_path / "a.zip", {"a.gtl": b"0" * 20_000_000}))


def test_zip_whose_header_lies(tmp_path: Path) -> None:
    """A stated size of 10 bytes does not let 20 MB through."""
    path = _zipped(tmp_path / "a.zip", {"a.gtl": b"0" * 20_000_000})
    data = bytearray(path.read_bytes())
    central = data.rfind(b"PK\x01\x02")
    data[central + 24 : central + 28] = struct.pack("<I", 10)
    path.write_bytes(bytes(data))
    with pytest.raises(SplitcheckError):
        open_export(path)


def test_broken_encrypted_and_foreign_archives(tmp_path: Path) -> None:
    """A broken or encrypted archive, or another file given as one, is said to be so."""
    good = _zipped(tmp_path / "a.zip", {"a.gtl": GERBER}).read_bytes()
    (tmp_path / "cut.zip").write_bytes(good[: len(good) // 2])
    locked = bytearray(good)
    for sign, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        locked[good.find(sign) + offset] |= 1
    (tmp_path / "locked.zip").write_bytes(bytes(locked))
    (tmp_path / "one.gtl").write_text(GERBER)
    for name, text in [("cut.zip", "not a readable .zip"), ("locked.zip", "encrypted"),
                       ("one.gtl", "one single file")]:  # fmt: skip
        with pytest.raises(SplitcheckError, match=text):
            open_export(tmp_path / name)


def test_archive_inside_is_not_opened(tmp_path: Path) -> None:
    """A .zip inside the folder stays closed."""
    inner = _zipped(tmp_path / "in.zip", {"a.gtl": GERBER}).read_bytes()
    with pytest.raises(SplitcheckError, match="no copper layer"):
        open_export(_fill(tmp_path / "board", {"in.zip": inner}))


def test_caps(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """File size, total size and file count are capped."""
    _fill(tmp_path, {"a.gtl": GERBER * 4, "b.gbl": GERBER * 3})
    with monkeypatch.context() as m:
        m.setattr(archive, "FILE_CAP_BYTES", 3 * len(GERBER))
        with pytest.raises(SplitcheckError, match=r"a\.gtl: has .* over the cap"):
            open_export(tmp_path)
    with monkeypatch.context() as m:
        m.setattr(archive, "TOTAL_CAP_BYTES", 5 * len(GERBER))
        with pytest.raises(SplitcheckError, match="in all"):
            open_export(tmp_path)
    with monkeypatch.context() as m:
        m.setattr(archive, "COUNT_CAP", 1)
        with pytest.raises(SplitcheckError, match="holds 2 files, over the cap of 1"):
            open_export(tmp_path)


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (b"\0" * 10_000_000, "holds binary data although its name promises a layer"),
        (b"\x7fELF\x02\x01\x01\0\0", "binary data"),
        (b"", "holds nothing"),
        (b"<!DOCTYPE html><html>not found</html>", "neither Gerber nor drill commands"),
        (b"0" * 100_000, "neither Gerber nor drill commands"),
    ],
)
def test_junk_with_a_layers_name(content: bytes, text: str, tmp_path: Path) -> None:
    """Junk whose name promises a layer is named, with what to do."""
    _fill(tmp_path, {"a.gtl": GERBER, "b.gbr": content})
    with pytest.raises(SplitcheckError, match=rf"b\.gbr: .*{text}.*; export it again"):
        open_export(tmp_path)


def test_folder_and_dead_link_with_a_layers_name(tmp_path: Path) -> None:
    """A folder or a dead link that is named as a layer is an error, not a silent skip."""
    (tmp_path / "a" / "x.gbr").mkdir(parents=True)
    _fill(tmp_path / "a", {"a.gtl": GERBER})
    with pytest.raises(SplitcheckError, match=r"x\.gbr: is a folder"):
        open_export(tmp_path / "a")
    _fill(tmp_path / "b", {"a.gtl": GERBER})
    (tmp_path / "b" / "y.gbl").symlink_to(tmp_path / "nowhere")
    with pytest.raises(SplitcheckError, match=r"y\.gbl: is a link to nowhere"):
        open_export(tmp_path / "b")


def test_nothing_to_read(tmp_path: Path) -> None:
    """A missing path, an empty folder and a folder without copper each say what they are."""
    with pytest.raises(SplitcheckError, match="does not exist; give the folder"):
        open_export(tmp_path / "none")
    with pytest.raises(SplitcheckError, match="does not exist; check the path of the job"):
        open_export(tmp_path / "none.gbrjob")
    with pytest.raises(SplitcheckError, match="holds no files"):
        open_export(tmp_path)
    _fill(tmp_path, {"a.gts": GERBER, "notes.txt": "hello"})
    with pytest.raises(SplitcheckError, match=r"no copper layer; found a\.gts \(mask\)"):
        open_export(tmp_path)


def test_unknown_gerber_is_left_out_with_a_remark(tmp_path: Path) -> None:
    """A Gerber file that nothing places is left out, and that is said."""
    export = open_export(_fill(tmp_path, {"a.gtl": GERBER, "widget.gbr": GERBER}))
    assert _kinds(export)["widget.gbr"] == "other"
    assert any(remark.startswith("widget.gbr is left out") for remark in export.remarks)


def test_only_regular_files_are_read(tmp_path: Path) -> None:
    """A pipe in the folder is not waited for."""
    _fill(tmp_path, {"a.gtl": GERBER})
    os.mkfifo(tmp_path / "pipe")
    assert stat.S_ISFIFO((tmp_path / "pipe").stat().st_mode)
    export = open_export(tmp_path)
    assert any("not a regular file" in remark for remark in export.remarks)


@given(st.binary(max_size=300))
def test_any_bytes_end_in_an_answer_or_an_error_of_ours(data: bytes) -> None:
    """Whatever stands in a file, reading ends without a crash."""
    with TemporaryDirectory() as folder:
        _fill(Path(folder), {"a.gtl": GERBER, "x.bin": data, "y.gbrjob": data})
        with suppress(SplitcheckError):
            assert open_export(Path(folder)).copper()


def boards(corpus: Path) -> dict[str, dict[str, list[str]]]:
    """What the corpus' own index says of each board: copper in order, drill, outline."""
    text = (corpus / "SOURCES.md").read_text(encoding="utf-8")
    found = {}
    for section in re.split(r"^### ", text, flags=re.MULTILINE)[1:]:
        rows = {
            key: re.findall(r"`([^`]+)`", line)
            for key, line in re.findall(r"^- (copper|drill|outline)\b(.*)$", section, re.MULTILINE)
        }
        found[section.split("\n", 1)[0].strip()] = rows
    return found


def test_real_boards_are_understood(corpus: Path) -> None:
    """Copper in order, drill and outline files of every real board are those its index names."""
    expected = boards(corpus)
    assert expected
    for name, rows in expected.items():
        lacking = [f for f in rows["copper"] if not (corpus / name / f).exists()]
        if lacking:
            with pytest.raises(SplitcheckError, match="no file is L"):
                open_export(corpus / name)
            continue
        export = open_export(corpus / name)
        assert _copper_names(export) == rows["copper"], name
        assert sorted(f.name for f in export.of_kind("drill")) == sorted(rows["drill"]), name
        assert [f.name for f in export.of_kind("profile")] == rows["outline"], name


def test_intake_has_a_reason_for_every_file(tmp_path: Path) -> None:
    """Every file carries a reason in words."""
    files: dict[str, str | bytes] = {"a.gtl": GERBER, "a.gbl": _gerber("G04 b*\n"), "n.md": "# n"}
    assert all(f.reason for f in intake.open_export(_fill(tmp_path, files)).files)
