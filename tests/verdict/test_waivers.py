"""Waivers: what they fit, when they end, and what becomes of those that fit nothing."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.report.tally import standing
from splitcheck.verdict.findings import Source
from splitcheck.verdict.rules import Waiver
from splitcheck.verdict.waivers import waive
from tests.report.made import finding

FINDINGS = (
    finding(1, "/io/SYNC", kind="slot-crossing", at_mm=(10.0, 20.0), fingerprint="aa"),
    finding(2, "CLK", kind="split-crossing", at_mm=(11.0, 20.0), fingerprint="bb"),
)
WAIVER = Waiver("agreed", Source("splitcheck.toml", 4))


@pytest.mark.parametrize(
    ("selects", "fits"),
    [
        ({"net": "SYNC"}, (True, False)),
        ({"net": "*"}, (True, True)),
        ({"net": "sync*"}, (True, False)),
        ({"kind": "split-crossing"}, (False, True)),
        ({"fingerprint": "bb"}, (False, True)),
        ({"fingerprint": "b"}, (False, False)),
        ({"at_mm": (10.0, 21.5)}, (True, True)),
        ({"at_mm": (10.0, 22.0)}, (True, False)),
        ({"at_mm": (10.0, 22.01)}, (False, False)),
        ({"at_mm": (10.0, 20.0), "radius_mm": 0.5}, (True, False)),
        ({"net": "SYNC", "kind": "split-crossing"}, (False, False)),
        ({"net": "CLK", "kind": "split-crossing", "at_mm": (11.0, 20.0)}, (False, True)),
    ],
)
def test_a_waiver_fits_where_all_that_it_says_holds(
    selects: dict[str, object], fits: tuple[bool, bool]
) -> None:
    """Net, kind, place, fingerprint, alone and together."""
    waiver = replace(WAIVER, **selects)  # type: ignore[arg-type]
    found, (row,) = waive(FINDINGS, [waiver], None)
    assert tuple(one.waived is not None for one in found) == fits
    assert row.findings == sum(fits)
    assert row.state == ("used" if any(fits) else "unmatched")
    assert standing(found) == tuple(
        one for one, gone in zip(FINDINGS, fits, strict=True) if not gone
    )


@pytest.mark.parametrize(
    ("today", "state"),
    [
        (None, "used"),
        (date(2031, 6, 29), "used"),
        (date(2031, 6, 30), "used"),
        (date(2031, 7, 1), "expired"),
    ],
)
def test_a_waiver_holds_up_to_its_last_day(today: date | None, state: str) -> None:
    """The day that it names is within; afterwards its findings count again."""
    waiver = replace(WAIVER, net="*", until=date(2031, 6, 30))
    found, (row,) = waive(FINDINGS, [waiver], today)
    assert (row.state, row.until, row.source) == (state, "2031-06-30", WAIVER.source)
    assert [one.waived for one in found] == [None if state == "expired" else "agreed"] * 2


def test_the_first_waiver_gives_the_reason_and_each_is_counted() -> None:
    """One finding, two waivers: neither is idle."""
    second = replace(WAIVER, net="CLK", reason="again")
    found, rows = waive(FINDINGS, [replace(WAIVER, net="*"), second], None)
    assert [one.waived for one in found] == ["agreed", "agreed"]
    assert [(row.state, row.findings) for row in rows] == [("used", 2), ("used", 1)]


_waivers = st.builds(
    Waiver,
    st.just("r"),
    st.just(Source("s", 1)),
    st.sampled_from([None, "CLK", "S*"]),
    st.sampled_from([None, "slot-crossing", "no-plane"]),
    st.sampled_from([None, (10.0, 20.0)]),
)


@given(st.lists(_waivers, max_size=4))
def test_waivers_change_nothing_but_the_waived(waivers: list[Waiver]) -> None:
    """All findings stay, in their order, with all that is known of them; each waiver has a row."""
    found, rows = waive(FINDINGS, waivers, None)
    assert tuple(replace(one, waived=None) for one in found) == FINDINGS
    assert len(rows) == len(waivers)
