"""Each Gerber command on the smallest file whose answer a reader can work out."""

from __future__ import annotations

from math import pi, sqrt

import pytest
import shapely
from shapely import Polygon

from splitcheck.copper import gerber, paint
from splitcheck.copper.marks import Drawing, Fill, Flash, Stroke, Tag

HEAD = "%FSLAX33Y33*%%MOMM*%%ADD10C,1*%%ADD11R,2X1*%G01*G75*\n"


def read(body: str, head: str = HEAD) -> Drawing:
    """The body after a usual header."""
    return gerber.read(head + body + "M02*", "it.gbr")


def copper(body: str, head: str = HEAD) -> tuple[Polygon, ...]:
    """Its copper."""
    return paint.paint(read(body, head).marks)


def area_mm2(body: str, head: str = HEAD) -> float:
    """Area of its copper."""
    return sum(piece.area for piece in copper(body, head))


def bounds_mm(body: str, head: str = HEAD) -> tuple[float, ...]:
    """Box round its copper."""
    found = shapely.total_bounds(copper(body, head))
    return tuple(round(float(value), 6) for value in found)


class TestOperations:
    """D01, D02, D03 and the aperture in hand."""

    def test_stroke_keeps_its_centre_line_width_and_line(self) -> None:
        """D02 then D01 is one stroke, as drawn."""
        (mark,) = read("D10*\nX0Y0D02*\nX3000Y4000D01*\n").marks
        assert mark == Stroke(((0.0, 0.0), (3.0, 4.0)), 1.0, None, True, Tag(), 4)

    def test_stroke_has_width_times_length_and_two_half_circles(self) -> None:
        """5 mm long, 1 mm wide: 5 + pi/4 mm2, the area of the caps being exact."""
        assert area_mm2("D10*X0Y0D02*X3000Y4000D01*") == pytest.approx(5 + pi / 4, rel=1e-6)

    def test_flash_of_a_circle_has_its_area(self) -> None:
        """Equal-area corners: a 1 mm pad has pi/4 mm2."""
        assert area_mm2("D10*X5000Y5000D03*") == pytest.approx(pi / 4, rel=1e-6)
        (mark,) = read("D10*X5000Y5000D03*").marks
        assert isinstance(mark, Flash)
        assert (mark.at, mark.diameter_mm) == ((5.0, 5.0), 1.0)

    def test_stroke_of_no_length_is_a_dot(self) -> None:
        """D01 to the same point leaves the aperture's own print."""
        assert area_mm2("D10*X0Y0D02*X0Y0D01*") == pytest.approx(pi / 4, rel=1e-6)

    def test_missing_coordinate_keeps_its_value(self) -> None:
        """X and Y are modal, and D01 alone stays where it is."""
        marks = read("D10*X1000Y2000D02*Y5000D01*X2000D01*").marks
        assert [m.points[-1] for m in marks if isinstance(m, Stroke)] == [(1.0, 5.0), (2.0, 5.0)]

    def test_coordinates_alone_repeat_the_last_operation(self) -> None:
        """Old files give D01 or D03 once."""
        marks = read("D10*X0Y0D02*X1000D01*X2000*D11*X0Y0D03*X5000*").marks
        assert [type(m) for m in marks] == [Stroke, Stroke, Flash, Flash]

    def test_aperture_code_does_not_change_the_last_operation(self) -> None:
        """Dnn between modal flashes is a selection and nothing else."""
        marks = read("D10*X0Y0D03*D11*X5000*").marks
        assert [m.diameter_mm for m in marks if isinstance(m, Flash)] == [1.0, None]

    def test_g54_selects_an_aperture(self) -> None:
        """The old announcement of an aperture code."""
        assert bounds_mm("G54D11*X0Y0D03*") == (-1, -0.5, 1, 0.5)

    def test_word_parts_may_come_in_any_order_and_with_line_ends(self) -> None:
        """Line ends inside a word do not count, and are still counted."""
        (mark,) = read("D10*\nX0Y0D02*\nG01 Y4000\nX3000D01*").marks
        assert isinstance(mark, Stroke)
        assert mark.points == ((0.0, 0.0), (3.0, 4.0))

    def test_rectangle_sweeps_a_hull(self) -> None:
        """A 2 x 1 mm rectangle dragged by (3, 4): 2*1 + 2*4 + 1*3 mm2."""
        assert area_mm2("D11*X0Y0D02*X3000Y4000D01*") == pytest.approx(13.0)
        (mark,) = read("D11*X0Y0D02*X3000Y4000D01*").marks
        assert isinstance(mark, Stroke)
        assert mark.width_mm == 1.0

    def test_aperture_of_no_size_paints_nothing(self) -> None:
        """A zero circle is allowed, marks its stroke, and leaves no copper."""
        head = HEAD + "%ADD12C,0*%"
        assert len(read("D12*X0Y0D02*X9000D01*X0D03*", head).marks) == 1
        assert copper("D12*X0Y0D02*X9000D01*X0D03*", head) == ()


