"""IPC-D-356 records: nets, aliases, units, the shift onto the copper, and an independent reader."""

from __future__ import annotations

import re
from contextlib import suppress
from pathlib import Path

import numpy as np
import pytest
from gerbonara.ipc356 import Netlist as TheirNetlist
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.copper import drill_fit, netlist
from splitcheck.copper.netlist import NetPoint
from splitcheck.errors import SplitcheckError

SMD = "327GND              R1    -1          A01X+010000Y-005000X0236Y0236R000 S2      "
VIA = "317N$1              VIA   -    MD0118PA00X+020000Y+010000X0236Y    R000 S3      "


def _points(*lines: str) -> tuple[NetPoint, ...]:
    return netlist.read("\n".join(lines), "a.ipc").points


def test_pad_and_via() -> None:
    """A surface pad and a via give net, place, part, access and hole."""
    assert _points("P  UNITS CUST 0", SMD, VIA, "999", VIA) == (
        NetPoint("GND", 25.4, -12.7, "R1", "1", False, 1, 2),
        NetPoint("N$1", 50.8, 25.4, None, None, True, 0, 3, 0.29972),
    )


@pytest.mark.parametrize(
    ("head", "x_mm"),
    [("P  UNITS CUST 0", 25.4), ("P  UNITS CUST 1", 10.0), ("P  UNITS CUST 2", 25.4),
     ("P  UNITS SI", 10.0), ("C  no units", 25.4)],
)  # fmt: skip
def test_units(head: str, x_mm: float) -> None:
    """The units record says 0.0001 inch or 0.001 mm; without one it is 0.0001 inch."""
    assert _points(head, SMD)[0].x_mm == x_mm


@pytest.mark.parametrize(
    ("alias", "field"),
    [("P  NNAME1 DDR_DATA_STROBE_0_POSITIVE", "NNAME1"), ("P  NNAMEm0061 A_LONG_ONE", "m0061")],
)
def test_aliases_are_resolved(alias: str, field: str) -> None:
    """A record that carries a short name gets the long one back, however it is abbreviated."""
    row = f"327{field:<14}" + SMD[17:]
    assert _points(alias, row)[0].net == alias.split()[2]
    assert _points(row, alias)[0].net == alias.split()[2]


def test_no_net_and_odd_records() -> None:
    """N/C is copper on no net; tooling holes, conductors and outlines are passed over."""
    found = netlist.read(
        "\n".join([
            "C  comment", "P  JOB   x", "327N/C             " + SMD[19:],
            "367                       -     D3175UA00X+003810Y+085725X6350Y         S3",
            "378GND             L01     X0Y0X100", "389BOARD_EDGE               X0Y0",
            "what is this",
        ]), "a.ipc",
    )  # fmt: skip
    assert [p.net for p in found.points] == [""]
    assert found.remarks == ("a.ipc:7: unknown record passed over: what is this",)
    assert found.nets() == ()


def test_shifted_columns_of_a_common_writer() -> None:
    """A blank for the dash of a via and a mask code one column early are read all the same."""
    row = "317/USB_DP          VIA         MD0157PA00X+045000Y-032500X0315Y0000R000S3"
    smd = "327-(U4-PAD7)       U4    -7          A02X+045000Y-032500X0315Y0200R090S2"
    via, pad = _points("P  UNITS CUST 0", row, smd)
    assert (via.net, via.component, via.x_mm, via.hole_mm) == ("/USB_DP", None, 114.3, 0.39878)
    assert (pad.component, pad.pin, pad.access, pad.y_mm) == ("U4", "7", 2, -82.55)


def test_continuation_takes_the_net_before() -> None:
    """A continuation record without a name belongs to the net of the record before."""
    row = "027" + " " * 17 + "R1    -1          A02X+010000Y-005000X0236Y0236R000 S2"
    assert [p.net for p in _points(SMD, row)] == ["GND", "GND"]


