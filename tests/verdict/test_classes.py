"""The shipped classes by the names that they know, and what a board's own rules make of nets."""

from __future__ import annotations

import tomllib

import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from splitcheck.board.board import Board
from splitcheck.errors import SplitcheckError
from splitcheck.verdict.classes import Known, class_of, know
from splitcheck.verdict.packs import rules_folder, rules_of, shipped_files, shipped_rules
from splitcheck.verdict.rulesfile import read_rules
from tests.making.hand import Line, Sheet, board

PACK = tomllib.loads((rules_folder() / "classes.toml").read_text(encoding="utf-8"))["class"]

#: By class: names that are of it, and a name much like them that is not.
NAMES: dict[str, tuple[tuple[str, ...], str]] = {
    "usb-super": (("USB_SSTXP", "SSRX1-", "/hub/USB3_TX_N"), "USB3_EN"),
    "pcie": (("PCIE_RX0_P", "PER3-", "/slot/M2_PET1_N"), "PCIE_WAKE#"),
    "serdes": (("SATA_TX_P", "MGT_RX2_N", "SGMII0_TXP"), "SATA_LED"),
    "hdmi": (("TMDS_D0+", "HDMI_D2_N", "HDMI_CLK+"), "HDMI_HPD"),
    "mipi": (("DSI_D0P", "CSI0_D1_N", "DSI-CKN"), "CSI_D7"),
    "m-lvds": (("MLVDS0_P",), "LVDS_CLK_P"),
    "lvds": (("LVDS_A0_P", "PCIE_REFCLK_N"), "LCD_CLK"),
    "usb-low": (("USB_LS_D+",), "USB_D+"),
    "usb-full": (("USB_FS_D-", "USBFS_DP"), "USB_D+"),
    "usb-high": (("USB_D+", "USB1-DM", "/usb/D-", "USB_OTG_DP"), "USB_ID"),
    "rgmii": (("RGMII_TXD0", "ETH0_RGMII_RXC", "GTXD3"), "RGMII_RST"),
    "rmii": (("RMII_TXD0", "ETH_REF_CLK", "TX_EN"), "ETH_RST"),
    "mdi": (("MDI[0]+", "MDI0_N", "TRD1_P", "ETH_TXP"), "MDIO"),
    "flash": (("SDIO_CLK", "QSPI_DQ0", "SD0_D3", "EMMC_CMD", "Net-(MICRO_SD1-Pad5)"), "SD_CD"),
    "sdram": (("SDRAM_D15",), "DRAM_ON"),
    "ddr4": (("DDR4_DQ3", "DDR4_A0"), "DDR4_VREF"),
    "ddr3": (("DDR3_DQS0_P", "DDR3_CAS"), "DDR3_VREF"),
    "ddr": (("DDR_DQ0", "DQS1_N", "/ram/DQ31"), "DDR_VREF"),
    "can": (("CAN_H", "CANL", "CAN2_P"), "CAN_STB"),
    "can-logic": (("CAN_TX", "CAN1_RXD", "FDCAN1_TX"), "CAN_EN"),
    "i2c": (("SDA", "I2C1_SCL", "/pmu/TWI0-SDA", "SMB_DAT"), "I2C_INT"),
    "jtag": (("TCK", "SWDIO", "JTAG_TDO"), "TDIP"),
    "spi": (("SPI1_MOSI", "SCK", "FLASH_CS", "ADC_SCLK"), "SPI_EN"),
    "uart": (("TX", "UART3_RX", "U2_TXD", "RXD", "Net-(DBG_UART1-Pad1)"), "RADIO_TX"),
    "clock": (("CLK50", "MCLK", "XTAL_IN", "/osc/24MHZ", "RTC_CLK", "AP-CK32KO"), "CLKREQ#"),
    "reset": (("NRST", "PCIE_PERST#", "/cpu/~{RESET}", "RST_N"), "FIRST"),
    "gpio": (("GPIO5", "FAN_PWM", "IRQ", "MDIO", "DSI-BKL"), "GPIO_P"),
    "switcher": (("Net-(U3-SW)", "BUCK_SW", "LX1"), "SW1"),
    "enable": (("EN", "RADIO_EN", "/power/EN_5V", "PWREN", "USB0-DRV"), "CLK_EN"),
    "power-good": (("PGOOD", "PG_1V8", "FE_PG"), "PG7"),
    "led": (("LED1", "STATUS_LED", "PWRLED"), "LED_DIN"),
    "strap": (("BOOT0", "BOARD_ID2", "PHYAD1"), "BOOT_CLK"),
    "analog": (("VBAT_SENSE", "NTC", "Net-(U3-FB)", "AIN3"), "ADC_SCLK"),
    "slow": (("SD_DET", "BUTTON1", "HPD", "CC1"), "DETECT_CLK"),
    "wide": ((), "WIDE"),  # by the width of lines alone: test_wide.py
    "default": (("D7", "MISC", "RADIO_TX", "LCD_EN"), "SDA"),
}


