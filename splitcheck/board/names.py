"""What a net name says: ground, supply, or neither."""

from __future__ import annotations

import re
from functools import lru_cache

#: Names whose meaning is remembered: each is asked for by several stages, part by part.
MOST_NAMES = 1 << 14

_GROUND = re.compile(
    r"(?:^|[^A-Z])[ADPSCEIHR]?(?:GND|GROUND|EARTH|VSS|CHASSIS|SHIELD)(?:[^A-Z]|$|A|D|P|S|REF|PLANE)"
)
_SUPPLY = re.compile(
    r"^(?:"
    r"[+\-]?(?:P|V|VCC|VDD)?_?\d+(?:[.,]\d+)?V\d*(?:[_\-./ ].*|[A-Z]{0,4})?"  # +3V3 1V8 5.0V 12V_IN
    r"|[+\-]?V\d+(?:[PV._]\d+)?(?:[_\-./].*)?"  # V3P3 V1.8 V5
    r"|(?:[A-Z]{0,3})?(?:VCC|VDD|VEE|VPP|VTT|AVCC|DVCC|AVDD|DVDD)[A-Z0-9]{0,6}(?:[_\-./+ ].*)?"
    r"|\+?V(?:IN|OUT|BAT|BATT|BUS|SYS|MAIN|USB|CORE|IO|MEM|PLL|REF|RTC|DRV|MOT|SUPPLY|PWR)\d*"
    r"(?:[_\-./+ ].*)?"
    r"|\+V[A-Z]\w{0,7}|[+\-]BATT?"
    r"|(?:PWR|POWER|VPOWER)(?:[_\-./ ]?\w{0,8})?"
    r")$"
)

#: What a schematic program makes up where nobody names a net: a reference and a pin's name.
_MADE_UP = re.compile(r"^NET-\([^-]+-(?P<pin>[^)]+)\)$")
#: Pins that are supplies whatever the part is: VIN, VOUT and VREF can be signals of a converter.
_SUPPLY_PIN = re.compile(
    r"^(?:[A-Z]{0,3}(?:VCC|VDD|VEE|VPP|VTT)[A-Z0-9]{0,6}|V(?:BAT|BATT|BUS|SYS|CORE|IO|PLL))"
    r"\d*(?:[_\-./+ ].*)?$"
)


def last_part(name: str) -> str:
    """The name without the path of its sheet, in upper case, overbars dropped.

    Examples
    --------
    >>> last_part("/power/+3v3")
    '+3V3'
    """
    return name.rsplit("/", 1)[-1].strip().upper().replace("~{", "").replace("}", "").strip("~")


@lru_cache(MOST_NAMES)
def is_ground(name: str) -> bool:
    """Whether a net name is a ground by the habits of the trade (common practice, no source).

    Examples
    --------
    >>> [is_ground(name) for name in ("GND", "/adc/AGND", "GND_ISO", "GNDA", "TARGND", "VCC")]
    [True, True, True, True, False, False]
    """
    return bool(_GROUND.search(last_part(name)))


@lru_cache(MOST_NAMES)
def is_supply(name: str) -> bool:
    """Whether a net name is a supply by the habits of the trade (common practice, no source).

    Examples
    --------
    >>> [is_supply(name) for name in ("+3V3", "VCC", "/mcu/1V8_CORE", "VBUS", "P5V0", "VDDIO")]
    [True, True, True, True, True, True]
    >>> [is_supply(name) for name in ("VSYNC", "SDA", "USB_D+", "GPIO12", "VIDEO1", "5V_EN")]
    [False, False, False, False, False, False]
    >>> [is_supply(name) for name in ("Net-(U3-VDDIO_18)", "Net-(U3-VOUT)", "Net-(R1-Pad2)")]
    [True, False, False]
    """
    name = last_part(name)
    made_up = _MADE_UP.match(name)
    if made_up is not None:
        return bool(_SUPPLY_PIN.match(made_up["pin"])) and not _CONTROL.search(made_up["pin"])
    return bool(_SUPPLY.match(name)) and not _CONTROL.search(name)


@lru_cache(MOST_NAMES)
def is_power(name: str) -> bool:
    """Whether any of the names of a net, joined by ``|`` where copper ties several, is power.

    Examples
    --------
    >>> [is_power(name) for name in ("GND|ANT1", "+3V3", "SDA|SCL")]
    [True, True, False]
    """
    return any(is_ground(one) or is_supply(one) for one in name.split("|"))


def in_words(name: str) -> str:
    """A net's name in a sentence: of names that copper ties together, the first tells.

    Examples
    --------
    >>> in_words("+3V3"), in_words("GND|GNDA|ANT1")
    ('+3V3', 'GND and 2 more')
    """
    first, *others = name.split("|")
    return f"{first} and {len(others)} more" if others else name


#: A supply's name followed by one of these is a logic signal about that supply.
_CONTROL = re.compile(
    r"[_\-./ ](?:EN|ENA|ENABLE|PG|PGOOD|OK|GOOD|SENSE|SNS|FB|CTRL|ON|OFF|FLT|FAULT|"
    r"OC|DET|MON|SEL|ALERT|N|LED|INT|RST)\d*$"
)
