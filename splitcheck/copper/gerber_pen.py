"""The pen of a Gerber file: where it is, and what it leaves as it moves, draws and flashes."""

from __future__ import annotations

from itertools import count, pairwise, repeat

from splitcheck.copper import curves
from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_canvas import Canvas
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.gerber_region import Region
from splitcheck.copper.gerber_tools import Tools
from splitcheck.copper.marks import Flash, Point, Stroke


class Pen:
    """Place, polarity and arc mode; strokes, flashes and contours go to the canvas."""

    def __init__(self, log: Log, tools: Tools, canvas: Canvas, attributes: Attributes) -> None:
        self.log = log
        self.tools = tools
        self.canvas = canvas
        self.region = Region(log, attributes)
        self.at: Point = (0.0, 0.0)
        self.dark = True
        self.quadrant: bool | None = None
        """True: single quadrant (G74), False: multi (G75), ``None``: not said."""

    def move_to(self, end: Point) -> None:
        """Carry out D02: inside a region it ends the contour."""
        self.at = end
        if self.region.corners is not None:
            self.canvas.marks += self.region.ended_contour(dark=self.dark)
            self.region.move(end)

    def flash_at(self, end: Point) -> None:
        """Carry out D03."""
        self.at = end
        if self.region.corners is None:
            self._flash()
        else:
            self.log.remark("a flash inside a region is left out")

    def lines_to(self, points: list[Point], newlines: int) -> None:
        """Draw straight through points; strokes stand one on each line of the file."""
        if self.region.corners is not None:
            self.region.draw(self.at, points)
            self.log.line += newlines
        elif (width_mm := (self.tools.brush or self.tools.take()).diameter_mm) is not None:
            tag = self.tools.tag or self.tools.make_tag()
            ends = pairwise((self.at, *points))
            rest = repeat(width_mm), repeat(None), repeat(self.dark), repeat(tag)
            self.canvas.marks.extend(map(Stroke, ends, *rest, count(self.log.line)))
            self.log.line += len(points) - 1
        else:
            for start, end in pairwise((self.at, *points)):
                self._stroke((start, end))
                self.log.line += 1
            self.log.line -= 1
        self.at = points[-1]

    def line_to(self, end: Point) -> None:
        """Draw straight on: a stroke, or one more corner of a region."""
        if self.region.corners is None:
            self._stroke((self.at, end))
        else:
            self.region.draw(self.at, (end,))
        self.at = end

    def _stroke(self, points: tuple[Point, ...]) -> None:
        tools = self.tools
        brush = tools.brush or tools.take()
        tag = tools.tag or tools.make_tag()
        marks, line = self.canvas.marks, self.log.line
        if brush.diameter_mm is not None:
            marks.append(Stroke(points, brush.diameter_mm, None, self.dark, tag, line))
        elif brush.block is not None:
            self.log.remark("a line drawn with a block aperture is left out")
        else:
            for shape in brush.shapes:
                marks.append(Stroke(points, brush.width_mm, shape, self.dark, tag, line))

    def _flash(self) -> None:
        tools = self.tools
        brush = tools.brush or tools.take()
        tag = tools.tag or tools.make_tag()
        at, dark, line = self.at, self.dark, self.log.line
        if brush.block is not None:
            self.canvas.set_down(brush.block, tools.setting, at, tag, line, dark=dark)
            return
        for shape in brush.shapes:
            self.canvas.marks.append(Flash(at, shape, dark, tag, line, brush.diameter_mm))

    def arc_to(self, end: Point, offset: Point, *, clockwise: bool) -> None:
        """Draw an arc whose centre lies at ``offset`` from where the pen is."""
        start = self.at
        if offset == (0.0, 0.0):
            self.log.remark("an arc without a centre is drawn straight")
            points = [end]
        elif self._single_quadrant(start, end, offset, clockwise=clockwise):
            centre, fits = curves.quadrant_centre(start, end, offset, clockwise=clockwise)
            if not fits:
                self.log.remark("an arc of more than a quarter turn in single-quadrant mode (G74)")
            # In this mode an arc between equal points has no length, and is no circle.
            points = [end] if start == end else curves.arc(start, end, centre, clockwise=clockwise)
        else:
            centre = (start[0] + offset[0], start[1] + offset[1])
            points = curves.arc(start, end, centre, clockwise=clockwise)
        if self.region.corners is None:
            self._stroke((start, *points))
        else:
            self.region.draw(start, points)
        self.at = end

    def _single_quadrant(self, start: Point, end: Point, offset: Point, *, clockwise: bool) -> bool:
        if self.quadrant is not None:
            return self.quadrant
        self.log.remark("arcs without G74 or G75; each is read the way that its centre fits")
        if min(offset) < 0 or start == end:
            return False
        return curves.quadrant_centre(start, end, offset, clockwise=clockwise)[1]

    def end_region(self) -> None:
        """Carry out G37."""
        if self.region.corners is None:
            self.log.remark("an end of a region (G37) without its begin")
            return
        self.canvas.marks += self.region.ended_contour(dark=self.dark)
        self.region.end()