def _class(name: str) -> str:
    return class_of(name, shipped_rules())[0].name


def test_every_shipped_class_is_tried() -> None:
    """No class is without names that are of it and one that is not."""
    assert set(NAMES) == set(PACK)


@pytest.mark.parametrize("name", NAMES)
def test_names_are_of_their_class_and_others_much_like_them_are_not(name: str) -> None:
    """As the trade names nets (common practice, no source)."""
    ours, other = NAMES[name]
    assert {one: _class(one) for one in ours} == dict.fromkeys(ours, name)
    assert _class(other) != name


#: Rise time, ns, 10 to 90 %, and where from; "memory": from memory.
EDGES = {
    "rgmii": (0.5, "RGMII v2.0: at most 0.75 ns, 20 to 80 %"),
    "rmii": (1.0, "MPC8313E: 1 to 4 ns"),
    "usb-low": (75.0, "USB 2.0: 75 to 300 ns"),
    "usb-full": (4.0, "USB 2.0: 4 to 20 ns"),
    "usb-high": (0.5, "USB 2.0: at least 500 ps, memory"),
    "usb-super": (0.05, "0.125 UI of 200 ps is 25 ps at the pins, memory"),
    "pcie": (0.05, "0.15 UI is 30 ps at the pins, memory"),
    "hdmi": (0.1, "HDMI: at least 75 ps, 20 to 80 %"),
    "lvds": (0.3, "TIA-644-A: at least 260 ps"),
    "m-lvds": (1.0, "TIA-899: at least 1 ns"),
    "ddr3": (0.3, "JEDEC: 2.5 to 5 V/ns of 1.5 V"),
    "ddr4": (0.12, "JEDEC: 4 to 9 V/ns of 1.2 V"),
    "i2c": (20.0, "fast mode: 20 ns and more"),
    "can": (20.0, "tens of ns, memory"),
    "can-logic": (5.0, "2 to 10 ns, memory"),
    "spi": (2.0, "1 to 2 ns at the fast setting, memory"),
    "uart": (2.0, "as spi"),
    "gpio": (2.0, "as spi"),
    "flash": (1.0, "at most 1 to 3 ns, memory"),
    "mdi": (3.0, "100BASE-TX: 3 to 5 ns, memory"),
    "switcher": (5.0, "silicon 5 to 20 ns, memory"),
    "default": (1.0, "common practice, no source"),
}


@pytest.mark.parametrize("name", EDGES)
def test_edges_are_the_fast_limits_of_the_interfaces(name: str) -> None:
    """Against the standards and data sheets named beside each."""
    (found,) = [one for one in shipped_rules().classes if one.name == name]
    assert found.rise_ns == EDGES[name][0]
    assert not found.exempt


@pytest.mark.parametrize("name", PACK)
def test_every_number_of_the_pack_has_its_source(name: str) -> None:
    """A sentence of some words for each, and none for a number that is not there."""
    table = PACK[name]
    numbers = {key for key, value in table.items() if isinstance(value, int | float)}
    numbers -= {"exempt", "differential"}
    sources = table.get("source", {})
    assert set(sources) == numbers
    assert all(len(text) > 5 for text in sources.values())
    assert len(table["about"]) > 10
    assert table.get("exempt", False) == (not numbers)


def test_every_limit_has_its_source() -> None:
    """Of the other pack: by the dotted name of its key."""
    pack = tomllib.loads((rules_folder() / "limits.toml").read_text(encoding="utf-8"))
    keys = set()
    for key, value in pack.items():
        if key != "source":
            keys |= {f"{key}.{one}" for one in value} if isinstance(value, dict) else {key}
    assert set(pack["source"]) == keys


def test_thresholds_follow_the_wave_where_a_class_states_none() -> None:
    """6 and 2 % of the launched wave."""
    lvds = next(one for one in shipped_rules().classes if one.name == "lvds")
    assert (lvds.error_mv, lvds.warning_mv) == pytest.approx((0.06 * 350, 0.02 * 350))
    assert shipped_rules().default.error_mv == 100


_fast = st.sampled_from(["CLK", "SCK", "DATA", "D3", "SDA", "TX", "DQ1", "LCD", "XTAL1", "PWM"])
_asleep = st.sampled_from(["EN", "LED", "PG", "SENSE", "DET", "BOOT0", "BUTTON1"])


