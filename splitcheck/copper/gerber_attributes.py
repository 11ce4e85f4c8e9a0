"""The attribute dictionary of a Gerber file: TF, TA, TO and TD, plain or inside comments."""

from __future__ import annotations

import re

from splitcheck.copper.marks import NO_TAG, Tag

#: Most characters of one attribute that are kept.
MOST_LENGTH = 65_535
_ESCAPE = re.compile(r"\\(?:u([0-9A-Fa-f]{4})|U([0-9A-Fa-f]{8})|([0-9A-Fa-f]{4}))")


def unescaped(text: str) -> str:
    r"""Undo the escapes of a field: backslash, u, four digits; older writers leave out the u.

    Examples
    --------
    >>> unescaped(r"A\u002CB\002A\U0001F600"[:13])
    'A,B*'
    """
    if "\\" not in text:
        return text
    return _ESCAPE.sub(_character, text)


def _character(match: re.Match[str]) -> str:
    number = int(match[1] or match[2] or match[3], 16)
    if number > 0x10FFFF or 0xD800 <= number <= 0xDFFF:
        return match[0]
    return chr(number)


class Attributes:
    """Attributes in force, and the tag that marks drawn now carry."""

    def __init__(self) -> None:
        self.file: dict[str, tuple[str, ...]] = {}
        self._aperture: dict[str, tuple[str, ...]] = {}
        self._object: dict[str, tuple[str, ...]] = {}
        self._tags: dict[Tag, Tag] = {NO_TAG: NO_TAG}

    def obey(self, command: str) -> str | None:
        """Carry out a TF, TA, TO or TD command; returns what is odd about it."""
        kind, (name, *fields) = command[:2], command[2:].split(",")
        name = name.strip()
        values = tuple(unescaped(field) for field in fields)
        if kind == "TD":
            self._delete(name)
            return None
        if not name:
            return "an attribute without a name"
        if kind == "TF":
            # File attributes cannot be changed once they are set (format, clause 5.2).
            self.file.setdefault(name, values)
        elif kind == "TA":
            self._aperture[name] = values
        else:
            self._object[name] = values
            if name == ".N" and len(values) > 1:
                return "an object of several nets, taken as one of unknown net"
        return None

    def _delete(self, name: str) -> None:
        if name:
            self._aperture.pop(name, None)
            self._object.pop(name, None)
        else:
            self._aperture.clear()
            self._object.clear()

    def function(self) -> str | None:
        """First field of ``.AperFunction`` in the dictionary now."""
        # The format itself slips into this spelling once.
        fields = self._aperture.get(".AperFunction") or self._aperture.get(".aperFunction")
        return fields[0] if fields else None

    def tag(self, function: str | None) -> Tag:
        """The tag of a mark drawn now; equal states share one object."""
        held = self._object
        nets = held.get(".N")
        net = None if nets is None or len(nets) > 1 else (nets[0] if nets else "")
        # A pad that is alone on its net names no net.
        net = "" if net == "N/C" else net
        pad = held.get(".P", ())
        parts = held.get(".C", ())
        tag = Tag(
            net,
            function,
            pad[0] if pad else (parts[0] if parts else None),
            pad[1] if len(pad) > 1 else None,
        )
        return self._tags.setdefault(tag, tag)
