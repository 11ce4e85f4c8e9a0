"""From an IPC-D-356 netlist to net names at places in mm, and to where it lies on the copper."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from splitcheck.copper import drill_fit
from splitcheck.errors import SplitcheckError
from splitcheck.units import INCH_MM, Floats

#: Most records in one file.
RECORDS_CAP = 1_000_000
_GOOD = 0.9
_AGAIN = "export the netlist again"

_ALIAS = re.compile(r"P\s+(NNAME(\S{1,60}))\s+(\S.{0,400}?)\s*$")
_UNITS = re.compile(r"P\s+UNITS\s+(?:CUST\s*)?(\w+)")
_PLACE = re.compile(r"(?:A(\d{2})\s*)?X\s?([-+]?\d{1,9})\s*Y\s?([-+]?\d{1,9})")
_HOLE = re.compile(r"D(\d{4})([PU]?)")


class NetPoint(NamedTuple):
    """One record: copper at a place, and the net it belongs to."""

    net: str
    """Net name, aliases resolved; ``""`` for ``N/C``, copper declared to be on no net."""
    x_mm: float
    y_mm: float
    component: str | None
    """Reference of the component; ``None`` for a via."""
    pin: str | None
    through: bool
    """Whether it is a plated or plain hole through the board."""
    access: int
    """0 from both sides, 1 from the top, n from layer n."""
    line: int
    hole_mm: float | None = None


class Alignment(NamedTuple):
    """Where a netlist lies on the copper: add the shift to its places."""

    dx_mm: float
    dy_mm: float
    share: float
    """Share of its places that then lie on a pad or hole, 0 to 1."""
    remark: str


@dataclass(frozen=True, slots=True)
class Netlist:
    """An IPC-D-356 netlist as read, in mm."""

    name: str
    points: tuple[NetPoint, ...]
    """In file order."""
    aliases: int
    """How many long names it defines."""
    units: str
    remarks: tuple[str, ...]

    def nets(self) -> tuple[str, ...]:
        """All net names, sorted, without ``N/C``."""
        return tuple(sorted({p.net for p in self.points if p.net}))


def read(text: str, name: str) -> Netlist:
    r"""Read an IPC-D-356 or 356A netlist.

    Parameters
    ----------
    text
        The whole file.
    name
        Its name, for messages.

    Returns
    -------
    One point for each pad or via; tooling holes without a net are left out.

    Raises
    ------
    SplitcheckError
        If a pad record has no place, the units are unknown, or there is no record at all.

    Notes
    -----
    Fields are found by their letters rather than by columns, because writers shift them.
    Without a units record, and with ``CUST 0`` or ``CUST 2``, the unit is 0.0001 inch; with
    ``CUST 1`` and ``SI`` it is 0.001 mm.

    References
    ----------
    IPC-D-356A, "Bare substrate electrical test information in digital form" (from memory, and
    as common writers write it).

    Examples
    --------
    >>> row = "327GND              R1    -1          A01X+010000Y-005000X0236Y0236R000 S2"
    >>> read("P  UNITS CUST 0\n" + row, "a.ipc").points[0][:5]
    ('GND', 25.4, -12.7, 'R1', '1')
    """
    unit_mm, units = 0.0001 * INCH_MM, "0.0001 inch (not stated)"
    aliases: dict[str, str] = {}
    points: list[NetPoint] = []
    odd: dict[str, int] = {}
    before = ""
    for number, line in enumerate(text.splitlines(), 1):
        if line.startswith("999"):
            break
        if line.startswith("P"):
            if alias := _ALIAS.match(line):
                _add_alias(aliases, alias)
            elif stated := _UNITS.match(line):
                unit_mm, units = _unit(stated[1], f"{name}:{number}")
            continue
        if not re.match(r"[0-3]\d7", line):
            if line.strip() and not re.match(r"C|[0-3]\d[89]|[34]\d\d", line):
                odd.setdefault(line.strip()[:20], number)
            continue
        point = _record(line, f"{name}:{number}", number, unit_mm, before)
        if point is not None:
            before = point.net or "N/C"
            points.append(point)
            if len(points) > RECORDS_CAP:
                wrong = f"holds over {RECORDS_CAP} records"
                raise SplitcheckError(name, wrong, "give a netlist of this board alone")
    if not points:
        raise SplitcheckError(name, "holds no pad or via record", _AGAIN)
    resolved = tuple(p._replace(net=_net(p.net, aliases)) for p in points)
    remarks = [f"{name}:{n}: unknown record passed over: {body}" for body, n in odd.items()][:20]
    if len(odd) > 20:
        remarks.append(f"{name}: {len(odd) - 20} more unknown records were passed over")
    return Netlist(name, resolved, len(aliases), units, tuple(remarks))


def _add_alias(aliases: dict[str, str], found: re.Match[str]) -> None:
    """Records name a long net by all of ``NNAMExyz`` or by ``xyz`` alone."""
    aliases[found[1]] = found[3]


def _net(written: str, aliases: dict[str, str]) -> str:
    if written == "N/C":
        return ""
    if written in aliases:
        return aliases[written]
    return written if written[:1].isdecimal() else aliases.get("NNAME" + written, written)


def _unit(word: str, place: str) -> tuple[float, str]:
    if word in ("0", "2", "CUST"):
        return 0.0001 * INCH_MM, "0.0001 inch"
    if word in ("1", "SI"):
        return 0.001, "0.001 mm"
    raise SplitcheckError(place, f'unknown units "{word}"', _AGAIN)


def _record(line: str, place: str, number: int, unit_mm: float, before: str) -> NetPoint | None:
    """One pad or via; ``None`` for what carries no net (tooling holes, conductors, outlines)."""
    kind = line[1]
    if kind not in "0123456":
        return None
    net = line[3:17].strip() or (before if line[0] == "0" else "")
    if not net:
        return None
    found = _PLACE.search(line, 26)
    if found is None:
        wrong = f'"{line[:60].rstrip()}" gives no place'
        raise SplitcheckError(place, wrong, _AGAIN)
    head = line[20 : found.start()]
    component = head[:6].strip()
    pin = head[6:].removeprefix("-")[:4].strip()
    hole = _HOLE.search(line, 31, found.start() + 1)
    hole_mm = round(int(hole[1]) * unit_mm, 6) if hole and int(hole[1]) else None
    is_via = component in ("VIA", "")
    return NetPoint(
        net=net,
        x_mm=round(int(found[2]) * unit_mm, 6),
        y_mm=round(int(found[3]) * unit_mm, 6),
        component=None if is_via else component,
        pin=None if is_via else pin or None,
        through=kind in "1456" or (kind == "0" and hole_mm is not None),
        access=int(found[1] or 0),
        line=number,
        hole_mm=hole_mm,
    )


def align(netlist: Netlist, pads: Floats, holes: Floats) -> Alignment:
    """Find the shift that lays a netlist onto the copper.

    Parameters
    ----------
    netlist
        As read; its origin may differ from that of the Gerber files.
    pads, holes
        Pad and hole centres, shape (n, 2) and (m, 2), mm.

    Returns
    -------
    The shift in mm, the share of places that lie on a pad or hole then, and a remark that says
    so. A share below about 0.5 means that it does not fit: do not take names from it.

    Notes
    -----
    Only shifts are tried, no turns or mirrors. The shift is voted for by differences between
    places of both (see ``drill_fit.shift_between``).
    """
    places = drill_fit.unique_places([(p.x_mm, p.y_mm) for p in netlist.points])
    rows = [np.asarray(a, dtype=np.float64).reshape(-1, 2) for a in (pads, holes)]
    targets = drill_fit.unique_places(np.concatenate(rows))
    share = drill_fit.share_on_pads(places, targets)
    dx_mm, dy_mm = 0.0, 0.0
    if share < _GOOD:
        moved = drill_fit.shift_between(places, targets)
        if moved[2] > share:
            dx_mm, dy_mm, share = moved
    shift = f"moved by ({dx_mm:g}, {dy_mm:g}) mm" if dx_mm or dy_mm else "as it lies"
    remark = f"{netlist.name}: {shift}, {share:.0%} of {len(places)} places lie on copper pads"
    return Alignment(dx_mm, dy_mm, share, remark)
