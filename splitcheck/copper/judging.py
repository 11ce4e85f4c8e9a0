"""From one file's text, name and job entry to what it is, with the reason in plain words."""

from __future__ import annotations

import re
from typing import NamedTuple

from splitcheck.copper import naming, sniff
from splitcheck.copper.jobfile import Job
from splitcheck.copper.naming import Claim, Kind

_FUNCTIONS: dict[str, Kind] = {
    "copper": "copper", "profile": "profile", "plated": "drill", "nonplated": "drill",
    "mixedplating": "drill", "soldermask": "mask", "paste": "paste", "solderpaste": "paste",
    "legend": "legend",
}  # fmt: skip
_PLACEMENT_ENDINGS = frozenset({"pos", "mnt", "mnb", "pnp", "xy", "cpl"})
_SIDES: dict[str, naming.Side] = {"top": "top", "inr": "inner", "bot": "bottom"}


class Read(NamedTuple):
    """A readable file before it is judged."""

    name: str
    text: str
    digest: str
    language: sniff.Language


class Judged(NamedTuple):
    """A file and what it was taken for."""

    read: Read
    claim: Claim
    source: str
    """``attribute``, ``comment``, ``job``, ``name``, ``stack`` or ``content``."""


def judge(read: Read, job: Job | None, start: str) -> Judged:
    """What one file is, by the first evidence that says so."""
    plain: dict[str, tuple[Kind, str]] = {
        "job": ("job", "it is a job file"),
        "netlist": ("netlist", "its records are those of an IPC-D-356 netlist"),
        "placement": ("placement", "it lists where parts are placed"),
        "tools": ("tools", "it lists drill tools"),
        "excellon": ("drill", "its commands are those of a drill file"),
        "text": ("readme", "it is plain text"),
        "binary": ("other", "it is binary data"),
        "empty": ("other", "it is empty"),
    }
    if read.language != "gerber":
        kind, reason = plain[read.language]
        if read.language == "text" and naming.ending(read.name) in _PLACEMENT_ENDINGS:
            kind, reason = "placement", "its ending is that of a list of placed parts"
        if naming.ending(read.name) == "zip":
            reason = "it is an archive inside; archives inside are not opened"
        return Judged(read, Claim(kind, reason), "content")
    attributes = sniff.file_attributes(read.text)
    if attributes.get(".Part", ("",))[0] in ("FabricationPanel", "Coupon"):
        part = attributes[".Part"][0]
        return Judged(read, Claim("other", f"its attributes call it a {part}"), "attribute")
    function = attributes.get(".FileFunction")
    if function:
        return Judged(read, _by_function(function, "its attributes say"), "attribute")
    entry = job.entry(read.name) if job else None
    if entry and entry.function[0]:
        return Judged(read, _by_function(entry.function, "the job file says"), "job")
    return _by_name(read, start)


def _by_function(function: tuple[str, ...], who: str) -> Claim:
    kind = _FUNCTIONS.get(function[0].casefold(), "other")
    reason = f"{who} {','.join(function)}"
    if kind != "copper":
        return Claim(kind, reason, strength=9)
    fields = [f.casefold() for f in function]
    numbers = [int(f[1:]) for f in fields if re.fullmatch(r"l\d{1,3}", f)]
    side = next((_SIDES[f] for f in fields if f in _SIDES), None)
    role: naming.Role | None = "signal" if "signal" in fields else None
    return Claim(kind, reason, side, "layer", numbers[0] if numbers else None, role)


def _by_name(read: Read, start: str) -> Judged:
    """What a file without attributes is: by its name, helped by comments of its writer."""
    claim = _name_claim(read, start)
    if claim and claim.kind == "drill":
        claim = Claim("other", "it is Gerber without a drill function: a drawing of the holes")
    if claim is not None and claim.kind != "copper":
        return Judged(read, claim, "name")
    place, film = sniff.physical_order(read.text), sniff.film_layer(read.text)
    if place is not None:
        reason = f"a comment in it says that it is physical layer {place}"
        side = claim.side if claim else None
        return Judged(read, Claim("copper", reason, side, "layer", place), "comment")
    if film is not None:
        claim = claim or Claim("copper", f'its header says copper layer "{film}"')
        said = naming.by_words(film)
        if said and said.kind == "copper":
            claim = claim._replace(role=said.role, side=claim.side or said.side)
    if claim is None:
        claim = Claim("other", "nothing says which layer it is; --stack FILE.toml can name it")
    return Judged(read, claim, "name")


def _name_claim(read: Read, start: str) -> Claim | None:
    """The claim of a file's ending and words; the ending decides what kind of film it is.

    An outline by its ending alone is mere custom, so there the words decide.
    """
    words = naming.by_words(naming.layer_words(read.name, start))
    end = naming.by_ending(read.name)
    if end and end.kind != "profile" and (words is None or words.kind != end.kind):
        return end
    if words and end and words.kind == end.kind == "copper" and not (words.side or words.number):
        return end
    texts = (sniff.film_layer(read.text), sniff.image_name(read.text))
    spare = (naming.by_words(text) for text in (*texts, naming.layer_words(read.name, "")) if text)
    return words or end or next((claim for claim in spare if claim), None)
