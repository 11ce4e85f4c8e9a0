"""Small boards whose answer a reader can see."""

from __future__ import annotations

from dataclasses import replace

from fixtures.making.plan import (
    BoardPlan,
    Cut,
    Dielectric,
    Hole,
    Pad,
    Pour,
    Sheet,
    Trace,
    box,
)

#: Where CLK crosses the slot of `slotted_board`, mm.
CROSSING_MM = (20.0, 15.0)


def slotted_board(
    *, slot_mm: float = 12.0, slot_width_mm: float = 0.6, aside_mm: float = 0.0
) -> BoardPlan:
    """Two layers, 40 x 30 mm: a ground plane with one slot, three traces over it.

    ``CLK`` runs upright over the slot, ``aside_mm`` to the right of the slot's middle; ``DATA``
    crosses it 3 mm further to the left; ``EN`` stays 8 mm off its left end.

    Parameters
    ----------
    slot_mm
        Length of the slot without its round ends, mm, 8 to 24.
    slot_width_mm
        Width of the slot, mm.
    aside_mm
        How far CLK is off the middle of the slot, mm.
    """
    middle = CROSSING_MM[0] - aside_mm
    left, right = middle - slot_mm / 2, middle + slot_mm / 2
    lanes = {"CLK": CROSSING_MM[0], "DATA": CROSSING_MM[0] - 3.0, "EN": max(2.0, left - 8.0)}
    traces = [Trace(1, net, ((x, 4.0), (x, 26.0))) for net, x in lanes.items()]
    pads = [
        Pad(1, net, (x, y), (0.8, 0.8), ref, str(pin))
        for pin, (net, x) in enumerate(lanes.items(), 1)
        for ref, y in (("U1", 4.0), ("U2", 26.0))
    ]
    corners = ((2.0, 2.0), (38.0, 2.0), (38.0, 28.0), (2.0, 28.0))
    return BoardPlan(
        name="slotted",
        outline=box(0, 0, 40, 30),
        sheets=(Sheet("top"), Sheet("bottom", "Plane")),
        dielectrics=(Dielectric(0.2),),
        traces=tuple(traces),
        pours=(Pour(2, "GND", box(0.5, 0.5, 39.5, 29.5)),),
        cuts=(Cut(2, ((left, 15.0), (right, 15.0)), slot_width_mm),),
        pads=tuple(pads),
        holes=tuple(Hole(at, "GND") for at in corners),
    )


def split_board(*, gap_mm: float = 0.5) -> BoardPlan:
    """Four layers, 40 x 30 mm: ground on layer 2, two supplies on layer 3, a bus of two below.

    ``BUS0`` and ``BUS1`` run across the split at x = 20; a capacitor from each supply to ground
    stands 3 mm above them on either side. ``TOP`` runs over the whole ground plane.
    """
    left, right = 20.0 - gap_mm / 2, 20.0 + gap_mm / 2
    lanes = {"BUS0": 10.0, "BUS1": 11.0}
    traces = [Trace(4, net, ((4.0, y), (36.0, y))) for net, y in lanes.items()]
    traces.append(Trace(1, "TOP", ((4.0, 20.0), (36.0, 20.0))))
    pads = [
        Pad(4, net, (x, y), (0.6, 0.6), ref, str(pin))
        for pin, (net, y) in enumerate(lanes.items(), 1)
        for ref, x in (("U1", 4.0), ("U2", 36.0))
    ]
    pads += [
        Pad(1, "TOP", (x, 20.0), (0.6, 0.6), ref, "3") for ref, x in (("U1", 4.0), ("U2", 36.0))
    ]
    holes = [Hole(at, "GND") for at in ((2.0, 2.0), (38.0, 2.0), (38.0, 28.0), (2.0, 28.0))]
    for ref, supply, x in (("C1", "+5V", 17.0), ("C2", "+3V3", 23.0)):
        pads += [
            Pad(1, supply, (x, 14.0), (0.8, 0.8), ref, "1"),
            Pad(1, "GND", (x, 15.5), (0.8, 0.8), ref, "2"),
        ]
        holes += [Hole((x, 13.0), supply), Hole((x, 16.5), "GND")]
        traces += [
            Trace(1, supply, ((x, 14.0), (x, 13.0)), 0.4),
            Trace(1, "GND", ((x, 15.5), (x, 16.5)), 0.4),
        ]
    return BoardPlan(
        name="split",
        outline=box(0, 0, 40, 30),
        sheets=(Sheet("top"), Sheet("ground", "Plane"), Sheet("supply", "Plane"), Sheet("bottom")),
        dielectrics=(Dielectric(0.2), Dielectric(0.8), Dielectric(0.2)),
        traces=tuple(traces),
        pours=(
            Pour(2, "GND", box(0.5, 0.5, 39.5, 29.5)),
            Pour(3, "+5V", box(0.5, 0.5, left, 29.5)),
            Pour(3, "+3V3", box(right, 0.5, 39.5, 29.5)),
        ),
        pads=tuple(pads),
        holes=tuple(holes),
    )


def two_ground_board(*stitches: tuple[float, float]) -> BoardPlan:
    """Three layers: the ground of layer 2 is cut in two, layer 3 is whole ground, CLK on top.

    Parameters
    ----------
    stitches
        Places of the vias that join both halves of layer 2 with layer 3, mm.
    """
    return replace(
        split_board(),
        name="stitched",
        sheets=(Sheet("top"), Sheet("halves", "Plane"), Sheet("ground", "Plane")),
        dielectrics=(Dielectric(0.2), Dielectric(0.4)),
        traces=(Trace(1, "CLK", ((4.0, 15.0), (36.0, 15.0))),),
        pours=(
            Pour(2, "GND", box(0.5, 0.5, 19.7, 29.5)),
            Pour(2, "GND", box(20.3, 0.5, 39.5, 29.5)),
            Pour(3, "GND", box(0.5, 0.5, 39.5, 29.5)),
        ),
        pads=(
            Pad(1, "CLK", (4.0, 15.0), (0.6, 0.6), "U1", "1"),
            Pad(1, "CLK", (36.0, 15.0), (0.6, 0.6), "U2", "1"),
        ),
        holes=tuple(Hole(at, "GND") for at in stitches),
    )