class TestNumbers:
    """FS, MO and their old forms."""

    def test_inch_and_mm_agree(self) -> None:
        """One inch is 25.4 mm, in coordinates and in apertures."""
        inch = "%FSLAX24Y24*%%MOIN*%%ADD10C,0.1*%"
        (mark,) = read("D10*X0Y0D02*X10000D01*", inch).marks
        assert mark == Stroke(((0.0, 0.0), (25.4, 0.0)), 2.54, None, True, Tag(), 1)

    @pytest.mark.parametrize(
        ("format_", "digits", "mm"),
        [
            ("FSLAX24Y24", "15", 0.0015),
            ("FSTAX24Y24", "15", 15.0),
            ("FSTAX24Y24", "-015", -1.5),
            ("FSLAX46Y46", "-1234567", -1.234567),
            ("FSLAX26Y26", "+1000000", 1.0),
            ("FSLAN2X33Y33", "1500", 1.5),
            ("FSLAX33Y33", "1.5", 1.5),
            ("FSTAX33Y33", "1.5", 1.5),
        ],
    )
    def test_number_formats(self, format_: str, digits: str, mm: float) -> None:
        """Leading or trailing zeros left out, signs, more digits than the format, decimals."""
        (mark,) = read(f"D10*X{digits}Y0D03*", f"%{format_}*%%MOMM*%%ADD10C,1*%").marks
        assert isinstance(mark, Flash)
        assert mark.at == (mm, 0.0)

    def test_incremental_coordinates_add_up(self) -> None:
        """G91 and FSLI count from the last point, G90 from the origin."""
        body = "D10*X1000Y1000D03*G91*X1000D03*Y-500D03*G90*X0Y0D03*"
        at = [m.at for m in read(body).marks if isinstance(m, Flash)]
        assert at == [(1, 1), (2, 1), (2, 0.5), (0, 0)]
        incremental = HEAD.replace("FSLA", "FSLI")
        marks = read("D10*X1000Y0D03*X1000D03*", incremental).marks
        assert [m.at for m in marks if isinstance(m, Flash)] == [(1, 0), (2, 0)]

    def test_units_by_g70_where_mo_is_missing(self) -> None:
        """The old unit codes do; an aperture defined before them waits for its unit."""
        (mark,) = read("G70*D10*X1000Y0D03*", "%FSLAX33Y33*%%ADD10C,1*%").marks
        assert isinstance(mark, Flash)
        assert (mark.at, mark.diameter_mm) == ((25.4, 0.0), 25.4)


