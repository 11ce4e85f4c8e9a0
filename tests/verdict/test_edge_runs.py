"""Edge runs as findings: loop and common mode apart, beyond the edge and inside it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.loops.finite_plane import common_nh_mm
from splitcheck.verdict.edge_runs import COVERED
from splitcheck.verdict.findings import Finding
from splitcheck.verdict.judge import judge
from splitcheck.verdict.listing import near_enough
from splitcheck.verdict.rules import DEFAULT_CLASS
from splitcheck.verdict.scene import Judged, Scene
from splitcheck.verdict.score import noise_mv
from tests.making.hand import Line, Sheet, board, crossings, scene
from tests.planes.test_edges import runs as edge_runs

WHOLE = shapely.box(0, 0, 60, 40)


def _sheets(*points: tuple[float, float]) -> tuple[Sheet, Sheet]:
    return Sheet(lines=(Line("CLK", points),)), Sheet((("GND", WHOLE),))


def _judged(sheets: Sequence[Sheet], height: float = 1.0, near: float = 1.0) -> Judged:
    made = board(*sheets, heights_mm=[height], outline=WHOLE)
    return judge(
        scene(made), *crossings(made), edges=edge_runs(*sheets, heights_mm=[height], near=near)
    )


def _along(inside: float, height: float = 1.0) -> tuple[Finding, ...]:
    return _judged(_sheets((10.0, inside), (50.0, inside)), height).findings


def test_trace_along_the_edge_has_loop_and_common_mode_apart() -> None:
    """40 mm, half a height inside: 32 nH/m of loop, and the common mode of a plane 40 mm wide."""
    (found,) = _along(0.5)
    assert (found.kind, found.net, found.plane_layer) == ("edge-run", "CLK", "L2")
    assert found.added_nh == pytest.approx(40 * 0.032, rel=0.02)  # half-plane, s/h = 0.5
    assert found.noise_mv == pytest.approx(noise_mv(found.added_nh or 0, DEFAULT_CLASS))
    common = float(common_nh_mm(np.array([40.0]), np.array([19.5]), 1.0)[0])
    assert found.common_nh == pytest.approx(40 * common, rel=1e-3)
    assert (found.gap_mm, found.detour_mm, found.method) == (0.0, 0.0, "estimated")
    assert "as near as 0.50 mm at a height of 1.00 mm" in found.reason
    assert "in common mode" in found.reason


def test_trace_in_the_middle_says_nothing() -> None:
    """Not even a count."""
    judged = _judged(_sheets((10.0, 20.0), (50.0, 20.0)))
    assert (judged.findings, judged.counts) == ((), ())


def test_thin_dielectric_makes_the_edge_harmless() -> None:
    """At 0.1 mm height 0.5 mm are five heights: no edge run. At 0.09 mm: counted, not listed."""
    assert _along(0.5, 0.1) == ()
    short = _judged(_sheets((10.0, 0.09), (14.0, 0.09)), 0.1)
    assert short.findings == ()
    told = {count.what: count.number for count in short.counts}
    assert told[near_enough("edge-run")] == 1


def test_run_beyond_the_edge_is_solved_and_has_its_common_mode() -> None:
    """From the plane out beyond its edge, 20 mm along it, and back on."""
    out = _sheets((15, 5), (20, 5), (20, -0.5), (40, -0.5), (40, 5), (45, 5))
    found = [f for f in _judged(out).findings if f.kind == "edge-run"]
    beyond = max(found, key=lambda f: f.gap_mm)
    assert beyond.method == "solved"
    # half a height outside the edge, by the half-plane: 124 nH/m over 20 mm, and two ends
    assert beyond.added_nh == pytest.approx(20 * 0.124, rel=0.3)
    assert beyond.common_nh is not None
    assert beyond.common_nh > 20 * float(common_nh_mm(np.array([40.0]), np.array([20.0]), 1.0)[0])
    assert "beyond the edge" in beyond.reason


def _scene(made: Board, rise_ns: float) -> Scene:
    slow = replace(DEFAULT_CLASS, name="slow", rise_ns=rise_ns)
    return replace(scene(made), drives=(slow,) * len(made.nets))


def test_slow_net_says_nothing() -> None:
    """The same trace with an edge of 20 ns: counted."""
    sheets = _sheets((10.0, 0.5), (50.0, 0.5))
    made = board(*sheets, heights_mm=[1.0], outline=WHOLE)
    edges = edge_runs(*sheets, heights_mm=[1.0])
    assert judge(_scene(made, 20.0), *crossings(made), edges=edges).findings == ()
    assert judge(_scene(made, 1.0), *crossings(made), edges=edges).findings != ()


@given(st.floats(0.05, 0.95), st.floats(0.05, 0.95))
@settings(max_examples=15)
def test_nearer_to_the_edge_is_never_better(one: float, other: float) -> None:
    """In the loop and in common mode."""
    near, far = sorted((one, other))
    inner, outer = _along(far), _along(near)
    if inner:
        assert (outer[0].added_nh or 0) >= (inner[0].added_nh or 0) - 1e-9
        assert (outer[0].common_nh or 0) >= (inner[0].common_nh or 0) - 1e-9


def test_run_beyond_an_edge_that_another_plane_covers_is_counted() -> None:
    """The plane below reaches farther out: not the edge of the board's planes."""
    trace, near = _sheets((15, 5), (20, 5), (20, -0.5), (23.5, -0.5), (23.5, 5), (45, 5))
    far = Sheet((("GND", shapely.box(0, -10, 60, 40)),))
    made = board(trace, near, far, heights_mm=[1.0, 1.0])
    judged = judge(scene(made), *crossings(made))
    assert [f for f in judged.findings if f.kind == "edge-run"] == []
    assert COVERED in {count.what for count in judged.counts}
