"""What each kind of finding means and what helps against it, as formats with rules list them."""

from __future__ import annotations

from typing import NamedTuple

from splitcheck.verdict.findings import Kind

CAUTION = (
    "A gap can be there for safety (isolation, creepage): never bridge one before the applicable "
    "product-safety standard, local code and a qualified engineer have been asked."
)


class Rule(NamedTuple):
    """One kind of finding in words."""

    title: str
    what: str
    """One full sentence: what is found."""
    help: str
    """What can be done."""


RULES: dict[Kind, Rule] = {
    "slot-crossing": Rule(
        "Trace over a slot in its plane",
        "The trace runs over a long narrow gap in its reference plane, and its return current has "
        "to go round the gap.",
        "Move what cuts the plane to another layer or along the trace, shorten the slot, or move "
        "the trace round its end. Where the slot has to stay, stitch both of its sides to a whole "
        "plane beside the trace.",
    ),
    "void-crossing": Rule(
        "Trace over a void in its plane",
        "The trace runs over a compact gap in its reference plane: merged antipads or a cut-out.",
        "Make antipads smaller or set the vias farther apart until copper is left between them, "
        "or move the trace beside the void.",
    ),
    "split-crossing": Rule(
        "Trace from one piece of plane to another",
        "The trace leaves one piece of reference copper for another, and its return current has "
        "to get across.",
        "Keep the trace over one piece of plane, or run it beside a plane that is whole. Where it "
        "must cross, give the return a way right there: plated holes to a plane of the same net, "
        "or a capacitor between the two pieces.",
    ),
    "no-plane": Rule(
        "Trace without a plane",
        "No layer has reference copper beneath or above this stretch of the trace.",
        "Pour ground under the trace, or move the trace to where there is a plane.",
    ),
    "edge-run": Rule(
        "Trace along the edge of its plane",
        "The trace runs along or beyond the edge of its reference plane, where the return current "
        "is squeezed.",
        "Move the trace inwards by some heights above its plane, or let the plane reach farther.",
    ),
    "plane-change": Rule(
        "Change of plane without a way for the return",
        "The trace changes layers and with it the reference plane, and nothing nearby takes the "
        "return current along.",
        "Put a plated hole between the two planes right beside the via, or a capacitor where the "
        "planes are of different nets.",
    ),
}