class TestArcs:
    """G02 and G03 in both modes."""

    @pytest.mark.parametrize("clockwise", [False, True])
    @pytest.mark.parametrize("quadrant", range(4))
    @pytest.mark.parametrize("single", [False, True])
    def test_quarter_disc_in_each_quadrant(
        self, quadrant: int, clockwise: bool, single: bool
    ) -> None:
        """A pie of a quarter of a 2 mm circle has pi mm2, whichever way and mode."""
        corners = [(2000, 0), (0, 2000), (-2000, 0), (0, -2000)]
        start, end = corners[quadrant], corners[(quadrant + 1) % 4]
        if clockwise:
            start, end = end, start
        i, j = -start[0], -start[1]
        if single:
            i, j = abs(i), abs(j)
        body = (
            f"{'G74' if single else 'G75'}*G36*G01*X0Y0D02*X{start[0]}Y{start[1]}D01*"
            f"{'G02' if clockwise else 'G03'}*X{end[0]}Y{end[1]}I{i}J{j}D01*G01*X0Y0D01*G37*"
        )
        assert area_mm2(body) == pytest.approx(pi, rel=1e-5)

    def test_three_quarters_only_in_multi_quadrant_mode(self) -> None:
        """From (2, 0) clockwise to (0, 2) round the origin: three quarters, 3 pi mm2."""
        body = "G36*X0Y0D02*G01*X2000D01*G02*X0Y2000I-2000J0D01*G01*X0Y0D01*G37*"
        assert area_mm2(body) == pytest.approx(3 * pi, rel=1e-5)

    def test_same_start_and_end_is_a_whole_circle(self) -> None:
        """In multi-quadrant mode; in single-quadrant mode it has no length."""
        whole = "G36*X2000Y0D02*G03*X2000Y0I-2000J0D01*G37*"
        assert area_mm2(whole) == pytest.approx(4 * pi, rel=1e-5)
        assert area_mm2("G74*" + whole) == 0
        ring = "D10*X2000Y0D02*G03*I-2000D01*"
        assert area_mm2(ring) == pytest.approx(pi * (2.5**2 - 1.5**2), rel=2e-3)
        assert area_mm2("G74*" + ring) == pytest.approx(pi / 4, rel=1e-5)

    def test_chords_stay_within_two_micrometres(self) -> None:
        """Each corner and each chord's middle, on a 50 mm arc."""
        (mark,) = read("D10*X50000Y0D02*G03*X0Y50000I-50000J0D01*").marks
        assert isinstance(mark, Stroke)
        chords = list(zip(mark.points, mark.points[1:], strict=False))
        reach = [sqrt(x * x + y * y) for x, y in mark.points]
        reach += [sqrt((a[0] + b[0]) ** 2 + (a[1] + b[1]) ** 2) / 2 for a, b in chords]
        assert max(abs(value - 50) for value in reach) < 0.002 + 1e-6

    def test_arcs_without_mode_are_read_by_their_centre(self) -> None:
        """Without G74 or G75 the centre tells; and it is told."""
        head = HEAD.replace("G75*", "")
        signed = "G36*X0Y0D02*G01*X2000D01*G03*X0Y2000I-2000J0D01*G01*X0Y0D01*G37*"
        unsigned = signed.replace("I-2000", "I2000")
        assert area_mm2(signed, head) == pytest.approx(pi, rel=1e-5)
        assert area_mm2(unsigned, head) == pytest.approx(pi, rel=1e-5)
        assert any("G74 or G75" in remark for remark in read(signed, head).remarks)


