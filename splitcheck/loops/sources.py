"""Traces in, their source functions on the panels out, continuous within each gap."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from splitcheck.loops.angles import turned
from splitcheck.loops.kernels import smooth_source, wall_source
from splitcheck.loops.outlines import Ints
from splitcheck.loops.panels import Panels
from splitcheck.units import Floats

#: Panels further than this many widths (or half heights) from a trace see it as one line.
_CLOSE = 4.0


@dataclass(frozen=True, slots=True)
class Strip:
    """A trace of finite width with both ends over copper."""

    line: Floats
    """Centre line, shape (p, 2), mm."""
    width_mm: float
    """Over which the current is spread evenly, >= 0."""
    height_mm: float
    """Over the plane, > 0."""
    above_mm: float | None
    """Distance of a plane on the trace's side."""

    @property
    def share(self) -> float:
        """Part of the current that returns in this plane."""
        return 1.0 if self.above_mm is None else 1.0 - self.height_mm / self.above_mm

    @property
    def segments(self) -> Floats:
        """Its straight stretches, shape (p - 1, 4)."""
        return np.concatenate([self.line[:-1], self.line[1:]], axis=1)


def strip_sources(
    panels: Panels, strips: Sequence[Strip], between: Floats
) -> tuple[Floats, Floats]:
    """Source functions of traces of finite width, as their means over each panel.

    Parameters
    ----------
    panels
        The panels.
    strips
        The traces.
    between
        Angle between the two ends of each trace seen from the centres of the panels, continuous in
        each gap (`point_angles` of the last point less that of the first), shape (s, n), rad.

    Returns
    -------
    Sources of the strips and those of their centre lines alone, shape (n, s) each.

    Notes
    -----
    A strip is a bundle of filaments that leave from one point and end in one point, so that all
    of them enclose the same copper. Each filament's f jumps on its own line by its share s, and so
    does s A/2 pi, with A the angle that the filament is seen under: the difference is smooth. The
    angle between the ends, followed continuously through the gap, takes the place of A. Panels far
    from a strip see it as one line, from their centre.
    """
    lines = between.T * [strip.share / (2 * np.pi) for strip in strips]
    full = lines.copy()
    for like in _alike(strips):
        columns = np.array(like)
        thin, bundle = _smooth_means(panels, [strips[k] for k in like])
        lines[:, columns] += thin
        full[:, columns] += bundle
    return full, lines


def _alike(strips: Sequence[Strip]) -> list[list[int]]:
    """Numbers of strips of one width and height; they are worked off at once."""
    groups: dict[tuple[float, float, float], list[int]] = {}
    for k, strip in enumerate(strips):
        key = (strip.height_mm, strip.above_mm or 0.0, strip.width_mm)
        groups.setdefault(key, []).append(k)
    return [groups[key] for key in sorted(groups)]


class _Stretches(NamedTuple):
    """Stretches of strips of one width and height, one after another."""

    centre: Floats
    """On the centre lines, shape (s, 4)."""
    bundle: Floats
    """Those of the filaments, shape (s + 2 t, filaments, 4); the legs from the ends of the t
    strips to their filaments come last."""
    weights: Floats
    """Of the filaments."""
    owner: Ints
    """Number of the strip of each, shape (s + 2 t,)."""
    ends: Floats
    """Where the legs are, shape (2 t, 2)."""
    first: Ints
    """Number of the first stretch of each strip."""


def _stretches(strips: Sequence[Strip]) -> _Stretches:
    places, weights = filaments(strips[0].width_mm, strips[0].height_mm)
    paths = _paths(strips, places)
    counts = np.array([len(strip.line) - 1 for strip in strips])
    every = np.arange(len(strips))
    return _Stretches(
        centre=np.concatenate([strip.segments for strip in strips]),
        bundle=np.concatenate(
            [*(path[1:-1] for path in paths), *(path[[0, -1]] for path in paths)]
        ),
        weights=weights,
        owner=np.concatenate([np.repeat(every, counts), np.repeat(every, 2)]),
        ends=np.concatenate([strip.line[[0, -1]] for strip in strips]),
        first=np.concatenate([[0], np.cumsum(counts)[:-1]]),
    )


def _paths(strips: Sequence[Strip], places: Floats) -> list[Floats]:
    """Stretches of the filaments of each strip, with the legs at its ends, shape (p + 1, k, 4)."""
    found: list[Floats] = [np.zeros(0)] * len(strips)
    corners = np.array([len(strip.line) for strip in strips])
    for count in np.unique(corners):
        like = np.flatnonzero(corners == count).tolist()
        lines = np.array([strips[k].line for k in like])
        for k, path in zip(like, run_beside(lines, places), strict=True):
            found[k] = path.transpose(1, 0, 2)
    return found


