"""An SVG figure in, a PNG file out, by a library that is only needed for this."""

from __future__ import annotations

from importlib import import_module

from splitcheck.errors import SplitcheckError

#: Pixels for one unit of the figure.
SCALE = 2.0


def render(svg: str) -> bytes:
    """Turn a figure into a picture.

    Parameters
    ----------
    svg
        Text of an SVG file.

    Returns
    -------
    Contents of a PNG file, two pixels a unit.

    Raises
    ------
    SplitcheckError
        If the library is not installed.
    """
    try:
        library = import_module("resvg_py")
    except ImportError as error:
        raise SplitcheckError(
            "--out png",
            "the library that draws PNG files is not installed",
            "install splitcheck[png], or write svg=FILE",
        ) from error
    picture: bytes = bytes(library.svg_to_bytes(svg_string=svg, zoom=SCALE))
    return picture