class TestApertures:
    """AD with the standard templates."""

    @pytest.mark.parametrize(
        ("definition", "area"),
        [
            ("C,2", pi),
            ("C,2X1", pi - pi / 4),
            ("R,2X1", 2.0),
            ("R,2X1X0.5", 2 - pi / 16),
            ("R,2X2X1X0.5", 3.5),
            ("O,3X1", 2 + pi / 4),
            ("O,1X3X0.5", 2 + pi / 4 - pi / 16),
            ("O,2X2", pi),
            ("P,2X6", 1.5 * sqrt(3)),
            ("P,2X4X45", 2.0),
            ("P,2X4X0X0.5", 2 - pi / 16),
            ("R,2", 4.0),
        ],
    )
    def test_standard_apertures_have_their_area(self, definition: str, area: float) -> None:
        """Closed forms, holes taken out."""
        head = HEAD + f"%ADD20{definition}*%"
        assert area_mm2("D20*X0Y0D03*", head) == pytest.approx(area, rel=1e-5)

    def test_polygon_starts_on_its_x_axis(self) -> None:
        """The first corner of a polygon lies at angle 0 plus its rotation."""
        assert bounds_mm("D20*X0Y0D03*", HEAD + "%ADD20P,2X4*%") == (-1, -1, 1, 1)
        r = round(sqrt(0.5), 6)
        assert bounds_mm("D20*X0Y0D03*", HEAD + "%ADD20P,2X4X45*%") == (-r, -r, r, r)

    def test_obround_reaches_its_box(self) -> None:
        """Both ways of lying."""
        assert bounds_mm("D20*X0Y0D03*", HEAD + "%ADD20O,3X1*%")[1::2] == (-0.5, 0.5)
        assert bounds_mm("D20*X0Y0D03*", HEAD + "%ADD20O,1X3*%")[0::2] == (-0.5, 0.5)

    def test_redefined_code_counts_from_there_on(self) -> None:
        """Earlier flashes keep the earlier aperture."""
        marks = read("D10*X0Y0D03*%ADD10C,3*%X0Y0D03*").marks
        assert [m.diameter_mm for m in marks if isinstance(m, Flash)] == [1.0, 3.0]

    def test_names_that_the_grammar_refuses(self) -> None:
        """Macro names with a dash come from common exporters."""
        head = HEAD + "%AMR-32*21,1,1,2,0,0,0*%%ADD20R-32*%"
        assert area_mm2("D20*X0Y0D03*", head) == pytest.approx(2.0)


class TestTransformations:
    """LM, LR and LS."""

    head = HEAD + "%AMT*4,1,3,0,0,2,0,0,1,0,0,0*%%ADD20T*%"

    @pytest.mark.parametrize(
        ("commands", "bounds"),
        [
            ("", (0, 0, 2, 1)),
            ("%LMX*%", (-2, 0, 0, 1)),
            ("%LMY*%", (0, -1, 2, 0)),
            ("%LMXY*%", (-2, -1, 0, 0)),
            ("%LR90*%", (-1, 0, 0, 2)),
            ("%LR-90.0*%", (0, -2, 1, 0)),
            ("%LS0.5*%", (0, 0, 1, 0.5)),
            ("%LR90*%%LMX*%", (-1, -2, 0, 0)),
            ("%LMX*%%LR90*%%LS2*%", (-2, -4, 0, 0)),
            ("%LMX*%%LMN*%", (0, 0, 2, 1)),
        ],
    )
    def test_flash_is_mirrored_then_turned_then_scaled(
        self, commands: str, bounds: tuple[float, ...]
    ) -> None:
        """A right triangle (0,0) (2,0) (0,1) tells all eight placements apart."""
        assert bounds_mm(f"{commands}D20*X0Y0D03*", self.head) == bounds

    def test_scale_changes_a_stroke_and_not_its_path(self) -> None:
        """LS is for apertures."""
        (mark,) = read("%LS3*%D10*X0Y0D02*X5000D01*").marks
        assert isinstance(mark, Stroke)
        assert (mark.points[1], mark.width_mm) == ((5.0, 0.0), 3.0)

    def test_regions_are_not_transformed(self) -> None:
        """LM, LR and LS do not touch regions."""
        square = "G36*X0Y0D02*X2000D01*Y1000D01*X0D01*Y0D01*G37*"
        assert bounds_mm("%LMX*%%LR90*%%LS2*%" + square) == (0, 0, 2, 1)


