"""What counts as a finding and what does not, on boards one can draw."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
import shapely
from shapely import Polygon

from splitcheck.board.board import Board
from splitcheck.copper.holes import Hole
from splitcheck.verdict.findings import Count, Finding
from splitcheck.verdict.judge import judge
from tests.making.hand import Line, Sheet, board, crossings, scene, via

WHOLE = shapely.box(0, 0, 40, 30)
#: 1 mm wide, 10 mm long, upright, middle of the board.
SLOT = shapely.box(19.5, 10, 20.5, 20)


def _cut(*holes: Polygon) -> Sheet:
    left = WHOLE.difference(shapely.union_all(holes))
    return Sheet(tuple(("GND", piece) for piece in shapely.get_parts(left)))


def _across(y: float = 15.0, net: str = "CLK") -> Line:
    return Line(net, ((2, y), (38, y)))


def _made(
    lines: Sequence[Line],
    *below: Sheet,
    holes: Sequence[Hole] = (),
    heights_mm: Sequence[float] | None = None,
) -> Board:
    return board(
        Sheet(lines=tuple(lines)), *below, holes=holes, heights_mm=heights_mm, outline=WHOLE
    )


def _judged(made: Board, min_nh: float = 0.05) -> tuple[tuple[Finding, ...], tuple[Count, ...]]:
    judged = judge(scene(made, min_nh), *crossings(made))
    return judged.findings, judged.counts


def _disc(x: float, y: float, size_mm: float) -> Polygon:
    disc = shapely.Point(x, y).buffer(size_mm / 2)
    assert isinstance(disc, Polygon)
    return disc


def test_slot_is_told_with_all_that_is_known_of_it() -> None:
    """A slot 10 mm long and 1 mm wide, crossed midway."""
    (found,), _ = _judged(_made([_across()], _cut(SLOT)))
    assert (found.id, found.kind, found.net) == ("F1", "slot-crossing", "CLK")
    assert (found.layer, found.plane_layer, found.plane_net) == ("L1", "L2", "GND")
    assert found.at_mm == (20.0, 15.0)
    assert found.gap_mm == pytest.approx(1.0)
    assert found.detour_mm == pytest.approx(10.0, abs=0.1)
    assert found.islands == ("L2.1", "L2.1")
    assert (found.source.file, found.source.line) == ("l1.gbr", 1)
    assert found.added_nh is not None
    assert found.error_nh is not None
    assert found.noise_mv is not None
    assert 1.4 < found.added_nh < 2.3  # closed form of a static slot: 2.0 nH by Booker (1946)
    assert 0 < found.error_nh < found.added_nh
    assert found.level == "warning"


def test_whole_plane_gives_nothing() -> None:
    """Not even a count."""
    assert _judged(_made([_across()], _cut())) == ((), ())


@pytest.mark.parametrize(
    ("gap", "kind"),
    [
        (shapely.box(18, 13, 22, 17), "void-crossing"),
        (shapely.box(19.5, 10, 20.5, 20), "slot-crossing"),
        (shapely.box(19.5, -1, 20.5, 20), "slot-crossing"),
        (shapely.box(19.5, -1, 20.5, 31), "split-crossing"),
    ],
)
def test_kinds_of_gap(gap: Polygon, kind: str) -> None:
    """Compact, long and narrow, open at one end, right through."""
    (found,), _ = _judged(_made([_across()], _cut(gap)))
    assert found.kind == kind


def test_islands_joined_by_nothing_carry_no_number() -> None:
    """No way back at all: an error with method none, and a sentence that says so."""
    (found,), _ = _judged(_made([_across()], _cut(shapely.box(19.5, -1, 20.5, 31))))
    assert (found.level, found.method) == ("error", "none")
    assert (found.added_nh, found.error_nh, found.detour_mm, found.noise_mv) == (None,) * 4
    assert "no galvanic way back" in found.reason


def test_split_with_a_stitched_pair_goes_through_it() -> None:
    """The holes are named, and what they cost is a number."""
    made = _made(
        [_across()],
        _cut(shapely.box(19.5, -1, 20.5, 31)),
        _cut(),
        holes=[via(17, 17), via(23, 17)],
        heights_mm=(0.2, 0.5),
    )
    (found,), _ = _judged(made)
    assert (found.kind, found.method != "none") == ("split-crossing", True)
    assert [(use.kind, use.at_mm, use.net) for use in found.bridges] == [
        ("via", (17.0, 17.0), "GND"),
        ("via", (23.0, 17.0), "GND"),
    ]
    assert found.added_nh is not None
    assert found.added_nh > 0.2


def test_one_more_bridge_never_makes_it_worse() -> None:
    """A pair far off, then one near as well."""
    split = _cut(shapely.box(19.5, -1, 20.5, 31))
    far, near = [via(17, 26), via(23, 26)], [via(17, 16), via(23, 16)]
    (one,), _ = _judged(_made([_across()], split, _cut(), holes=far))
    (both,), _ = _judged(_made([_across()], split, _cut(), holes=[*far, *near]))
    assert one.added_nh is not None
    assert both.added_nh is not None
    assert both.added_nh < one.added_nh


def test_stripline_over_a_slot_counts_only_its_share() -> None:
    """A whole plane on the other side at the same distance takes half of the return."""
    (alone,), _ = _judged(_made([_across()], _cut(SLOT)))
    between = board(_cut(), Sheet(lines=(_across(),)), _cut(SLOT), outline=WHOLE)
    (found,), _ = _judged(between)
    assert alone.added_nh is not None
    assert found.added_nh is not None
    assert found.added_nh < alone.added_nh / 4
    assert "50 % of the return" in found.reason


def test_whole_plane_beyond_makes_it_less_and_is_said() -> None:
    """Shielding: 0.2 mm below the slot."""
    (alone,), _ = _judged(_made([_across()], _cut(SLOT)))
    (found,), _ = _judged(_made([_across()], _cut(SLOT), _cut()))
    assert alone.added_nh is not None
    assert found.added_nh is not None
    assert found.added_nh < 0.5 * alone.added_nh
    assert "0.20 mm beyond" in found.reason
    assert "shields the gap" in found.reason


def _with_via(at: tuple[float, float], net: str, antipad_mm: float) -> Board:
    """A trace that runs over the antipad of a via; the via belongs to a net."""
    pad = _disc(*at, 0.6)
    return board(
        Sheet(((net, pad),), (_across(),)),
        _cut(_disc(*at, antipad_mm)),
        Sheet(((net, pad), ("OTHER", shapely.box(1, 1, 2, 2)))),
        holes=[via(*at)],
        outline=WHOLE,
    )


def test_antipad_of_a_nets_own_hole_is_no_finding() -> None:
    """Every via has one; they are counted."""
    found, counts = _judged(_with_via((20, 15), "CLK", 1.6), min_nh=0.0)
    assert found == ()
    assert counts == (Count("antipads at a net's own holes", 1),)


def test_antipad_of_a_foreign_hole_is_judged_by_size() -> None:
    """0.8 mm adds hardly anything, 4 mm does."""
    small, counts = _judged(_with_via((20, 15.35), "BUS", 0.8))
    assert small == ()
    assert [count.number for count in counts] == [1]
    assert "less than 0.05 nH" in counts[0].what
    (large,), _ = _judged(_with_via((20, 15.45), "BUS", 4.0))
    assert large.kind == "void-crossing"


def test_field_of_antipads_at_an_own_hole_is_a_finding() -> None:
    """Eight antipads that have run together are a slot, whoever owns one of the holes."""
    merged = shapely.union_all([_disc(20, 10 + 1.2 * n, 1.6) for n in range(8)])
    assert isinstance(merged, Polygon)
    pad = _disc(20, 14.8, 0.6)
    made = board(
        Sheet((("CLK", pad),), (_across(14.8),)),
        _cut(merged),
        Sheet((("CLK", pad),)),
        holes=[via(20, 14.8)],
        outline=WHOLE,
    )
    (found,), _ = _judged(made)
    assert found.net == "CLK"
    assert found.added_nh is not None
    assert found.added_nh > 0.5


def test_small_crossings_are_counted_not_listed() -> None:
    """With a lower threshold the same crossing is listed."""
    made = _made([_across()], _cut(_disc(20, 15, 0.8)))
    found, (count,) = _judged(made, min_nh=0.5)
    assert found == ()
    assert (count.what, count.number) == ("crossings that add less than 0.5 nH", 1)
    (listed,), _ = _judged(made, min_nh=0.0)
    assert listed.added_nh is not None
    assert listed.added_nh < 0.5


def test_long_run_over_a_stitched_plane_is_a_change_of_plane() -> None:
    """12 mm over the next plane of the same net, stitched at both ends: counted, not listed."""
    window = shapely.box(14, 10, 26, 20)
    made = _made(
        [_across()],
        _cut(window),
        _cut(),
        holes=[via(13, 15.8), via(27, 15.8)],
        heights_mm=(0.2, 0.3),
    )
    found, (count,) = _judged(made)
    assert found == ()
    assert "changes of plane" in count.what
    assert count.number == 1


def test_short_run_over_a_stitched_plane_is_a_crossing() -> None:
    """A slot is a slot with stitching beside it."""
    made = _made(
        [_across()], _cut(SLOT), _cut(), holes=[via(18, 16), via(22, 16)], heights_mm=(0.2, 0.8)
    )
    (found,), _ = _judged(made)
    assert found.kind == "slot-crossing"


def test_no_plane_is_said_once_for_a_net_and_layer() -> None:
    """Three stretches of one net on one layer, and one of another net."""
    half = Sheet((("GND", shapely.box(0, 0, 20, 30)),))
    lines = [Line("CLK", ((18, y), (38, y))) for y in (5, 10, 16)]
    lines.append(Line("CLK", ((18, 5), (18, 16))))
    found, _ = _judged(_made([*lines, Line("DATA", ((18, 25), (30, 25)))], half))
    assert sorted((f.kind, f.net) for f in found) == [("no-plane", "CLK"), ("no-plane", "DATA")]
    clock = next(f for f in found if f.net == "CLK")
    assert clock.gap_mm == pytest.approx(3 * 18)
    assert "in 3 places" in clock.reason
    assert (clock.islands, clock.plane_layer, clock.detour_mm) == ((), "", None)


def test_short_end_without_a_plane_is_counted() -> None:
    """A trace that runs 2 mm beyond the rim to its pad."""
    half = Sheet((("GND", shapely.box(0, 0, 20, 30)),))
    found, (count,) = _judged(_made([Line("CLK", ((5, 15), (22, 15)))], half))
    assert found == ()
    assert count.number == 1
    assert "shorter than 3 mm" in count.what


def test_findings_over_one_gap_name_one_another() -> None:
    """A bus of three over one slot; a fourth net elsewhere stands alone."""
    bus = [_across(14 + n, f"D{n}") for n in range(3)]
    other = shapely.box(29.5, 24, 30.5, 29.5)
    found, _ = _judged(_made([*bus, _across(27, "CLK")], _cut(SLOT, other)))
    shared = {f.net: [share.net for share in f.shares_gap_with] for f in found}
    assert shared == {"CLK": [], "D0": ["D1", "D2"], "D1": ["D0", "D2"], "D2": ["D0", "D1"]}
    assert [f.id for f in found] == ["F1", "F2", "F3", "F4"]
    noises = [f.noise_mv or 0 for f in found]
    assert noises == sorted(noises, reverse=True)


def test_fingerprint_stays_when_a_trace_moves_a_little() -> None:
    """The same place to a millimetre is the same finding; another net or place is another."""

    def fingerprint(y: float, net: str = "CLK") -> str:
        (found,), _ = _judged(_made([_across(y, net)], _cut(SLOT)))
        return found.fingerprint

    assert fingerprint(15.0) == fingerprint(15.2)
    assert len({fingerprint(15.0), fingerprint(13.0), fingerprint(15.0, "DATA")}) == 3


def test_judging_twice_gives_the_same() -> None:
    """Nothing depends on a hash or on what was judged before."""
    lines = [_across(11 + n, f"D{n}") for n in range(6)]
    made = _made(lines, _cut(SLOT, shapely.box(10, 4, 10.5, 22)))
    assert _judged(made) == _judged(made)


def _stripline(cut: Polygon, *holes: tuple[float, float], over: str = "GND") -> Board:
    """A trace 0.2 mm over a broken plane and 0.6 mm under a whole one, of this net.

    Where that is another net than the broken plane's, holes go through antipads in it.
    """
    top = WHOLE if over == "GND" else WHOLE.difference(_dots(holes))
    assert isinstance(top, Polygon)
    return board(
        Sheet(((over, top),)),
        Sheet(lines=(_across(),)),
        _cut(cut),
        holes=[via(x, y) for x, y in holes],
        heights_mm=(0.6, 0.2),
        outline=WHOLE,
    )


def _dots(places: Sequence[tuple[float, float]]) -> shapely.Geometry:
    return shapely.union_all([_disc(x, y, 1.0) for x, y in places])


#: Plated holes 1 mm from either rim of the slot, beside the trace.
STITCHED = [(x, y) for x in (18.5, 21.5) for y in (14.0, 16.0)]


def test_stripline_stitched_close_by_gets_past_the_slot_on_the_other_plane() -> None:
    """Twins: the same slot, with and without plated holes between the two planes."""
    (bare,), _ = _judged(_stripline(SLOT))
    (stitched,), _ = _judged(_stripline(SLOT, *STITCHED))
    assert (bare.method, stitched.method) == ("solved", "solved")
    assert bare.added_nh is not None
    assert stitched.added_nh is not None
    assert stitched.added_nh < 0.75 * bare.added_nh
    assert "gets past the gap on L1" in stitched.reason
    assert "the nearest is 1.4 mm from it" in stitched.reason
    assert "gets past" not in bare.reason
    # closed forms and solve agree, as they know the same ways
    assert (bare.estimated_nh, stitched.estimated_nh) == (None, None)


@pytest.mark.parametrize(
    "made",
    [
        pytest.param(_stripline(SLOT, *[(x, 5.0) for x in (2.0, 38.0)]), id="stitched far away"),
        pytest.param(_stripline(SLOT, *STITCHED, over="VCC"), id="of another net"),
        pytest.param(_stripline(SLOT, (18.5, 14.0)), id="stitched on one side"),
    ],
)
def test_stripline_whose_other_plane_is_not_stitched_nearby_keeps_its_value(made: Board) -> None:
    """A whole plane is no way back by itself."""
    (bare,), _ = _judged(_stripline(SLOT))
    (found,), _ = _judged(made)
    assert bare.added_nh is not None
    assert found.added_nh == pytest.approx(bare.added_nh, rel=0.03)
    assert "gets past" not in found.reason


def test_split_under_a_stripline_is_solved_over_the_holes() -> None:
    """Twins again, the islands apart: with holes a solved number, without the old bound."""
    split = shapely.box(19.5, -1, 20.5, 31)
    (stitched,), _ = _judged(_stripline(split, *STITCHED))
    (bare,), _ = _judged(_stripline(split))
    assert (stitched.kind, bare.kind) == ("split-crossing", "split-crossing")
    assert (stitched.method, bare.method) == ("solved", "estimated")
    assert "all of that gets past the gap on L1" in stitched.reason
    (slot,), _ = _judged(_stripline(SLOT, *STITCHED))
    assert slot.added_nh is not None
    assert stitched.added_nh is not None
    assert slot.added_nh < stitched.added_nh < 1.0
    assert stitched.estimated_nh is None


def test_more_holes_to_the_other_plane_never_make_it_worse() -> None:
    """Holes farther off help less than those close by, and all together most."""
    far = [(x, y) for x in (16.0, 24.0) for y in (11.0, 19.0)]
    values = []
    for holes in ([], far, STITCHED, [*far, *STITCHED]):
        (found,), _ = _judged(_stripline(SLOT, *holes))
        assert found.added_nh is not None
        values.append(found.added_nh)
    assert values[0] > values[1] > values[2] >= values[3] - 1e-9


def _strip(*holes: tuple[float, float]) -> Board:
    """A stripline over two splits 1 mm wide and the island of 1 mm between them, from 19 to 20."""
    splits = [shapely.box(x, -1, x + 1, 31) for x in (18.0, 20.0)]
    outer = [(x, y) for x in (17.0, 22.0) for y in (14.0, 16.0)]
    made = board(
        Sheet((("GND", WHOLE),)),
        Sheet(lines=(_across(),)),
        _cut(*splits),
        holes=[via(x, y) for x, y in [*outer, *holes]],
        heights_mm=(0.6, 0.2),
        outline=WHOLE,
    )
    assert isinstance(made, Board)
    return made


def test_splits_on_either_side_of_a_narrow_island_are_gone_past_at_once() -> None:
    """Twins: the island's own holes far away, and so near that the return may well come back."""
    (once,), _ = _judged(_strip((19.5, 8.0), (19.5, 22.0)))
    assert once.kind == "split-crossing"
    assert once.gap_mm == pytest.approx(2.0)
    assert "2 times in all" in once.reason
    whole = shapely.box(18, -1, 21, 31)
    (as_one,), _ = _judged(_stripline(whole, *[(x, y) for x in (17.0, 22.0) for y in (14.0, 16.0)]))
    assert once.added_nh is not None
    assert as_one.added_nh is not None
    # the island takes some of the return, or none of it
    assert 0.5 * as_one.added_nh < once.added_nh <= as_one.added_nh * 1.05
    each, _ = _judged(_strip((19.5, 15.6), (19.5, 14.4)))
    assert len(each) == 2


def test_a_crowd_of_holes_on_one_side_hides_none_on_the_other() -> None:
    """A slot cuts no islands apart: both ends of the run find the same nearest holes."""
    crowd = [(x, y) for x in (17.5, 18.5) for y in (11.0, 13.0, 14.0, 16.0, 17.0)]
    across = [(24.0, 14.0), (24.0, 16.0)]
    bare, left, both = (
        _judged(_stripline(SLOT, *holes))[0][0].added_nh for holes in ([], crowd, [*crowd, *across])
    )
    assert bare is not None
    assert left == pytest.approx(bare, rel=1e-6)
    assert both is not None
    assert both < 0.9 * bare
