"""Corners of gaps, and the taut steps from each to others that their own gaps leave free."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from splitcheck.units import Floats


@dataclass(slots=True)
class Step:
    """A straight step to a place, and the gaps that it is known to be free of or blocked by."""

    length_mm: float
    to: int
    """Number of the corner among those of its patch."""
    free: int = 0
    """Gaps that it does not run into, as bits."""
    blocked: int = 0
    """Gaps that it runs into, as bits."""


class Touching(NamedTuple):
    """Steps between corners that touch both as a taut string does."""

    start: NDArray[np.intp]
    """Numbers of the corners, or of the patches, that they start from or lead to, in order."""
    to: NDArray[np.intp]
    """Numbers of the corners that they lead to, in their patch."""
    length_mm: Floats
    ends: Floats
    """Shape (n, 2, 2), mm."""


@dataclass(slots=True, eq=False)
class Patch:
    """The corners of one gap, or of a tile of it, at which a taut way may bend.

    What corners see of one another does not depend on who goes there: it is kept for all ways.
    """

    gap: int
    """Index of the gap in its plane."""
    points: Floats
    """Shape (n, 2), mm."""
    sides: Floats
    """Steps along the rim from each corner to those before and after it, shape (2, 2, n)."""
    known: list[dict[Patch, list[Step]]] = field(default_factory=list)
    """Steps of each corner that are known already, to those of any patch."""

    @classmethod
    def of(cls, gap: int, bends: Floats) -> Patch:
        """The patch of corners that come with those before and after them, shape (n, 3, 2)."""
        sides = (bends[:, 1:] - bends[:, :1]).transpose(1, 2, 0)
        return cls(gap, bends[:, 0].copy(), sides.copy(), [{} for _ in bends])

    def __len__(self) -> int:
        """How many corners it has."""
        return len(self.points)

    def pairs(self) -> Touching:
        """Such steps between all of its own corners, each way once: from the lesser number on."""
        x, y = self.points.T
        (ax, ay), (bx, by) = self.sides
        dx, dy = x - x[:, None], y - y[:, None]
        one, other = dx * ay - dy * ax, dx * by - dy * bx
        slack = -1e-15 * (1.0 + dx * dx + dy * dy)
        # seen from the other end a step has the opposite sign, and so has each of the two factors
        meets = np.triu(one * other >= slack, 1)
        leaves = (dx * ay[:, None] - dy * ax[:, None]) * (dx * by[:, None] - dy * bx[:, None])
        start, to = np.nonzero(meets & (leaves >= slack))
        ends = np.stack([self.points[start], self.points[to]], axis=1)
        return Touching(start, to, np.hypot(dx[start, to], dy[start, to]), ends)

    def touching(self, corner: int, patches: Sequence[Patch]) -> Touching:
        """Steps from a corner to those of patches that touch both as a taut string does."""
        at = self.points[corner]
        if len(patches) == 1:
            points, sides = patches[0].points, patches[0].sides
        else:
            points = np.concatenate([patch.points for patch in patches])
            sides = np.concatenate([patch.sides for patch in patches], axis=2)
        dx, dy = points[:, 0] - at[0], points[:, 1] - at[1]
        chosen = np.flatnonzero(touches(dx, dy, self.sides[:, :, corner], sides))
        ends = np.empty((len(chosen), 2, 2))
        ends[:, 0], ends[:, 1] = at, points[chosen]
        starts = np.cumsum([0, *(len(patch) for patch in patches)])
        number = np.searchsorted(starts, chosen, side="right") - 1
        lengths = np.hypot(dx[chosen], dy[chosen])
        return Touching(number, chosen - starts[number], lengths, ends)


def touches(dx: Floats, dy: Floats, here: Floats, there: Floats) -> NDArray[np.bool_]:
    """Whether straight steps from one corner to others touch both as a taut string does.

    A taut string passes a corner so that both sides of the corner lie on one side of it.

    Parameters
    ----------
    dx, dy
        The steps, shape (n,).
    here
        The sides of the one corner, from it to those before and after it, shape (2, 2).
    there
        Those of the others, shape (2, 2, n).

    Examples
    --------
    >>> square = np.array([[[-1.0], [0.0]], [[0.0], [-1.0]]])  # rims to the left and downwards
    >>> dx, dy = np.array([3.0, 3.0, 3.0]), np.array([-3.0, 0.0, 3.0])
    >>> touches(dx, dy, square[:, :, 0], np.repeat(square, 3, axis=2)).tolist()
    [True, True, False]
    """
    (ax, ay), (bx, by) = here
    (cx, cy), (ex, ey) = there
    leaves = (dx * ay - dy * ax) * (dx * by - dy * bx)
    meets = (dx * cy - dy * cx) * (dx * ey - dy * ex)
    slack = -1e-15 * (1.0 + dx * dx + dy * dy)
    return np.asarray((leaves >= slack) & (meets >= slack))
