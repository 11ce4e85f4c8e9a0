"""The closed forms of the field solve against numerical integrals and published densities."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import dblquad, quad

from splitcheck.loops.kernels import outline_potential, plate_images, rectangle_self, wall_source
from splitcheck.units import Floats


def outline(*corners: tuple[float, float]) -> Floats:
    """Edges of a ring, shape (1, m, 4)."""
    pairs = zip(corners, (*corners[1:], corners[0]), strict=True)
    return np.array([[[*a, *b] for a, b in pairs]], dtype=np.float64)


def potential(x: float, y: float, edges: Floats) -> float:
    """Potential at one point."""
    return float(outline_potential(np.array([[float(x)]]), np.array([[float(y)]]), edges)[0, 0])


RECTANGLE = outline((0, 0), (3, 0), (3, 1), (0, 1))


@pytest.mark.parametrize(("x", "y"), [(4.0, 0.5), (-1.0, -2.0), (3.5, 2.0), (1.0, 1.5)])
def test_potential_outside_is_the_integral(x: float, y: float) -> None:
    """Outside the sheet nothing is singular and plain quadrature is exact."""
    truth, _ = dblquad(lambda v, u: 1 / np.hypot(u - x, v - y), 0, 3, 0, 1)
    assert potential(x, y, RECTANGLE) == pytest.approx(truth, rel=1e-7)


@pytest.mark.parametrize(("x", "y"), [(1.0, 0.5), (0.1, 0.1), (2.9, 0.95)])
def test_potential_inside_is_the_integral_in_polar_coordinates(x: float, y: float) -> None:
    """About the point itself the integral of 1/r is that of the distance to the rim."""

    def reach(angle: float) -> float:
        c, s = np.cos(angle), np.sin(angle)
        across = np.inf if c == 0 else ((3 - x) / c if c > 0 else -x / c)
        upward = np.inf if s == 0 else ((1 - y) / s if s > 0 else -y / s)
        return float(min(across, upward))

    corners = sorted(np.arctan2(v - y, u - x) for u, v in ((0, 0), (3, 0), (3, 1), (0, 1)))
    rounds = [*corners, corners[0] + 2 * np.pi]
    truth = sum(quad(reach, a, b)[0] for a, b in pairwise(rounds))
    assert potential(x, y, RECTANGLE) == pytest.approx(truth, rel=1e-7)


def test_potential_is_finite_on_corners_and_edges() -> None:
    """A corner of a unit square sees ln(3 + 2 sqrt 2), the middle of an edge a finite value."""
    square = outline((0, 0), (1, 0), (1, 1), (0, 1))
    assert potential(0, 0, square) == pytest.approx(np.log(3 + 2 * np.sqrt(2)), rel=1e-9)
    # two rectangles of 1/2 x 1 that meet in the point: 2 (a asinh(b/a) + b asinh(a/b))
    truth = 2 * (0.5 * np.arcsinh(2.0) + 1.0 * np.arcsinh(0.5))
    assert potential(0.5, 0, square) == pytest.approx(truth, rel=1e-9)


@given(st.floats(-3, 3), st.floats(-3, 3))
def test_potential_of_a_frame_is_that_of_the_square_less_its_hole(x: float, y: float) -> None:
    """A hole, run clockwise, takes its part away; edges of no length count nothing."""
    square = outline((-2, -2), (2, -2), (2, 2), (-2, 2))
    hole = outline((-1, -1), (1, -1), (1, 1), (-1, 1))
    backwards = hole[:, ::-1][:, :, [2, 3, 0, 1]]
    nothing = np.full((1, 2, 4), 2.0)
    frame = np.concatenate([square, backwards, nothing], axis=1)
    truth = potential(x, y, square) - potential(x, y, hole)
    assert potential(x, y, frame) == pytest.approx(truth, abs=1e-9)


@pytest.mark.parametrize("ratio", [1.0, 2.5, 20.0, 0.05])
def test_rectangle_self_is_the_integral_over_differences(ratio: float) -> None:
    """The mean over pairs of points, by the density (a - u)(b - v) of their differences."""
    a, b = ratio, 1.0

    def ray(angle: float) -> float:
        c, s = np.cos(angle), np.sin(angle)
        end = min(a / c if c > 1e-15 else np.inf, b / s if s > 1e-15 else np.inf)
        return float(a * b * end - (a * s + b * c) * end**2 / 2 + c * s * end**3 / 3)

    corner = np.arctan2(b, a)
    whole = quad(ray, 0, corner)[0] + quad(ray, corner, np.pi / 2)[0]
    truth = 4 * whole / (a * b) ** 2
    assert rectangle_self(np.array([a]), np.array([b]))[0] == pytest.approx(truth, rel=1e-7)


@pytest.mark.parametrize("plate", [0.1, 1.0, 7.0])
def test_image_series_is_the_sum(plate: float) -> None:
    """Differences against a sum of a million images; the constant is free."""
    n = np.arange(1, 1_000_001)

    def images(r: float) -> float:
        return float((2 / np.sqrt(r * r + (2 * n * plate) ** 2)).sum())

    places = plate * np.array([0.0, 0.3, 1.0, 3.0, 5.99, 6.01, 9.0])
    values = plate_images(places, plate)
    truth = np.array([images(float(r)) for r in places])
    assert values - values[0] == pytest.approx(truth - truth[0], abs=2e-5 / plate)


def source(y: Floats, height: float, above: float | None) -> Floats:
    """Source function of a trace along x from far to far, at places across it."""
    segments = np.array([[-4000.0, 0.0, 4000.0, 0.0]])
    total: Floats = wall_source(np.zeros_like(y), y, segments, height, above)[0].sum(axis=1)
    return total


def test_source_over_one_plane_is_the_arc_tangent() -> None:
    """Its slope is the return current density h/(pi (y^2 + h^2)) of a line over a plane.

    Image theory, as in Ott, Electromagnetic Compatibility Engineering, Wiley 2009 (from memory).
    """
    y = np.linspace(0.05, 5.0, 40)
    slope = (source(y + 1e-5, 0.3, None) - source(y - 1e-5, 0.3, None)) / 2e-5
    assert -slope == pytest.approx(0.3 / np.pi / (y**2 + 0.3**2), rel=1e-4)


@pytest.mark.parametrize(("height", "between"), [(0.2, 1.0), (0.5, 1.0), (0.35, 0.5)])
def test_source_between_planes_has_the_density_of_a_stripline(
    height: float, between: float
) -> None:
    """1/(2b) sin(pi h/b) / (cosh(pi y/b) - cos(pi h/b)), by conformal mapping (standard result)."""
    y = np.linspace(0.05, 4.0, 40)
    slope = (source(y + 1e-5, height, between) - source(y - 1e-5, height, between)) / 2e-5
    turn = np.pi * height / between
    truth = np.sin(turn) / (2 * between) / (np.cosh(np.pi * y / between) - np.cos(turn))
    assert -slope == pytest.approx(truth, rel=1e-3, abs=5e-5)


@pytest.mark.parametrize("above", [None, 0.5])
def test_source_less_the_angle_is_smooth_across_the_trace(above: float | None) -> None:
    """The jump of f is the share of this plane, that of the angle 2 pi, on the same line."""
    share = 1.0 if above is None else 1.0 - 0.2 / 0.5
    segments = np.array([[-3.0, 0.0, 0.0, 0.0], [0.0, 0.0, 2.0, 2.0]])
    spots = np.array([[-1.0, -1e-9], [-1.0, 0.0], [-1.0, 1e-9]])
    value, seen = wall_source(spots[:, 0], spots[:, 1], segments, 0.2, above)
    jump = value.sum(axis=1) - share * seen.sum(axis=1) / (2 * np.pi)
    assert np.ptp(value.sum(axis=1)) == pytest.approx(share, abs=1e-6)
    assert np.ptp(jump) < 1e-6
