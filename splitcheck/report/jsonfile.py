"""The report as JSON for programs: schema ``splitcheck-report/1``, everything, the same each run.

Every quantity is rounded once, here: mm, dB and kHz to 4 decimals, nH to 4, mV to 2.
"""

from __future__ import annotations

import json
from math import isfinite
from typing import TypeAlias, get_args

from splitcheck import __version__
from splitcheck.report import tally
from splitcheck.report.words import quiet
from splitcheck.verdict.changes import VERDICTS, Change, Comparison
from splitcheck.verdict.findings import (
    LEVELS,
    ClassRow,
    Finding,
    Kind,
    LayerRow,
    Leg,
    NetRow,
    Point,
    Proposal,
    Report,
)

SCHEMA = "splitcheck-report/1"
Json: TypeAlias = "dict[str, Json] | list[Json] | str | int | float | bool | None"


def render(report: Report, comparison: Comparison | None = None) -> str:
    """Write the report as JSON text, ending in a line end; `readback.load` reads it again.

    Parameters
    ----------
    report
        The newer revision, if there are two.
    comparison
        Adds what became of each finding of the earlier one.

    Raises
    ------
    ValueError
        If a quantity is not finite: that is a fault of this program and must not reach a file.

    Examples
    --------
    >>> empty = Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ())
    >>> json.loads(render(empty))["schema"]
    'splitcheck-report/1'
    """
    whole = _report(report)
    if comparison is not None:
        whole["comparison"] = _comparison(comparison)
    return quiet(json.dumps(whole, indent=2, allow_nan=False)) + "\n"


def _report(report: Report) -> dict[str, Json]:
    return {
        "schema": SCHEMA,
        "tool": {"name": "splitcheck", "version": __version__},
        "board": {
            "name": report.board,
            "size_mm": _point(report.size_mm),
            "corner_mm": None if report.corner_mm is None else _point(report.corner_mm),
            "layers": [_layer(layer) for layer in report.layers],
        },
        "assumptions": list(report.assumptions),
        "remarks": list(report.remarks),
        "facts": list(report.facts),
        "inputs": [
            {"file": row.file, "kind": row.kind, "sha256": row.sha256, "reason": row.reason}
            for row in report.inputs
        ],
        "islands": [
            {"id": row.id, "layer": row.layer, "net": row.net, "area_mm2": _to(4, row.area_mm2)}
            for row in report.islands
        ],
        "nets": [_net(net) for net in report.nets],
        "findings": [_finding(finding) for finding in report.findings],
        "classes": [_class(row) for row in report.classes],
        "pairs": [
            {
                "nets": list(row.nets),
                "known_by": row.known_by,
                "apart_mm": _to(4, row.apart_mm),
                "coupled_mm": _to(4, row.coupled_mm),
            }
            for row in report.pairs
        ],
        "waivers": [
            {
                "reason": row.reason,
                "until": row.until,
                "findings": row.findings,
                "state": row.state,
                "source": {"file": row.source.file, "line": row.source.line},
            }
            for row in report.waivers
        ],
        "counts": [{"what": count.what, "number": count.number} for count in report.counts],
        "summary": _summary(report),
    }


def _layer(layer: LayerRow) -> Json:
    return {
        "name": layer.name,
        "file": layer.file,
        "number": layer.number,
        "z_mm": _to(4, layer.z_mm),
        "copper_um": _to(4, layer.copper_um),
        "role": layer.role,
    }


def _net(net: NetRow) -> Json:
    return {
        "name": net.name,
        "class": net.net_class,
        "length_mm": _to(4, net.length_mm),
        "layers": list(net.layers),
        "findings": net.findings,
        "worst_added_nh": _to(4, net.worst_added_nh),
        "sum_nh": _to(4, net.sum_nh),
        "pair": net.pair,
        "exempt": net.exempt,
        "journey": [_leg(leg) for leg in net.journey],
    }


def _leg(leg: Leg) -> Json:
    return {
        "kind": leg.kind,
        "layer": leg.layer,
        "plane_layers": list(leg.plane_layers),
        "plane_nets": list(leg.plane_nets),
        "length_mm": _to(4, leg.length_mm),
        "at_mm": _point(leg.at_mm),
        "added_nh": _to(4, leg.added_nh),
        "finding": leg.finding,
    }


def _class(row: ClassRow) -> Json:
    return {
        "name": row.name,
        "nets": row.nets,
        "rise_ns": _to(4, row.rise_ns),
        "wave_mv": _to(2, row.wave_mv),
        "line_ohm": _to(4, row.line_ohm),
        "error_mv": _to(2, row.error_mv),
        "warning_mv": _to(2, row.warning_mv),
        "exempt": row.exempt,
        "source": row.source,
    }


