"""One copper file to one copper layer; runs in a process of its own."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from shapely import Polygon

from splitcheck.board.parts import CopperLayer, Pad
from splitcheck.board.traces import centre_lines
from splitcheck.copper import gerber, paint
from splitcheck.copper.marks import Drawing, Fill, Stroke
from splitcheck.units import Floats

#: A filled contour up to this size may be a pad, mm.
LARGEST_PAD_MM = 8.0


@dataclass(frozen=True, slots=True)
class CopperFile:
    """What a worker needs to read one copper layer."""

    number: int
    layer: str
    file: str
    text: str


@dataclass(frozen=True, slots=True)
class ReadLayer:
    """A layer as drawn, dark meaning copper, with what is to be said of the reading."""

    layer: CopperLayer
    remarks: tuple[str, ...]
    negative: bool
    """The file itself says that its image is negative; nothing is turned round yet."""


def read_layer(file: CopperFile) -> ReadLayer:
    """Read, paint and take apart one copper file.

    Raises
    ------
    SplitcheckError
        If the file cannot be read; the message names file and line.
    """
    drawing = gerber.read(file.text, file.file)
    pieces = paint.paint(drawing.marks)
    layer = CopperLayer(
        number=file.number,
        name=file.layer,
        file=file.file,
        pieces=pieces,
        names=paint.names(drawing.marks, pieces),
        lines=centre_lines(drawing.marks, pieces),
        pads=_pads(drawing),
        marks=len(drawing.marks),
    )
    return ReadLayer(layer, drawing.remarks, drawing.image_negative)


def _pads(drawing: Drawing) -> tuple[Pad, ...]:
    """Flashes, and fills small enough to be pads of odd shapes."""
    sizes: dict[int, float] = {}
    pads = []
    for mark in drawing.marks:
        if not mark.dark or isinstance(mark, Stroke):
            continue
        tag = mark.tag
        if isinstance(mark, Fill):
            xs, ys = zip(*mark.ring, strict=True)
            x0, y0, x1, y1 = min(xs), min(ys), max(xs), max(ys)
            size = max(x1 - x0, y1 - y0)
            if size > LARGEST_PAD_MM:
                continue
            at = ((x0 + x1) / 2, (y0 + y1) / 2)
            pads.append(Pad(at, tag.net, tag.component, tag.pin, tag.function, size, False))
            continue
        key = id(mark.shape)
        if key not in sizes:
            left, low, right, high = mark.shape.bounds
            sizes[key] = max(right - left, high - low)
        pads.append(Pad(mark.at, tag.net, tag.component, tag.pin, tag.function, sizes[key], True))
    return tuple(pads)


def pad_places(layers: tuple[CopperLayer, ...]) -> Floats:
    """Centres of all flashed pads, shape (n, 2), mm, each once."""
    places = [pad.at for layer in layers for pad in layer.pads if pad.flashed]
    if not places:
        return np.empty((0, 2))
    return np.unique(np.array(places), axis=0)


def copper_box(layers: tuple[CopperLayer, ...]) -> Polygon:
    """Bounding box of all copper."""
    boxes = np.array([piece.bounds for layer in layers for piece in layer.pieces])
    x0, y0 = boxes[:, :2].min(axis=0).tolist()
    x1, y1 = boxes[:, 2:].max(axis=0).tolist()
    box: Polygon = shapely.box(x0, y0, x1, y1)
    return box
