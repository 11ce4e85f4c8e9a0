"""A report and its pictures in, one HTML page out that needs nothing beside it."""

from __future__ import annotations

from base64 import b64encode
from hashlib import sha256
from importlib.resources import files
from typing import NamedTuple

from jinja2 import Environment, StrictUndefined
from markupsafe import Markup

from splitcheck import __version__
from splitcheck.errors import SplitcheckError
from splitcheck.report import charts, closeups, mapdrawing, tally
from splitcheck.report.drawing import DARK, LIGHT, variables
from splitcheck.report.kinds import CAUTION, RULES
from splitcheck.report.pagedata import SENTENCE, data, sentence
from splitcheck.report.sentences import cost, place, source
from splitcheck.report.words import plural, shorten
from splitcheck.verdict.changes import Comparison
from splitcheck.verdict.findings import LEVELS, Finding, Report
from splitcheck.verdict.views import FindingView, Pictures

_NAME = 80


def render(
    report: Report, comparison: Comparison | None = None, pictures: Pictures | None = None
) -> str:
    """Write the report of a board as one HTML page.

    Parameters
    ----------
    report
        The report.
    comparison
        What became of an earlier revision, if there is one.
    pictures
        What is drawn of the board.

    Returns
    -------
    The page: no network, no file beside it; names from files are escaped, and its policy lets no
    script run but its own.

    Raises
    ------
    SplitcheckError
        Without pictures: a report that was read back holds no shapes to draw.
    """
    if pictures is None:
        raise SplitcheckError(
            "--out html", "a report alone holds no shapes to draw", "give the board's own export"
        )
    script, style = _file("board.js"), _style()
    environment = Environment(
        autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True
    )
    environment.filters["shown"] = shorten
    frame = mapdrawing.frame_of(pictures.board)
    return environment.from_string(_file("board.html.j2")).render(
        version=__version__,
        report=report,
        name=shorten(report.board, _NAME),
        worst=_worst(report),
        levels=_levels(report),
        kinds={kind: RULES[kind] for kind in dict.fromkeys(f.kind for f in report.findings)},
        rules=RULES,
        caution=CAUTION,
        drawn=len(pictures.findings),
        with_streams=pictures.with_streams,
        tolerance_mm=pictures.board.tolerance_mm,
        layers=pictures.board.layers,
        map=Markup(mapdrawing.draw(pictures.board, report.findings)),  # escaped there
        map_size=frame.size,
        hatch=Markup(closeups.hatch()),
        closeups=[_closeup(f, view) for f in report.findings if (view := pictures.of(f.id))],
        content=Markup(data(report, comparison, pictures)),
        script=Markup(script),
        style=Markup(style),
        script_hash=_digest(script),
        style_hash=_digest(style),
        sentence=SENTENCE,
    )


class _Closeup(NamedTuple):
    """What the page keeps of a finding that is drawn from near."""

    id: str
    panels: tuple[tuple[Markup, str], ...]
    """Drawings and what they show."""
    charts: tuple[tuple[Markup, int, int, str], ...]
    """Drawings, their width and height, and what they show."""
    facts: tuple[tuple[str, str], ...]


def _closeup(finding: Finding, view: FindingView) -> _Closeup:
    sides: tuple[closeups.Side, ...] = closeups.SIDES if view.whole is not None else ("broken",)
    panels = [
        (
            Markup(closeups.svg(finding, view, side)),  # escaped there
            closeups.caption(finding, view, side),
        )
        for side in sides
    ]
    shown = []
    bars = charts.bars_of(finding)
    if bars:
        inner, wide, high = charts.bars(bars)
        shown.append((Markup(inner), wide, high, "Added loop inductance with its error"))
    if view.impedance is not None:
        inner, wide, high = charts.impedance(view.impedance)
        words = "Impedance of the loop against frequency"
        shown.append((Markup(inner), wide, high, words))
    facts = tuple((question, shorten(answer, SENTENCE)) for question, answer in view.facts)
    return _Closeup(finding.id, tuple(panels), tuple(shown), facts)


def _worst(report: Report) -> dict[str, str] | None:
    """The answer in short: which net, where, why, and what would help."""
    standing = tally.standing(report.findings)
    if not standing:
        return None
    finding = standing[0]
    group = next(g for g in tally.over_one_gap(standing) if g[0] is finding)
    nets = tally.nets_of(group)
    others = f" {plural(len(nets) - 1, 'other net')} cross the same gap." if len(nets) > 1 else ""
    mend = RULES[finding.kind].help
    if finding.proposals:
        best = finding.proposals[0]
        left = f"{best.added_nh:.2f} nH"
        mend = f"{best.words[:1].upper()}{best.words[1:]}; that leaves {left}."
    return {
        "id": finding.id,
        "net": shorten(finding.net, _NAME),
        "cost": cost(finding).replace("+-", "\u00b1"),
        "title": RULES[finding.kind].title,
        "place": place(finding),
        "source": source(finding),
        "why": sentence(finding.reason),
        "others": others.replace("net cross", "net crosses"),
        "mend": shorten(mend, SENTENCE),
    }


def _levels(report: Report) -> list[tuple[str, int]]:
    standing = tally.standing(report.findings)
    return [(level, sum(f.level == level for f in standing)) for level in LEVELS]


def _file(name: str) -> str:
    return files("splitcheck.report").joinpath("web", name).read_text(encoding="utf-8")


def _style() -> str:
    """The style sheet: colours by the reader's setting, dark paper never printed."""
    dark = f"@media screen and (prefers-color-scheme:dark){{:root{{{variables(DARK)}}}}}"
    sheet = f":root{{color-scheme:light dark;{variables(LIGHT)}}}\n{dark}\n"
    return sheet + _file("board.css") + closeups.STYLE + charts.STYLE + mapdrawing.STYLE


def _digest(inner: str) -> str:
    """How a policy names a script or style sheet that may be used."""
    return "sha256-" + b64encode(sha256(inner.encode()).digest()).decode()
