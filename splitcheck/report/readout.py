"""How the files were understood, as text for people: layers, files, planes, nets, assumptions."""

from __future__ import annotations

from collections.abc import Sequence

from splitcheck import __version__
from splitcheck.report.page import Column, Page
from splitcheck.report.words import number, plural, shorten
from splitcheck.verdict.findings import Report


def render(report: Report, *, top: int, width: int, color: bool) -> str:
    """Write what was read, and why each file was taken for what it is.

    Parameters
    ----------
    top
        How many islands and how many nets to list, largest first; 0 lists all.
    width
        Columns of the terminal.
    color
        Whether to colour; nothing is said by colour alone.
    """
    page = Page(width, color=color)
    wide, high = report.size_mm
    page.say(
        f"splitcheck {__version__}: {shorten(report.board, 40)}, {wide:.2f} x {high:.2f} mm",
        indent=0,
        style="bold",
    )
    _layers(page, report)
    _files(page, report)
    _sentences(page, "Facts", report.facts, "None.")
    _islands(page, report, top)
    _classes(page, report)
    _nets(page, report, top)
    _sentences(page, "Assumed", report.assumptions, "Nothing that changes results.")
    _sentences(page, "Remarks on the files", report.remarks, "None.")
    return str(page)


def _layers(page: Page, report: Report) -> None:
    page.heading("Layers, from the top")
    if not report.layers:
        page.say("None.")
        return
    columns = (
        Column("no", "right"),
        Column("name", gives=True),
        Column("role"),
        Column("z mm", "right"),
        Column("copper um", "right"),
        Column("file", gives=True),
    )
    rows = [
        (str(row.number), row.name, row.role, f"{row.z_mm:.4f}", number(row.copper_um), row.file)
        for row in report.layers
    ]
    page.table(columns, rows)


def _files(page: Page, report: Report) -> None:
    page.heading("Files, and why each is what it is")
    for row in report.inputs:
        page.say(f"{shorten(row.file, 60)}: {row.kind}; {row.reason}", lead="- ")
    if not report.inputs:
        page.say("None.")


def _islands(page: Page, report: Report, top: int) -> None:
    page.heading("Islands of reference copper, largest first")
    islands = sorted(report.islands, key=lambda island: (-island.area_mm2, island.id))
    columns = (
        Column("id"),
        Column("layer", gives=True),
        Column("net", gives=True),
        Column("area mm2", "right"),
    )
    rows = [(row.id, row.layer, row.net, number(row.area_mm2)) for row in islands]
    _listed(page, columns, rows, top, "island")


def _classes(page: Page, report: Report) -> None:
    page.heading("Classes of nets, and what their nets are judged by")
    columns = (
        Column("class"),
        Column("nets", "right"),
        Column("rise\nns", "right"),
        Column("wave\nmV", "right"),
        Column("line\nohm", "right"),
        Column("error\nmV", "right"),
        Column("warning\nmV", "right"),
    )
    rows = [
        (
            row.name,
            str(row.nets),
            *(
                ("exempt", "-", "-", "-", "-")
                if row.exempt
                else map(
                    number, (row.rise_ns, row.wave_mv, row.line_ohm, row.error_mv, row.warning_mv)
                )
            ),
        )
        for row in report.classes
    ]
    if not rows:
        page.say("None.")
        return
    page.table(columns, rows)


def _nets(page: Page, report: Report, top: int) -> None:
    page.heading("Nets, longest first")
    nets = sorted(report.nets, key=lambda net: (-net.length_mm, net.name))
    columns = (
        Column("net", gives=True),
        Column("class", gives=True),
        Column("length mm", "right"),
        Column("layers", gives=True),
    )
    rows = [(row.name, row.net_class, number(row.length_mm), ", ".join(row.layers)) for row in nets]
    _listed(page, columns, rows, top, "net")


def _listed(
    page: Page, columns: Sequence[Column], rows: Sequence[Sequence[str]], top: int, thing: str
) -> None:
    shown = rows[:top] if top else rows
    if not rows:
        page.say("None.")
        return
    page.table(columns, shown)
    left = len(rows) - len(shown)
    if left:
        page.say(f"and {plural(left, 'more ' + thing)}: --top 0 shows them all")


def _sentences(page: Page, title: str, sentences: Sequence[str], none: str) -> None:
    page.heading(title)
    for place, sentence in enumerate(sentences, start=1):
        page.say(sentence, lead=f"{place}. ")
    if not sentences:
        page.say(none)