class TestRepeats:
    """SR and AB."""

    def test_step_repeat_is_copies_written_out(self) -> None:
        """Three columns, two rows."""
        body = "%SRX3Y2I10J20*%D10*X0Y0D03*X1000Y0D03*%SR*%"
        at = [m.at for m in read(body).marks if isinstance(m, Flash)]
        assert at == [(10.0 * c + k, 20.0 * r) for c in range(3) for r in range(2) for k in (0, 1)]

    def test_single_step_repeat_in_a_header_changes_nothing(self) -> None:
        """What some exporters put at the top of each file."""
        assert len(read("%SRX1Y1I0J0*%D10*X0Y0D03*X5000D03*").marks) == 2

    def test_next_step_repeat_ends_the_last(self) -> None:
        """SR in SR is not nested; the end of the file ends it too."""
        body = "%SRX2Y1I5J0*%D10*X0Y0D03*%SRX1Y3I0J5*%X0Y9000D03*"
        assert len(read(body).marks) == 2 + 3

    def test_inch_steps(self) -> None:
        """Steps are in file units."""
        head = "%FSLAX24Y24*%%MOIN*%%ADD10C,0.1*%"
        marks = read("%SRX2Y1I1.0J0*%D10*X0Y0D03*%SR*%", head).marks
        assert [m.at for m in marks if isinstance(m, Flash)] == [(0, 0), (25.4, 0)]

    def test_block_is_its_contents(self) -> None:
        """A block flashed twice, mirrored the second time."""
        block = "%ABD20*%D10*X1000Y0D03*D11*X0Y2000D02*X3000D01*%AB*%"
        body = block + "D20*X10000Y0D03*%LMX*%X20000Y0D03*"
        marks = read(body).marks
        assert [m.at for m in marks if isinstance(m, Flash)] == [(11.0, 0.0), (19.0, 0.0)]
        ends = [m.points for m in marks if isinstance(m, Stroke)]
        assert ends == [((10.0, 2.0), (13.0, 2.0)), ((20.0, 2.0), (17.0, 2.0))]

    def test_clear_block_turns_its_polarities_round(self) -> None:
        """A ring as a block: flashed clear on copper, its hole is filled and it is the cut."""
        head = HEAD + "%ADD30C,4*%%ADD31C,2*%%ADD32C,10*%"
        block = "%ABD20*%D30*X0Y0D03*%LPC*%D31*X0Y0D03*%LPD*%%AB*%"
        assert area_mm2(block + "D20*X0Y0D03*", head) == pytest.approx(3 * pi, rel=1e-5)
        both = block + "D32*X0Y0D03*%LPC*%D20*X0Y0D03*"
        assert area_mm2(both, head) == pytest.approx((25 - 3) * pi, rel=1e-5)

    def test_blocks_nest_and_repeat(self) -> None:
        """A block of a step-repeat, in a block, in a step-repeat."""
        body = (
            "%ABD20*%%SRX2Y1I2J0*%D10*X0Y0D03*%SR*%%AB*%"
            "%ABD21*%D20*X0Y0D03*X0Y5000D03*%AB*%"
            "%SRX3Y1I20J0*%D21*X0Y0D03*%SR*%"
        )
        assert len(read(body).marks) == 2 * 2 * 3


class TestRegions:
    """G36 and G37."""

    def test_each_move_ends_a_contour(self) -> None:
        """Two squares in one region."""
        body = (
            "G36*X0Y0D02*X1000D01*Y1000D01*X0D01*Y0D01*"
            "X5000D02*X6000D01*Y1000D01*X5000D01*Y0D01*G37*"
        )
        marks = read(body).marks
        assert [len(m.ring) for m in marks if isinstance(m, Fill)] == [5, 5]
        assert area_mm2(body) == pytest.approx(2.0)

    def test_cut_in_is_a_hole(self) -> None:
        """A 10 x 10 square with a 2 x 2 hole reached by a line there and back."""
        body = (
            "G36*X0Y0D02*X10000D01*Y10000D01*X0D01*Y5000D01*X4000D01*Y6000D01*X6000D01*"
            "Y4000D01*X4000D01*Y5000D01*X0D01*Y0D01*G37*"
        )
        (piece,) = copper(body)
        assert piece.area == pytest.approx(96.0)
        assert len(piece.interiors) == 1

    def test_region_takes_its_function_from_the_dictionary(self) -> None:
        """Not from the aperture in hand (X2, clause 5.3 of the format)."""
        body = (
            "%TA.AperFunction,ViaPad*%%ADD20C,1*%%TD*%D20*%TA.AperFunction,Conductor*%%TO.N,GND*%"
            "G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*%TD*%X0Y0D03*"
        )
        assert [m.tag for m in read(body).marks] == [
            Tag(net="GND", function="Conductor"),
            Tag(function="ViaPad"),
        ]

    def test_open_contour_is_closed_and_told(self) -> None:
        """The format wants it closed; readers close it."""
        body = "G36*X0Y0D02*X1000D01*Y1000D01*G37*"
        assert area_mm2(body) == pytest.approx(0.5)
        assert "it.gbr:2: a contour that does not close is closed" in read(body).remarks


