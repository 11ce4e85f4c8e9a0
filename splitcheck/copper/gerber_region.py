"""Regions (G36/G37): contours as they are drawn, each ended by a move."""

from __future__ import annotations

from splitcheck.copper.gerber_attributes import Attributes
from splitcheck.copper.gerber_log import Log
from splitcheck.copper.marks import NO_TAG, Fill, Point


class Region:
    """The region being drawn, if one is open."""

    def __init__(self, log: Log, attributes: Attributes) -> None:
        self.log = log
        self.attributes = attributes
        self.corners: list[Point] | None = None
        """Corners of the present contour; ``None`` outside of regions."""
        self._tag = NO_TAG
        self._line = 0
        self._contour_line = 0

    def begin(self) -> None:
        """Carry out G36."""
        if self.corners is not None:
            self.log.fail("a region (G36) begins inside another")
        self.corners = []
        self._line = self._contour_line = self.log.line
        # A region takes aperture attributes from the dictionary, not from an aperture.
        self._tag = self.attributes.tag(self.attributes.function())

    def draw(self, start: Point, points: list[Point] | tuple[Point, ...]) -> None:
        """Go on with the present contour; without a move before, it starts where the pen is."""
        assert self.corners is not None
        if not self.corners:
            self.corners.append(start)
            self._contour_line = self.log.line
        self.corners.extend(points)

    def ended_contour(self, *, dark: bool) -> list[Fill]:
        """The contour that a move or G37 ends, if it is one."""
        corners = self.corners or []
        self.corners = []
        if len(corners) < 2:
            return []
        if corners[0] != corners[-1]:
            self.log.remark("a contour that does not close is closed")
            corners.append(corners[0])
        if len(corners) < 4:
            self.log.remark("a contour of fewer than three corners is left out")
            return []
        return [Fill(tuple(corners), dark, self._tag, self._contour_line)]

    def move(self, at: Point) -> None:
        """Start the next contour."""
        self.corners = [at]
        self._contour_line = self.log.line

    def end(self) -> None:
        """Carry out G37, after its last contour was taken."""
        self.corners = None

    def check_ended(self) -> None:
        """An open region at the end of the file is a file cut off."""
        if self.corners is not None:
            self.log.fail("a region (G36) is never ended (G37)", line=self._line)
