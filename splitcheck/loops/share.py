"""Energies in, currents of the bridges out: balanced where they must be, else the cheapest."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from splitcheck.units import MU0, Floats


def share_out(
    energy: Floats, own_nh: Floats, rows: Floats, count: int, cavities: Sequence[int]
) -> tuple[Floats, NDArray[np.bool_]]:
    """Current in each source per ampere in each trace: what must balance does, the rest is least.

    The sources end with the vias, cavity by cavity; `cavities` counts those of each. Returns the
    currents, shape (sources, traces), and which traces have no way back.
    """
    bridges = energy.shape[0] - count
    # the plane on the other side of a cavity keeps no current
    onto = np.zeros((len(cavities), energy.shape[0]))
    last = energy.shape[0] - sum(cavities)
    for row, vias in zip(onto, cavities, strict=True):
        row[last : last + vias] = 1.0
        last += vias
    balance = np.concatenate([rows, onto[onto.any(axis=1)]])
    need, can = -balance[:, :count], balance[:, count:]
    forced = np.linalg.pinv(can) @ need if bridges and len(balance) else np.zeros((bridges, count))
    short = (
        np.abs(can @ forced - need).max(axis=0, initial=0.0) if len(balance) else np.zeros(count)
    )
    cut_off = short > 1e-6
    currents = forced
    free = _free(can, bridges)
    if free.shape[1]:
        inner = energy[count:, count:] + own_nh
        pull = energy[count:, :count] + inner @ forced
        currents = forced - free @ np.linalg.solve(free.T @ inner @ free, free.T @ pull)
    way = np.concatenate([np.eye(count), currents])
    way[:, cut_off] = 0.0
    return way, cut_off


def _free(can: Floats, bridges: int) -> Floats:
    """Bridge currents that no balance forbids, as columns."""
    if not bridges or not len(can):
        return np.eye(bridges)
    _, values, right = np.linalg.svd(can)
    rank = int((values > 1e-9 * max(values.max(initial=0.0), 1e-300)).sum())
    free: Floats = right[rank:].T
    return free


def via_matrix(places: Floats, diameters_mm: Sequence[float], plate_mm: float) -> Floats:
    """Inductance of vias between two planes, for currents that add up to zero.

    The field between planes a distance d apart is that of line currents: mu0 d/2 pi ln(1/r), with
    half the diameter for r on the diagonal. One via there and one back give mu0 d/pi ln(2s/D).
    """
    apart = np.hypot(*(places[:, None, :] - places).transpose(2, 0, 1))
    for k, diameter in enumerate(diameters_mm):
        apart[k, k] = max(diameter, 1e-3) / 2
    least = min(max(min(diameters_mm), 1e-3) / 2, 1.0)
    matrix: Floats = -MU0 * plate_mm / (2 * np.pi) * np.log(np.maximum(apart, least))
    return matrix