def _finding(finding: Finding) -> Json:
    return {
        "id": finding.id,
        "kind": finding.kind,
        "level": finding.level,
        "net": finding.net,
        "net_class": finding.net_class,
        "layer": finding.layer,
        "plane_layer": finding.plane_layer,
        "plane_net": finding.plane_net,
        "at_mm": _point(finding.at_mm),
        "gap": finding.gap,
        "gap_mm": _to(4, finding.gap_mm),
        "detour_mm": _to(4, finding.detour_mm),
        "added_nh": _to(4, finding.added_nh),
        "error_nh": _to(4, finding.error_nh),
        "method": finding.method,
        "estimated_nh": _to(4, finding.estimated_nh),
        "estimated_error_nh": _to(4, finding.estimated_error_nh),
        "noise_mv": _to(2, finding.noise_mv),
        "rise_ns": _to(4, finding.rise_ns),
        "corner_khz": _to(4, finding.corner_khz),
        "stray_db": _to(4, finding.stray_db),
        "islands": list(finding.islands),
        "bridges": [
            {"kind": bridge.kind, "at_mm": _point(bridge.at_mm), "net": bridge.net}
            for bridge in finding.bridges
        ],
        "shares_gap_with": [
            {"net": share.net, "mutual_nh": _to(4, share.mutual_nh)}
            for share in finding.shares_gap_with
        ],
        "pair": finding.pair,
        "odd_nh": _to(4, finding.odd_nh),
        "unbalance_nh": _to(4, finding.unbalance_nh),
        "common_nh": _to(4, finding.common_nh),
        "crosstalk_mv": _to(2, finding.crosstalk_mv),
        "capped": finding.capped,
        "source": {"file": finding.source.file, "line": finding.source.line},
        "waived": finding.waived,
        "fingerprint": finding.fingerprint,
        "reason": finding.reason,
        "proposals": [_proposal(proposal) for proposal in finding.proposals],
        "misses": [
            {"what": miss.what, "words": miss.words, "share": _to(4, miss.share)}
            for miss in finding.misses
        ],
    }


def _proposal(proposal: Proposal) -> Json:
    return {
        "what": proposal.what,
        "at_mm": [_point(point) for point in proposal.at_mm],
        "words": proposal.words,
        "added_nh": _to(4, proposal.added_nh),
        "error_nh": _to(4, proposal.error_nh),
        "noise_mv": _to(2, proposal.noise_mv),
        "isolation": proposal.isolation,
    }


def _comparison(comparison: Comparison) -> Json:
    return {
        "was": {"name": comparison.was.board, "findings": len(comparison.was.findings)},
        "move": {
            "turned_deg": _to(4, comparison.move.turned_deg),
            "shift_mm": _point(comparison.move.shift_mm),
        },
        "remarks": list(comparison.remarks),
        "by_verdict": {verdict: len(comparison.of(verdict)) for verdict in VERDICTS},
        "changes": [_change(change) for change in comparison.changes],
    }


def _change(change: Change) -> Json:
    was = change.was
    return {
        "verdict": change.verdict,
        "why": change.why,
        "finding": None if change.now is None else change.now.id,
        "was": None
        if was is None
        else {
            "id": was.id,
            "kind": was.kind,
            "level": was.level,
            "net": was.net,
            "layer": was.layer,
            "plane_layer": was.plane_layer,
            "at_mm": _point(was.at_mm),
            "added_nh": _to(4, was.added_nh),
            "error_nh": _to(4, was.error_nh),
            "noise_mv": _to(2, was.noise_mv),
            "waived": was.waived,
        },
    }


def _summary(report: Report) -> Json:
    standing = tally.standing(report.findings)
    return {
        "by_level": {level: sum(f.level == level for f in standing) for level in LEVELS},
        "by_kind": {kind: sum(f.kind == kind for f in standing) for kind in get_args(Kind)},
        "waived": len(report.findings) - len(standing),
        "worst": standing[0].id if standing else None,
        "seconds": {stage: _to(4, spent) for stage, spent in report.seconds},
    }


def _point(point: Point) -> Json:
    return [_to(4, point[0]), _to(4, point[1])]


def _to(decimals: int, value: float | None) -> float | None:
    """Round; a negative zero becomes a plain one, so that equal boards give equal bytes."""
    if value is None:
        return None
    if not isfinite(value):
        raise ValueError(f"{value} is not a quantity that a report may hold")
    return round(float(value), decimals) + 0.0