@pytest.mark.parametrize(
    ("text", "wrong"),
    [
        ("P  UNITS CUST 0\n999\n", "holds no pad or via record"),
        ("P  UNITS FURLONG\n" + SMD, r'a\.ipc:1: unknown units "FURLONG"'),
        ("327GND              R1    -1          A01", r"a\.ipc:1: .*gives no place"),
    ],
)
def test_errors(text: str, wrong: str) -> None:
    """What cannot be understood is an error with its line."""
    with pytest.raises(SplitcheckError, match=wrong):
        netlist.read(text, "a.ipc")


@given(st.text(alphabet="P327CNAME 0169+-XYADR/\n", max_size=300))
def test_any_text_ends_in_points_or_an_error_of_ours(text: str) -> None:
    """Whatever stands in a netlist, reading ends without a crash."""
    with suppress(SplitcheckError):
        assert netlist.read(text, "a.ipc").points


PLACES = [(7 * i % 97 + 0.13 * i, 11 * i % 89 + 0.07 * i) for i in range(80)]


def _row(x_mm: float, y_mm: float, net: str = "A") -> str:
    x, y = (f"{'-' if v < 0 else '+'}{abs(round(v * 1000)):06d}" for v in (x_mm, y_mm))
    return f"327{net:<17}R1    -1          A01X{x}Y{y}X0236Y0236R000 S2"


@given(
    st.integers(-60_000, 60_000), st.integers(-60_000, 60_000), st.integers(0, 15),
    st.permutations(range(len(PLACES))),
)  # fmt: skip
def test_shift_onto_the_copper_is_found(dx: int, dy: int, spare: int, order: list[int]) -> None:
    """A netlist from another origin is laid back, however its records are ordered."""
    shift = np.array([dx / 1000, dy / 1000])
    rows = [_row(x - shift[0], y - shift[1]) for x, y in (PLACES[i] for i in order)]
    read = netlist.read("\n".join(["P  UNITS CUST 1", *rows]), "a.ipc")
    extra = [(200.0 + i, 50.0) for i in range(spare)]
    found = netlist.align(read, np.array(PLACES[:50] + extra), np.array(PLACES[50:]))
    assert found.share == 1.0
    # A shift smaller than the reach of a pad is no shift; any other is found to 2 um.
    reach_mm = drill_fit.NEAR_MM if np.hypot(*shift) < 0.1 else 2e-3
    assert (found.dx_mm, found.dy_mm) == pytest.approx(tuple(shift), abs=reach_mm)


def test_netlist_of_another_board_does_not_fit() -> None:
    """Places that no shift lays onto the copper give a low share."""
    rng = np.random.default_rng(7)
    rows = [_row(x, y) for x, y in rng.uniform(0, 90, (80, 2))]
    read = netlist.read("\n".join(["P  UNITS CUST 1", *rows]), "a.ipc")
    assert netlist.align(read, np.array(PLACES), np.empty((0, 2))).share < 0.5


@pytest.mark.filterwarnings("ignore")
def test_real_netlists_against_gerbonara(corpus: Path) -> None:
    """Nets and places of real netlists are those that an independent reader finds.

    gerbonara 1.5.0 leaves aliases without the NNAME prefix unresolved; the test resolves those.
    """
    files = sorted(p for p in corpus.glob("*/*") if p.suffix in (".ipc", ".356"))
    assert files
    for path in files:
        text = path.read_text(encoding="latin-1")
        ours, theirs = netlist.read(text, path.name), TheirNetlist.from_string(text, path.name)
        aliases = dict(re.findall(r"^P\s+NNAME(\S+)\s+(\S+)", text, re.MULTILINE))
        mine = sorted((p.net, round(p.x_mm, 3), round(p.y_mm, 3)) for p in ours.points if p.net)
        other = sorted(
            (
                aliases.get(r.net_name, r.net_name),
                round(r.unit.convert_to("mm", r.x), 3),
                round(r.unit.convert_to("mm", r.y), 3),
            )
            for r in theirs.test_records
            if r.net_name and r.is_connected
        )
        assert mine == other
        assert ours.aliases == len(aliases)
