"""What net names say of grounds and supplies (common practice, no source)."""

from __future__ import annotations

import pytest

from splitcheck.board.names import is_ground, is_supply


@pytest.mark.parametrize(
    "name",
    ["GND", "gnd", "/adc/AGND", "DGND", "PGND", "GND_ISO", "GNDA", "GNDD", "GND1", "VSS", "VSSA",
     "CHASSIS", "Earth", "SHIELD", "/power/GND", "GND-USB", "USB_GND", "~{GND}"],
)  # fmt: skip
def test_grounds(name: str) -> None:
    """Names that carry ground, whatever sheet they stand on."""
    assert is_ground(name)
    assert not is_supply(name)


@pytest.mark.parametrize(
    "name",
    ["+3V3", "+5V", "3.3V", "-12V", "1V8", "+1V8_CORE", "V3P3", "VCC", "VCCIO", "VDD", "VDDA",
     "AVDD", "DVCC", "VBUS", "VBAT", "VIN", "/mcu/VREF", "P5V0", "VCC_1V2", "PWR", "+12V_IN",
     "VCC-PE", "+VUSB", "+VDC", "+BATT", "VUSB", "Net-(U3-VDDIO_08_1)", "Net-(U18H-VCCADC_0)",
     "Net-(J1-VBUS)"],
)  # fmt: skip
def test_supplies(name: str) -> None:
    """Names that carry a supply."""
    assert is_supply(name)
    assert not is_ground(name)


@pytest.mark.parametrize(
    "name",
    ["SDA", "CLK", "USB_D+", "GPIO12", "VSYNC", "VIDEO1", "LEGEND", "BACKGROUNDED", "D0", "V",
     "5V_EN", "VCC_PG", "3V3_FB", "VBUS_DET", "PWR_LED", "PWR.RST", "Net-(R1-Pad1)",
     "Net-(U3-VIN+)", "Net-(U3-VOUT)", "Net-(U3-VDD_EN)", "@L1(1.0,2.0)",
     ""],
)  # fmt: skip
def test_signals(name: str) -> None:
    """Names that carry neither; a supply's enable or feedback is a signal about it."""
    assert not is_ground(name)
    assert not is_supply(name)