def _smooth_means(panels: Panels, strips: Sequence[Strip]) -> tuple[Floats, Floats]:
    """Smooth part of f of centre lines and of whole strips, as means over panels, shape (n, s).

    Stretches that a panel is close to are averaged over its four points, and over the width.
    """
    made, one = _stretches(strips), strips[0]
    value = _smooth(panels.centre[:, None], made.centre, one)
    lines = np.add.reduceat(value, made.first, axis=1)
    away = [_distances(panels.centre, made.centre)]
    away.append(np.hypot(*np.moveaxis(panels.centre[:, None] - made.ends, 2, 0)))
    reach = _CLOSE * max(one.width_mm, one.height_mm / 2) + 2 * panels.radius
    i, k = np.nonzero(np.concatenate(away, axis=1) < reach[:, None])
    spots, owner = panels.points[i], made.owner[k]
    full = lines.copy()
    each = _smooth(spots[:, :, None], made.bundle[k][:, None], one) @ made.weights
    on_line = k < len(made.centre)
    ii, kk = i[on_line], k[on_line]
    single = _smooth(spots[on_line], made.centre[kk][:, None], one).mean(axis=1)
    np.add.at(full, (i, owner), each.mean(axis=1))
    np.add.at(full, (ii, owner[on_line]), -value[ii, kk])
    np.add.at(lines, (ii, owner[on_line]), single - value[ii, kk])
    near, strip = np.nonzero(_marked(lines.shape, i, owner))
    turn = _end_turns(panels, near, np.array([s.line[[0, -1]] for s in strips])[strip])
    turn *= one.share / (2 * np.pi)
    lines[near, strip] += turn
    full[near, strip] += turn
    return lines, full


def _marked(shape: tuple[int, ...], i: Ints, k: Ints) -> NDArray[np.bool_]:
    marked = np.zeros(shape, dtype=bool)
    marked[i, k] = True
    return marked


def _end_turns(panels: Panels, near: Ints, ends: Floats) -> Floats:
    """By how much the angle between two ends differs in the mean from that at the centre."""
    spots, middle = panels.points[near], panels.centre[near][:, None, :]
    turn = turned(ends[:, 1, None], middle, spots) - turned(ends[:, 0, None], middle, spots)
    mean: Floats = turn.mean(axis=1)
    return mean


def still_afar(
    panels: Panels,
    strips: Sequence[Strip],
    between: Floats,
    ends: Sequence[tuple[int, Floats]],
) -> Floats:
    """Set the angles between the ends of traces so that f fades away along a gap that goes on.

    Within a gap f is known up to whole turns, which do not matter if no net flux goes through it.
    Through a gap that goes on beyond what is looked at there may go some; its f is nothing far
    away, so that where it was cut off f is what the traces make there without any turns.

    Parameters
    ----------
    panels, strips
        The panels and the traces.
    between
        As in `strip_sources`, shape (s, n), rad.
    ends
        Numbers of gaps that go on, and where each was cut off, mm.

    Returns
    -------
    The angles, shape (s, n), rad.
    """
    turned = between.copy()
    for gap, at in ends:
        mine = np.flatnonzero(panels.gap == gap)
        if not len(mine):
            continue
        last = mine[np.argmin(np.hypot(*(panels.centre[mine] - at).T))]
        x, y = panels.centre[last, None].T
        for k, strip in enumerate(strips):
            _, seen = wall_source(x, y, strip.segments, strip.height_mm, strip.above_mm)
            turns = np.rint((between[k, last] - seen.sum()) / (2 * np.pi))
            turned[k, mine] -= 2 * np.pi * turns
    return turned


def _smooth(spots: Floats, segments: Floats, strip: Strip) -> Floats:
    """What stretches add to f, less what they add to the jump; points and stretches broadcast."""
    x, y = np.moveaxis(spots, -1, 0)
    return smooth_source(x, y, segments, strip.height_mm, strip.above_mm)


def _distances(spots: Floats, segments: Floats) -> Floats:
    """Distance of points from stretches, shape (k, s)."""
    x1, y1, x2, y2 = segments.T
    dx, dy = x2 - x1, y2 - y1
    from_x, from_y = spots[:, None, 0] - x1, spots[:, None, 1] - y1
    place = np.clip((from_x * dx + from_y * dy) / (dx * dx + dy * dy), 0.0, 1.0)
    apart: Floats = np.hypot(from_x - place * dx, from_y - place * dy)
    return apart


@cache
def filaments(width_mm: float, height_mm: float) -> tuple[Floats, Floats]:
    """Gauss points across the width: more for traces wide against their height."""
    if width_mm < 0.02 * height_mm:
        return np.zeros(1), np.ones(1)
    nodes, weights = leggauss(int(min(3 + width_mm / height_mm, 9)))
    return nodes * width_mm / 2, weights / 2


def run_beside(line: Floats, offsets_mm: Floats) -> Floats:
    """Run beside polylines at signed distances to the left, all from first to last point.

    Parameters
    ----------
    line
        Polylines of p points, shape (..., p, 2), mm.
    offsets_mm
        Distances, shape (k,).

    Returns
    -------
    Their stretches, with those from the ends of a polyline to the way beside it and back, shape
    (..., k, p + 1, 4).
    """
    step = np.diff(line, axis=-2)
    step /= np.hypot(step[..., 0], step[..., 1])[..., None]
    normal = np.stack([-step[..., 1], step[..., 0]], axis=-1)
    before = np.concatenate([normal[..., :1, :], normal], axis=-2)
    after = np.concatenate([normal, normal[..., -1:, :]], axis=-2)
    # mitred corners; a hairpin would throw its corner to infinity, so the mitre is held to 2
    mitre = (before + after) / np.maximum(1 + (before * after).sum(axis=-1), 0.5)[..., None]
    # the legs at the ends have no length where the offset is none
    slight = np.where(np.abs(offsets_mm) < 1e-6, 1e-6, offsets_mm)
    path = np.empty((*line.shape[:-2], len(offsets_mm), line.shape[-2] + 2, 2))
    path[..., 0, :], path[..., -1, :] = line[..., None, 0, :], line[..., None, -1, :]
    path[..., 1:-1, :] = line[..., None, :, :] + slight[:, None, None] * mitre[..., None, :, :]
    return np.concatenate([path[..., :-1, :], path[..., 1:, :]], axis=-1)