class TestPolarity:
    """LP and IP."""

    def test_paint_follows_file_order(self) -> None:
        """Dark, clear, dark: the last dot stands in the hole."""
        head = HEAD + "%ADD30C,9*%%ADD31C,5*%%ADD32C,1*%"
        body = "D30*X0Y0D03*%LPC*%D31*X0Y0D03*%LPD*%D32*X0Y0D03*"
        first, second = copper(body, head)
        assert first.area == pytest.approx((81 - 25) * pi / 4, rel=1e-5)
        assert second.area == pytest.approx(pi / 4, rel=1e-5)

    @pytest.mark.parametrize("command", ["%IPNEG*%", "%TF.FilePolarity,Negative*%"])
    def test_negative_image_is_declared(self, command: str) -> None:
        """By IP or by attribute; the marks stay as they are drawn."""
        assert read(command + "D10*X0Y0D03*").image_negative
        assert not read("%IPPOS*%%TF.FilePolarity,Positive*%").image_negative


class TestOldImageParameters:
    """OF, MI, SF, IR and AS."""

    @pytest.mark.parametrize(
        ("commands", "at", "bounds"),
        [
            ("%OFA10B-5*%", (13.0, -1.0), (12, -1.5, 14, -0.5)),
            ("%MIA1B0*%", (-3.0, 4.0), (-4, 3.5, -2, 4.5)),
            ("%MIA0B1*%", (3.0, -4.0), (2, -4.5, 4, -3.5)),
            ("%SFA2.0B1*%", (6.0, 4.0), (5, 3.5, 7, 4.5)),
            ("%IR90*%", (-4.0, 3.0), (-4.5, 2, -3.5, 4)),
            ("%IR270*%%OFA10*%", (4.0, -13.0), (3.5, -14, 4.5, -12)),
            ("%IR0*IPPOS*OFA0B0*MIA0B0*SFA1.0B1.0*%", (3.0, 4.0), (2, 3.5, 4, 4.5)),
            ("%ASAYBX*%", (3.0, 4.0), (2, 3.5, 4, 4.5)),
        ],
    )
    def test_whole_image_is_changed(
        self, commands: str, at: tuple[float, float], bounds: tuple[float, ...]
    ) -> None:
        """Order MI, SF, OF, IR; only IR turns apertures; AS concerns plotters only."""
        (mark,) = read(commands + "D11*X3000Y4000D03*").marks
        assert isinstance(mark, Flash)
        assert mark.at == at
        assert bounds_mm(commands + "D11*X3000Y4000D03*") == bounds

    def test_a_change_is_told_and_the_identity_is_not(self) -> None:
        """Half of all old files carry the identity."""
        assert read("%OFA0B0*%%IR0*%%MIA0B0*%%SFA1B1*%").remarks == ()
        assert "'MIA1B0'" in read("%MIA1B0*%").remarks[0]


