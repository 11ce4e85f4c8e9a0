"""Findings put in order and together: by place, by gap, by rank."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import replace
from hashlib import sha256

import networkx as nx
import numpy as np
import shapely

from splitcheck.loops.clusters import together_mm
from splitcheck.verdict.findings import Finding, GapShare
from splitcheck.verdict.score import worst_first

#: Findings over one gap within this distance of one another are told together, mm.
TOGETHER_MM = 6.0


def by_place(findings: Sequence[Finding]) -> list[Finding]:
    """Tell apart the places of one gap: a gap of clearances can run all over a layer.

    Findings over one gap belong together if they lie between the same islands and in a chain of
    neighbours; the id of the gap gets a number for each such place where there are several.
    """
    groups: dict[tuple[str, frozenset[str]], list[int]] = defaultdict(list)
    for number, finding in enumerate(findings):
        groups[finding.gap, frozenset(finding.islands)].append(number)
    places: dict[str, list[list[int]]] = defaultdict(list)
    for (gap, islands), members in groups.items():
        chained = (
            _chains([findings[i] for i in members]) if islands else [list(range(len(members)))]
        )
        places[gap].extend([members[i] for i in chain] for chain in chained)
    told = list(findings)
    for gap, found in places.items():
        if len(found) < 2:
            continue
        ranked = sorted(found, key=lambda place: min(worst_first(findings[i]) for i in place))
        for rank, place in enumerate(ranked, start=1):
            for i in place:
                told[i] = replace(findings[i], gap=f"{gap}/{rank}")
    return told


def _chains(findings: Sequence[Finding]) -> list[list[int]]:
    """Indexes of findings in groups of which every member has another one near, unless alone.

    Those that were solved together as they couple are near, too.
    """
    places = shapely.points([finding.at_mm for finding in findings])
    reach = np.array([max(TOGETHER_MM, together_mm(f.detour_mm)) for f in findings])
    near: nx.Graph[int] = nx.Graph()
    near.add_nodes_from(range(len(findings)))
    one, other = shapely.STRtree(places).query(places, predicate="dwithin", distance=reach)
    close = shapely.distance(places[one], places[other]) <= reach[other]
    near.add_edges_from(np.stack([one, other], axis=1)[close].tolist())
    return [sorted(members) for members in nx.connected_components(near)]


def with_ids(findings: Iterable[Finding]) -> tuple[tuple[Finding, ...], dict[str, str]]:
    """The findings worst first, numbered; and their new ids by those that they had."""
    ranked = sorted(findings, key=worst_first)
    numbered = tuple(replace(finding, id=f"F{n}") for n, finding in enumerate(ranked, start=1))
    renamed = {old.id: new.id for old, new in zip(ranked, numbered, strict=True) if old.id}
    return numbered, renamed


def with_shares(findings: Sequence[Finding]) -> list[Finding]:
    """Name every net over the same gap, also those that no solve has put together."""
    nets: dict[str, set[str]] = defaultdict(set)
    for finding in findings:
        if finding.kind != "no-plane":
            nets[finding.gap].add(finding.net)
    shared = []
    for finding in findings:
        known = {share.net for share in finding.shares_gap_with} | {finding.net}
        more = sorted(nets.get(finding.gap, set()) - known)
        shares = (*finding.shares_gap_with, *(GapShare(net, None) for net in more))
        shared.append(
            replace(finding, shares_gap_with=tuple(sorted(shares, key=lambda share: share.net)))
        )
    return shared


def fingerprint(kind: str, net: str, layer: str, at: tuple[float, float]) -> str:
    """A hash of what, on which net and roughly where (to 1 mm)."""
    text = f"{kind}|{net}|{layer}|{round(at[0])}|{round(at[1])}"
    return sha256(text.encode()).hexdigest()[:16]