@given(st.lists(_asleep, min_size=1, max_size=2), _fast, st.randoms(use_true_random=False))
def test_no_name_with_a_clock_or_data_in_it_is_exempt(
    words: list[str], fast: str, order: object
) -> None:
    """To let a fast net go unseen is worse than to judge a slow one."""
    mixed = [*words, fast]
    order.shuffle(mixed)  # type: ignore[attr-defined]
    assert not class_of("_".join(mixed), shipped_rules())[0].exempt


@given(_asleep, st.sampled_from(["MISC", "CLK", "SDA", "USB_D+", "LED"]))
def test_nets_of_several_names_have_the_fastest_class(one: str, other: str) -> None:
    """And are exempt only if all names are; in any order, however they are joined."""
    alone = [class_of(name, shipped_rules())[0] for name in (one, other)]
    for joined in (f"{one}|{other}", f"{other}|/a/{one}", f"{one}\\{other}"):
        found = class_of(joined, shipped_rules())[0]
        assert found.exempt == all(name.exempt for name in alone)
        if not found.exempt:
            assert found.rise_ns == min(name.rise_ns for name in alone if not name.exempt)


def _board(*nets: str) -> Board:
    lines = tuple(Line(net, ((1, 1 + n), (9, 1 + n))) for n, net in enumerate(nets))
    return board(Sheet(lines=lines), Sheet((("GND", shapely.box(0, 0, 10, 10)),)))


def _known(text: str, *nets: str) -> Known:
    own = read_rules(text, "splitcheck.toml")
    return know(_board(*nets), rules_of(shipped_files(), own), own)


def _drives(known: Known, *nets: str) -> dict[str, tuple[str, float]]:
    made = _board(*nets)
    return {
        net.name: (known.drive_of(net.number).name, known.drive_of(net.number).rise_ns)
        for net in made.nets
        if net.name != "GND"
    }


def test_own_rules_go_before_names() -> None:
    """By the very name, by pattern, with a rise time of its own; the others by name."""
    nets = ("CAM_D0", "CAM_D1", "SDA", "MISC", "X")
    text = """
    [nets]
    "CAM_*" = "lvds"
    CAM_D1 = { class = "spi", rise_ns = 0.7 }
    sda = { rise_ns = 5 }
    [class.slowish]
    names = ["MIS*"]
    rise_ns = 9
    """
    assert _drives(_known(text, *nets), *nets) == {
        "CAM_D0": ("lvds", 0.3),
        "CAM_D1": ("spi", 0.7),
        "SDA": ("i2c", 5.0),
        "MISC": ("slowish", 9.0),
        "X": ("default", 1.0),
    }


def test_own_classes_change_what_they_state() -> None:
    """The rest of a class stays as it ships, and thresholds follow the wave."""
    known = _known("[class.i2c]\nwave_mv = 1000\n[class.new]\nlike = 'lvds'\nrise_ns = 2", "SDA")
    i2c, new = (
        next(one for one in known.rules.classes if one.name == name) for name in ("i2c", "new")
    )
    assert (i2c.rise_ns, i2c.wave_mv) == (20.0, 1000.0)
    assert i2c.error_mv == pytest.approx(60.0)
    assert (new.rise_ns, new.wave_mv, new.differential, new.words) == (2.0, 350.0, True, ())
    assert known.drive_of(0).wave_mv == 1000


def test_own_classes_are_asked_first() -> None:
    """A pattern of the board's own goes before one that ships."""
    known = _known("[class.aux]\nwords = ['CLK']\nrise_ns = 8", "CLK", "CLK2")
    assert _drives(known, "CLK", "CLK2") == {"CLK": ("aux", 8.0), "CLK2": ("clock", 1.0)}


def test_current_of_a_net_sets_its_wave_and_not_its_thresholds() -> None:
    """20 mA into 50 ohm are 1000 mV; what a class bears stays."""
    drive = _known("[nets]\nX = { current_ma = 20 }", "X").drive_of(0)
    assert (drive.wave_mv, drive.error_mv) == (1000.0, 100.0)


