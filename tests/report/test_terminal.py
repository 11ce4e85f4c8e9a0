"""The text report: whole, at 80 columns, over hostile names, and with many nets over one gap."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from splitcheck import __version__
from splitcheck.report import readout, terminal
from splitcheck.verdict.findings import Report
from tests.report import made

TEXTS = Path(__file__).parent / "texts"
COLOR = re.compile(r"\x1b\[[0-9;]*m")


def whole(name: str) -> str:
    """A text as it should be, with the version of today in it."""
    return (TEXTS / name).read_text(encoding="utf-8").replace("VERSION", __version__)


def plain(report: Report, *, top: int = 20, width: int = 80) -> str:
    """The text report without colour."""
    return terminal.render(report, top=top, width=width, color=False)


def test_the_whole_report(pump: Report) -> None:
    """Every word of it."""
    assert plain(pump) == whole("rank.txt")


def test_the_whole_report_of_a_clean_board(pump: Report) -> None:
    """Nothing found is said in words, with what it rests on."""
    clean = replace(pump, findings=(), remarks=(), assumptions=(), islands=())
    assert plain(clean) == whole("rank-clean.txt")


@pytest.mark.parametrize("width", [20, 80, 97, 140, 400])
def test_no_line_is_wider_than_the_page(pump: Report, width: int) -> None:
    """80 columns at least, 140 at most."""
    for text in (plain(pump, width=width), readout.render(pump, top=0, width=width, color=False)):
        widest = max(cell_len(line) for line in text.splitlines())
        assert widest <= min(max(width, 80), 140)


def test_colour_changes_no_word(pump: Report) -> None:
    """Take the colour away and the same bytes are left; without it there is no escape at all."""
    colored = terminal.render(pump, top=20, width=80, color=True)
    assert "\x1b[" in colored
    assert COLOR.sub("", colored) == plain(pump)
    assert "\x1b" not in plain(pump)


def test_our_own_words_are_ascii(pump: Report) -> None:
    """A CI log in any encoding shows them."""
    assert plain(pump).isascii()
    assert readout.render(pump, top=0, width=80, color=False).isascii()


def test_thirty_nets_over_one_gap_read_as_one(pump: Report) -> None:
    """One row with the worst net, the count, and as many names as two lines hold."""
    bus = tuple(
        made.finding(place, f"/fpga/DATA_{place}", level="error" if place < 3 else "warning")
        for place in range(1, 31)
    )
    text = plain(replace(pump, findings=bus))
    rows = [line for line in text.splitlines() if line.startswith("  F")]
    assert len(rows) == 1
    assert rows[0].startswith("  F1 ")
    joined = " ".join(text.split())
    assert "30 nets over one gap (2 error, 28 warning): /fpga/DATA_1, /fpga/DATA_2, " in joined
    assert re.search(r"/fpga/DATA_\d and 2\d more A slot", joined)
    assert "30 findings over 1 gap on 30 nets" in joined


def test_one_net_over_one_gap_thrice_is_told_as_places(pump: Report) -> None:
    """A meander over a slot is one net at three places."""
    text = plain(replace(pump, findings=tuple(made.finding(n, "CLK") for n in (1, 2, 3))))
    assert "1 net over one gap at 3 places (3 error): CLK\n" in text


def test_nets_without_a_plane_are_not_said_to_share_a_gap(pump: Report) -> None:
    """There is no gap where there is no plane."""
    bare = tuple(made.finding(n, f"LED{n}", kind="no-plane", plane_layer="") for n in (1, 2))
    text = plain(replace(pump, findings=bare))
    assert "      2 nets without a plane (2 error): LED1, LED2\n" in text


def test_findings_without_a_gap_are_not_thrown_together(pump: Report) -> None:
    """Two corners without plane are two rows."""
    text = plain(replace(pump, findings=tuple(made.finding(n, "CLK", gap="") for n in (1, 2))))
    assert len([line for line in text.splitlines() if line.startswith("  F")]) == 2


def test_channels_laid_out_alike_are_one_row(pump: Report) -> None:
    """Four channels with the same hole under the same trace are one thing to read, not four."""
    alike = tuple(
        made.finding(n, f"CH{n}_IN", gap=f"L2.g{n}", at_mm=(10.0 * n, 5.0)) for n in range(1, 5)
    )
    worse = made.finding(5, "CH5_IN", gap="L2.g5", at_mm=(50.0, 5.0), added_nh=9.9)
    text = plain(replace(pump, findings=(*alike, worse)))
    rows = [line for line in text.splitlines() if line.startswith("  F")]
    assert [row.split()[0] for row in rows] == ["F1", "F5"]
    assert "      the same at 3 more places: F2 CH2_IN, F3 CH3_IN, F4 CH4_IN\n" in text
    assert "5 findings over 5 gaps on 5 nets" in text


def test_both_planes_of_a_stripline_at_one_place_are_one_row(pump: Report) -> None:
    """A slot through both planes is one place on the board; each plane keeps its number."""
    above = made.finding(1, "CLK", gap="L2.g1", plane_layer="In1")
    below = made.finding(2, "CLK", gap="L4.g1", plane_layer="In3", added_nh=0.5, error_nh=0.1)
    text = plain(replace(pump, findings=(above, below)))
    rows = [line for line in text.splitlines() if line.startswith("  F")]
    assert [row.split()[0] for row in rows] == ["F1"]
    assert "      over In3 at the same place as well: F2, 0.50 +-0.10 nH\n" in text


def test_top_says_what_it_hides(pump: Report) -> None:
    """What is not shown is counted."""
    assert "and 2 findings over 2 more gaps: --top 0 shows all of them\n" in plain(pump, top=1)
    assert plain(pump, top=0) == plain(pump, top=3)


def test_a_waived_finding_stays_with_its_reason(pump: Report) -> None:
    """It is shown, it is not counted."""
    waived = replace(pump.findings[0], waived="probe measured 3 mV")
    text = plain(replace(pump, findings=(waived, *pump.findings[1:])))
    assert "      waived: probe measured 3 mV\n" in text
    assert "1 waived finding, not counted above" in text
    assert "5 findings over 3 gaps on 5 nets" in text


def test_no_number_is_lost_to_a_long_name(pump: Report) -> None:
    """Names give way, numbers do not; the long name follows in full on its own line."""
    name = "/controller/interface/high_speed/lane_0/transmit_data_positive"
    big = made.finding(
        1,
        name,
        gap_mm=1234.5,
        detour_mm=98765.4,
        added_nh=4321.5,
        error_nh=1234.5,
        noise_mv=5432.1,
    )
    text = plain(replace(pump, findings=(big,)))
    row = next(line for line in text.splitlines() if line.startswith("  F1 "))
    assert row.split()[-5:] == ["1234", "98765", "4322", "+-1234", "5432"]
    assert f"net {name}\n" in text


def test_what_only_a_field_solution_knows_is_shown_where_it_is_known(pump: Report) -> None:
    """Stray field, corner frequency and the partner of a pair stand under the row."""
    solved = made.finding(1, "D_P", method="solved", stray_db=12.345, corner_khz=25.31, pair="D_N")
    text = " ".join(plain(replace(pump, findings=(solved,))).split())
    assert "stray field +12.3 dB; above 25.3 kHz the return follows inductance, " in text
    assert "not resistance; pair with D_N" in text
    assert "added inductance: 1 solved from the field" in text


def test_square_brackets_in_a_name_are_no_markup(pump: Report) -> None:
    """``D[0]`` and ``[red]`` are names like any other."""
    text = plain(replace(pump, findings=(made.finding(1, "[red]D[0]"),), board="[bold]x[/bold]"))
    assert "[red]D[0]" in text
    assert "[bold]x[/bold]" in text


def test_a_name_from_right_to_left_cannot_turn_the_numbers_round(pump: Report) -> None:
    """Unicode Standard Annex 9: a left-to-right mark after the name keeps the columns in order."""
    name = "\N{HEBREW LETTER ALEF}\N{HEBREW LETTER BET}"
    text = plain(replace(pump, findings=(made.finding(1, name),)))
    assert f"{name}\N{LEFT-TO-RIGHT MARK}" in text
    assert "\u202e" not in plain(replace(pump, findings=(made.finding(1, "\u202ea"),)))


HOSTILE = st.one_of(
    st.text(st.characters(codec=None), max_size=60),
    st.sampled_from(["\x1b]0;owned\x07", "a\r\nb", "[red]", "n" * 10_000, "", " ", "\u2028", "\t"]),
)


@given(HOSTILE, HOSTILE, HOSTILE, HOSTILE)
def test_no_text_of_a_file_can_reach_the_terminal_raw(
    net: str, layer: str, reason: str, board: str
) -> None:
    """Control characters are written out, lines stay within the page, the numbers stay."""
    pump = made.pump()
    findings = tuple(
        replace(f, net=net + str(n), layer=layer, plane_net=layer, reason=reason)
        for n, f in enumerate(pump.findings)
    )
    layers = tuple(replace(row, name=layer, file=net) for row in pump.layers)
    inputs = tuple(replace(row, file=net, kind=layer, reason=reason) for row in pump.inputs)
    nets = tuple(replace(row, name=net, net_class=layer) for row in pump.nets)
    hostile = replace(
        pump,
        board=board,
        layers=layers,
        findings=findings,
        inputs=inputs,
        nets=nets,
        assumptions=(reason,),
        remarks=(reason,),
        facts=(reason,),
        counts=(replace(pump.counts[0], what=reason),),
    )
    for text in (plain(hostile), readout.render(hostile, top=0, width=80, color=False)):
        raw = {char for char in text if unicodedata.category(char)[0] == "C"}
        assert raw <= {"\n", "\N{LEFT-TO-RIGHT MARK}"}
        assert max(cell_len(line) for line in text.split("\n")) <= 80
    assert "3.21 +-0.64" in plain(hostile)


def test_copper_that_ties_many_nets_is_told_by_the_first_of_their_names(pump: Report) -> None:
    """As sentences do; a single name, and two islands of a split, are told whole."""
    nets = "GND|GNDA|Net-(ANT1-Pad1)"
    for plane, shown in (
        (nets, "(GND and 2 more)"),
        (f"{nets} to +3V3", "(GND and 2 more to +3V3)"),
    ):
        worst = replace(pump.findings[0], plane_net=plane)
        text = plain(replace(pump, findings=(worst,)), width=140)
        assert shown in text
        assert "ANT1" not in text