class TestAttributes:
    """TF, TA, TO and TD."""

    def test_object_attributes_make_the_tag(self) -> None:
        """Net, component and pin; TD takes one away or all."""
        body = (
            "%TA.AperFunction,SMDPad,CuDef*%%ADD20C,1*%%TD*%D20*"
            "%TO.P,U1,7,CLK*%%TO.N,/A\\u002CB*%X0Y0D03*"
            "%TD.P*%%TO.C,R5*%X1000D03*%TD*%X2000D03*%TO.N,*%X3000D03*"
        )
        assert [m.tag for m in read(body).marks] == [
            Tag("/A,B", "SMDPad", "U1", "7"),
            Tag("/A,B", "SMDPad", "R5", None),
            Tag(None, "SMDPad", None, None),
            Tag("", "SMDPad", None, None),
        ]

    def test_equal_states_share_one_tag(self) -> None:
        """Marks stay light."""
        marks = read("D10*%TO.N,A*%X0Y0D03*%TO.N,B*%X1D03*%TO.N,A*%X2D03*").marks
        assert marks[0].tag is marks[2].tag
        assert marks[0].tag is not marks[1].tag

    def test_attributes_in_comments_count(self) -> None:
        """The way of older exporters: G04 #@! before each."""
        body = "G04 #@! TF.FileFunction,Copper,L2,Inr*\nG04 #@! TO.N,GND*\nD10*X0Y0D03*"
        drawing = read(body)
        assert drawing.attribute(".FileFunction") == ("Copper", "L2", "Inr")
        assert drawing.marks[0].tag.net == "GND"

    def test_escapes_of_both_ages(self) -> None:
        """Backslash u and four digits; older writers leave the u out."""
        body = r"%TF.Part,a\u0025b\002Ac*%"
        assert read(body).attribute(".Part") == ("a%b*c",)

    def test_pad_alone_on_its_net_names_no_net(self) -> None:
        """N/C joins nothing; several nets on one object are unknown, and told."""
        assert read("D10*%TO.N,N/C*%X0Y0D03*").marks[0].tag.net == ""
        drawing = read("D10*%TO.N,A,B*%X0Y0D03*")
        assert drawing.marks[0].tag.net is None
        assert "several nets" in drawing.remarks[0]

    def test_block_flash_gives_what_its_marks_lack(self) -> None:
        """The outer net where the inner mark has none."""
        body = "%ABD20*%D10*X0Y0D03*%TO.N,IN*%X5000D03*%TD*%%AB*%%TO.N,OUT*%D20*X0Y0D03*"
        assert [m.tag.net for m in read(body).marks] == ["OUT", "IN"]