def test_exempt_nets_with_a_rise_time_of_their_own_are_judged() -> None:
    """Who knows the edge of a lamp wants it judged."""
    known = _known("[nets]\nLED1 = { rise_ns = 3 }", "LED1", "LED2")
    assert [known.drive_of(n).exempt for n in (0, 1)] == [False, True]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (
            '[nets]\n"SDX" = "spi"',
            "splitcheck.toml:2: 'SDX' matches no net of this board; did you mean 'SDA'",
        ),
        ('[nets]\n"Q*" = "spi"', "splitcheck.toml:2: 'Q*' matches no net of this board"),
        ('reference = ["SHIELD"]', "splitcheck.toml:1: 'SHIELD' matches no net of this board"),
        ("\n[class.x]\nwords = ['QQ']", "splitcheck.toml:3: 'QQ' matches no net of this board"),
        ("[class.spi]\nnames = ['Q?']", "splitcheck.toml:2: 'Q?' matches no net of this board"),
        ("[nets]\nSDA = 'spii'", "splitcheck.toml:2: there is no class 'spii'; did you mean spi"),
        ("[class.x]\nlike = 'y'", "splitcheck.toml:1: class x: there is no class 'y'"),
        (
            "[nets]\n'/io/SDA' = 'spi'\nSDA = 'uart'",
            "splitcheck.toml:3: the net '/io/SDA' is told something else in line 2; leave one",
        ),
        ("[[pair]]\nnets = ['SDA', 'SCX']", "splitcheck.toml:2: 'SCX' matches no net"),
        (
            "[[pair]]\nnets = ['SDA', 'SCL']\n[[pair]]\nnets = ['SCL', 'X']",
            "splitcheck.toml:4: the net 'SCL' is in another pair, splitcheck.toml:2",
        ),
        (
            'capacitors = ["C1"]',
            "splitcheck.toml:1: no component is called 'C1'; take it out: no file of this export",
        ),
    ],
)
def test_rules_that_do_not_fit_the_board(text: str, said: str) -> None:
    """File, line, what is wrong, what to do."""
    with pytest.raises(SplitcheckError) as caught:
        _known(text, "/io/SDA", "SCL", "X")
    assert str(caught.value).startswith(said)


def test_same_assignment_twice_is_no_contradiction() -> None:
    """Two ways to say one thing."""
    known = _known("[nets]\n'/io/SDA' = 'spi'\nSDA = 'spi'", "/io/SDA")
    assert known.drive_of(0).name == "spi"


def test_pairs_are_known_by_the_names_of_the_board() -> None:
    """Whatever the case and the path in the rules."""
    known = _known("[[pair]]\nnets = ['a_p', 'A_N']", "/rx/A_P", "/rx/A_N")
    assert known.rules.pairs == (("/rx/A_P", "/rx/A_N"),)


def test_references_are_nets_by_pattern() -> None:
    """Named by the rules, and no others."""
    known = _known("reference = ['PE*']", "PE", "PE2", "X")
    assert known.references == {0, 1}


def _classes(*names: str) -> dict[str, str]:
    """The classes of nets that a board has together."""
    lines = tuple(Line(name, ((0.0, float(y)), (30.0, float(y)))) for y, name in enumerate(names))
    made = board(Sheet(lines=lines), Sheet((("GND", shapely.box(0, 0, 30, 30)),)))
    known = know(made, shipped_rules())
    return {net.name: known.drive_of(net.number).name for net in made.nets if net.name in names}


def test_a_serial_clock_beside_its_data_line_is_of_the_two_wire_bus() -> None:
    """PMU_SCK with PMU_SDA is no SPI; without it, or with that of another bus, it is."""
    assert _classes("PMU_SCK", "PMU_SDA") == {"PMU_SCK": "i2c", "PMU_SDA": "i2c"}
    assert _classes("PMU_SCK", "RTC_SDA")["PMU_SCK"] == "spi"
    assert _classes("PMU_SCK", "PMU_MOSI")["PMU_SCK"] == "spi"


def test_memory_is_of_the_generation_that_other_names_tell() -> None:
    """DQ3 alone may be DDR4; beside VREF_DDR3 it is DDR3; where both are told it stays open."""
    assert _classes("DQ3")["DQ3"] == "ddr"
    assert _classes("DQ3", "VREF_DDR3")["DQ3"] == "ddr3"
    assert _classes("DQ3", "VPP_DDR4")["DQ3"] == "ddr4"
    assert _classes("DQ3", "VREF_DDR3", "VPP_DDR4")["DQ3"] == "ddr"


def test_names_of_parts_tell_classes_but_make_no_net_exempt() -> None:
    """A lamp's pin may be its supply or its data; designators of a few letters say nothing."""
    assert _class("Net-(HSIC1-Pad2)") == "usb-high"
    for name in ("Net-(PWRLED1-Pad2)", "Net-(FB1-Pad1)", "Net-(SCK-Pad1)"):
        assert _class(name) == "default"


def test_what_a_chip_calls_its_pin_says_nothing_of_its_use() -> None:
    """The other name tells; but a pin with a second use is not exempt for the first."""
    assert _class("PH8\\TOUCH-RST") == "reset"
    assert _class("PE17\\LED2") == "default"
    assert _class("LCD_D7\\TOUCH-RST") == "default"
