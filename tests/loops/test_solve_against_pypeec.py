"""One small case solved live by PyPEEC, a general solver that fills the copper with voxels.

It runs where the package ``pypeec`` is installed (about 20 s).
"""

from __future__ import annotations

import logging
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from shapely import LineString, box

from splitcheck.loops.solve import TraceOver, added

pytest.importorskip(
    "pypeec.run.solver",
    exc_type=ImportError,
    reason="pypeec is not installed: nothing to compare with live",
)

pytestmark = [pytest.mark.slow, pytest.mark.filterwarnings("ignore")]

#: Half a side of the plane, half the length of the trace, its width and height, the slot, mm.
HALF, REACH, WIDE, HIGH, SLOT = 8.0, 5.0, 0.4, 0.2, (0.4, 8.0)
#: Thickness of the sheets, mm: thin against their distance.
THICK = 0.05
HERTZ = 1e9


def layout(voxel: float, *, slotted: bool) -> NDArray[np.int8]:
    """Voxels of copper (1), source (2), sink (3): a plane, a trace over it, a post at its end."""
    across = round(2 * HALF / voxel)
    up = round(HIGH / THICK)
    middle = -HALF + voxel * (np.arange(across) + 0.5)
    x, y = np.meshgrid(middle, middle, indexing="ij")
    cells = np.zeros((across, across, up + 1), dtype=np.int8)
    cells[:, :, 0] = 1
    if slotted:
        cells[(abs(x) < SLOT[0] / 2) & (abs(y) < SLOT[1] / 2), 0] = 0
    trace = (abs(x) < REACH) & (abs(y) < WIDE / 2)
    cells[trace, up] = 1
    cells[trace & (x > REACH - WIDE), :] = 1
    port = trace & (x < -REACH + voxel)
    cells[port, up], cells[port, 0] = 2, 3
    return cells


def geometry(cells: NDArray[np.int8], voxel: float) -> dict[str, Any]:
    """What PyPEEC calls the geometry."""
    flat = cells.flatten(order="F")
    domains = {
        name: np.flatnonzero(flat == kind).tolist()
        for kind, name in ((1, "copper"), (2, "source"), (3, "sink"))
    }
    size = [voxel * 1e-3, voxel * 1e-3, THICK * 1e-3]
    return {
        "mesh_type": "voxel",
        "data_voxelize": {
            "param": {"n": list(cells.shape), "d": size, "c": [0.0, 0.0, 0.0]},
            "domain_index": domains,
        },
        "data_point": {"check_cloud": False, "filter_cloud": False, "pts_cloud": []},
        "data_resampling": {
            "use_reduce": False,
            "use_resample": False,
            "resampling_factor": [1, 1, 1],
        },
        "data_conflict": {"resolve_rules": True, "resolve_random": False, "conflict_rules": []},
        "data_integrity": {
            "check_integrity": False,
            "domain_connected": {},
            "domain_adjacent": {},
        },
    }


def problem(ports: int) -> dict[str, Any]:
    """One ampere through the port; next to no resistance, so that the current stays at surfaces."""
    none = {"Y_re": 0.0, "Y_im": 0.0}
    return {
        "material_def": {
            "metal": {
                "domain_list": ["copper", "source", "sink"],
                "material_type": "electric",
                "orientation_type": "isotropic",
                "var_type": "lumped",
            }
        },
        "source_def": {
            "in": {"domain_list": ["source"], "source_type": "current", "var_type": "lumped"},
            "out": {"domain_list": ["sink"], "source_type": "voltage", "var_type": "lumped"},
        },
        "sweep_solver": {
            "fast": {
                "init": None,
                "param": {
                    "freq": HERTZ,
                    "material_val": {"metal": {"rho_re": 1e-22, "rho_im": 0.0}},
                    "source_val": {
                        "in": {"I_re": 1.0 / ports, "I_im": 0.0, **none},
                        "out": {"V_re": 0.0, "V_im": 0.0, "Z_re": 0.0, "Z_im": 0.0},
                    },
                },
            }
        },
    }


def tolerances() -> dict[str, Any]:
    """How PyPEEC is to solve it."""
    steps = {"solver": "gmres", "rel_tol": 1e-4, "abs_tol": 0.0, "n_inner": 60, "n_outer": 6}
    fft = {
        "library": "SciPy",
        "scipy_worker": 1,
        "fftw_thread": 1,
        "fftw_cache": False,
        "fftw_timeout": 1.0,
        "fftw_byte_align": 16,
    }
    return {
        "parallel_sweep": {"n_jobs": 0, "n_threads": None},
        "integral_simplify": 20.0,
        "biot_savart": "face",
        "dense_options": {"method": "fft", "split": True, "fft_options": fft},
        "factorization_options": {
            "schur": True,
            "library": "SuperLU",
            "pyamg_options": {"tol": 1e-6, "solver": "root", "krylov": None},
            "pardiso_options": {"thread_pardiso": 1, "thread_mkl": 1},
        },
        "solver_options": {
            "coupling": "direct",
            "status_options": {
                "ignore_status": False,
                "ignore_res": True,
                "rel_tol": 1e-3,
                "abs_tol": 1e-9,
            },
            "power_options": {
                "stop": False,
                "n_min": 4,
                "n_cmp": 3,
                "rel_tol": 1e-5,
                "abs_tol": 1e-12,
            },
            "direct_options": steps,
            "segregated_options": {
                "rel_tol": 1e-6,
                "abs_tol": 1e-12,
                "relax_electric": 1.0,
                "relax_magnetic": 1.0,
                "n_min": 2,
                "n_max": 20,
                "iter_electric_options": steps,
                "iter_magnetic_options": steps,
            },
        },
        "condition_options": {
            "check": False,
            "tolerance_electric": 1e15,
            "tolerance_magnetic": 1e15,
            "norm_options": {"t_accuracy": 2, "n_iter_max": 25},
        },
    }


def loop_nh(voxel: float, *, slotted: bool) -> float:
    """Loop inductance from the magnetic energy: its mean over time is L |I|^2 / 4."""
    from pypeec.run import mesher, solver  # noqa: PLC0415 (only where it is installed)

    logging.disable(logging.CRITICAL)
    try:
        cells = layout(voxel, slotted=slotted)
        mesh = mesher.run(geometry(cells, voxel))
        found = solver.run(mesh, problem(int((cells == 2).sum())), tolerances())
    finally:
        logging.disable(logging.NOTSET)
    answer = found["data_sweep"]["fast"]
    assert answer["solver_ok"]
    current = abs(answer["source_values"]["in"]["I"])
    return float(4e9 * answer["integral_total"]["W_total"] / current**2)


def test_a_slot_adds_what_pypeec_says() -> None:
    """Two sizes of voxels give the limit, as its error goes with the voxel; within 5 %."""
    coarse, fine = (
        loop_nh(voxel, slotted=True) - loop_nh(voxel, slotted=False) for voxel in (0.2, 0.1)
    )
    trace = TraceOver(LineString([(-REACH, 0), (REACH, 0)]), WIDE)
    slot = box(-SLOT[0] / 2, -SLOT[1] / 2, SLOT[0] / 2, SLOT[1] / 2)
    value = added([slot], [trace], HIGH, outside=box(-HALF, -HALF, HALF, HALF)).of(0)
    assert value == pytest.approx(2 * fine - coarse, rel=0.05)
