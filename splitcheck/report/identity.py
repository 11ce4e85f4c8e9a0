"""A name for each finding that lasts from one revision to the next, for hosts that keep track.

``Finding.fingerprint`` says what is where; hosts need one that survives a board being moved.
"""

from __future__ import annotations

from collections import Counter
from hashlib import sha256

from splitcheck.verdict.changes import Comparison, family
from splitcheck.verdict.findings import Finding, Report


def identities(report: Report, comparison: Comparison | None = None) -> dict[str, str]:
    """A hash for each finding by its id, each once in the report.

    Notes
    -----
    It is made from kind, net, and the numbers of both layers, with a running number where one net
    has several such findings; not from place or value, which change without the finding being
    another one. With an earlier revision, a finding that was there keeps the hash that it had,
    whatever its net or its layers' files are called now.

    Examples
    --------
    >>> identities(Report("b", (1.0, 2.0), (), (), (), (), (), (), (), (), (), ()))
    {}
    """
    known: dict[str, str] = {}
    if comparison is not None:
        before = identities(comparison.was)
        for change in comparison.changes:
            if change.now is not None and change.was is not None:
                known[change.now.id] = before[change.was.id]
    taken = set(known.values())
    numbers = {layer.name: str(layer.number) for layer in report.layers}
    seen: Counter[str] = Counter()
    for finding in sorted(report.findings, key=lambda finding: finding.at_mm):
        if finding.id in known:
            continue
        words = _words(finding, numbers)
        while (print_ := _hash(words, seen[words])) in taken:
            seen[words] += 1
        taken.add(print_)
        known[finding.id] = print_
    return {finding.id: known[finding.id] for finding in report.findings}


def _words(finding: Finding, numbers: dict[str, str]) -> str:
    layers = (numbers.get(layer, layer) for layer in (finding.layer, finding.plane_layer))
    return "\0".join((family(finding.kind), finding.net, *layers))


def _hash(words: str, number: int) -> str:
    text = f"{words}\0{number}".encode("utf-8", errors="surrogatepass")
    return sha256(text).hexdigest()[:32]