class TestSyntax:
    """Words, blocks, comments, ends."""

    def test_several_commands_in_one_block_and_over_lines(self) -> None:
        """Common in one family of exporters."""
        (mark,) = read("D10*\nX1000Y0D03*", "%FSLAX33Y33*\nMOMM*\nADD10C,1*%\n").marks
        assert mark.line == 5

    def test_percent_sign_in_a_comment(self) -> None:
        """It opens nothing."""
        assert len(read("G04 100% of it, 5%*\nD10*X0Y0D03*G04 X1Y1D03*").marks) == 1

    def test_whole_commands_inside_comments(self) -> None:
        """Percent signs and all: the attribute counts, and nothing after it is lost."""
        body = "G04 #@! %TF.Part,Single*%*\nG04 #@! %TO.N,GND*%\nD10*\nX0Y0D03*\n%LPC*%X1D03*"
        drawing = read(body)
        assert drawing.attribute(".Part") == ("Single",)
        assert [(m.dark, m.tag.net, m.line) for m in drawing.marks] == [
            (True, "GND", 5),
            (False, "GND", 6),
        ]

    @pytest.mark.parametrize("head", ["", "G36*", "G91*", "G02*"])
    @pytest.mark.parametrize(
        "file_head",
        [
            HEAD,
            HEAD.replace("MOMM", "MOIN"),
            HEAD.replace("FSLAX33Y33", "FSTAX16Y16"),
            HEAD.replace("33", "26"),
        ],
    )
    @pytest.mark.parametrize("between", ["\n", "", "\r\n", "\n\n"])
    def test_runs_are_read_as_word_by_word(self, head: str, file_head: str, between: str) -> None:
        """Long runs of straight draws go another way through the reader, to the same marks."""
        words = [f"X{101 * n % 907}Y{-53 * n % 811}D01*{between}" for n in range(1, 40)]
        end = ("X101Y758D01*G37*" if head == "G36*" else "") + "X5Y5D03*"
        begin = f"D10*X101Y758D02*{head}"
        at_once = read(begin + "".join(words) + end, file_head).marks
        singly = read(begin + "G04*".join(words) + end, file_head).marks
        assert at_once == singly

    def test_end_of_file_codes(self) -> None:
        """M02 and M00 end, M01 does not; what follows the end is not read."""
        assert len(read("D10*X0Y0D03*M00*X1D03*%JUNK").marks) == 1
        assert len(read("D10*X0Y0D03*M01*X1D03*").marks) == 2

    def test_missing_end_is_told(self) -> None:
        """M02 missing is a remark; without its star it is not even that."""
        assert "no end command" in gerber.read(HEAD + "D10*X0Y0D03*\n", "it.gbr").remarks[0]
        assert gerber.read(HEAD + "D10*X0Y0D03*M02", "it.gbr").remarks == ()

    def test_names_of_image_and_layers_are_skipped(self) -> None:
        """IN and LN say nothing of the image."""
        assert read("%INTop of it*%%LNcopper*%").remarks == ()

    def test_unknown_commands_are_told_once_a_kind(self) -> None:
        """With their first line and count."""
        remarks = read("G99*\nG99*\n%QQ1*%\nD05*\nHELLO*\n").remarks
        assert remarks == (
            "it.gbr:2: unknown code G99 (2 times)",
            "it.gbr:4: unknown command 'QQ' is skipped",
            "it.gbr:5: unknown code D05",
            "it.gbr:6: unknown word 'HELLO' is skipped",
        )

    @pytest.mark.parametrize(
        ("body", "marks", "remark"),
        [
            ("X0Y0*D10*X0Y0D03*", 1, "coordinates before any D01, D02 or D03 are taken as a move"),
            ("D10*X5Y5D11*X0Y0D03*", 1, "coordinates together with an aperture code are left out"),
            ("G37*D10*X0Y0D03*", 1, "an end of a region (G37) without its begin"),
            ("%AB*%D10*X0Y0D03*", 1, "an end of a block aperture (AB) without its begin"),
            ("G36*X0Y0D02*X0Y0D03*G37*", 0, "a flash inside a region is left out"),
            (
                "G36*X0Y0D02*X9D01*X0D01*G37*",
                0,
                "a contour of fewer than three corners is left out",
            ),
            ("D10*X0Y0D02*G02*X9Y9D01*", 1, "an arc without a centre is drawn straight"),
            (
                "G74*D10*X1000Y0D02*G03*X-1000Y0I1000J0D01*",
                1,
                "an arc of more than a quarter turn in single-quadrant mode (G74)",
            ),
            (
                "%ABD20*%%AB*%D20*X0Y0D02*X9D01*",
                0,
                "a line drawn with a block aperture is left out",
            ),
            ("M99*D10*X0Y0D03*", 1, "unknown code M99"),
            ("LPC*D10*X0Y0D03*", 1, "command 'LP' stands outside of percent signs"),
            ("D10*X0Y0D03%LPC*%*X1D03*", 2, "a word without its star before a percent sign"),
            ("G71*G70*D10*X0Y0D03*", 1, "units change to inch (G70)"),
            ("%TO*%D10*X0Y0D03*", 1, "an attribute without a name"),
        ],
    )
    def test_what_is_odd_is_read_and_told(self, body: str, marks: int, remark: str) -> None:
        """Each with its line; nothing else is said."""
        drawing = read(body)
        assert len(drawing.marks) == marks
        assert drawing.remarks == (f"it.gbr:2: {remark}",)

    def test_old_forms_are_read_without_a_word(self) -> None:
        """Sequence numbers, several G codes in a word, parts of SR left out, G55 and G00."""
        body = "N10G01G75X0Y0D02*N20G54D10*G55X0Y0D03*G00X5Y5D02*%SRX2I5*%X0Y0D03*%SR*%"
        drawing = read(body)
        assert [m.at for m in drawing.marks if isinstance(m, Flash)] == [(0, 0), (0, 0), (5, 0)]
        assert drawing.remarks == ()

    def test_byte_order_mark_is_skipped(self) -> None:
        """However it was decoded."""
        for mark in ("\ufeff", "\xef\xbb\xbf"):
            assert len(read("D10*X0Y0D03*", mark + HEAD).marks) == 1

    def test_lines_are_counted_everywhere(self) -> None:
        """Through comments, macros, blocks of commands and blank lines."""
        body = "G04 a\nb*\n%AMX*\n1,1,1,0,0*\n%\n\n\n%TO.N,A*%\nD10*\nX0Y0D03*\nX1D03*\n"
        assert [m.line for m in read(body).marks] == [11, 12]
