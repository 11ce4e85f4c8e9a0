"""One small report, made by hand, that every way of showing results is tested on."""

from __future__ import annotations

from dataclasses import replace

from splitcheck.verdict.findings import (
    BridgeUse,
    ClassRow,
    Count,
    Finding,
    GapShare,
    InputRow,
    IslandRow,
    LayerRow,
    Leg,
    NetRow,
    PairRow,
    Report,
    Source,
    WaiverRow,
)


def finding(number: int, net: str, **changes: object) -> Finding:
    """A slot crossing of the pump board; every field can be changed."""
    plain = Finding(
        id=f"F{number}",
        kind="slot-crossing",
        level="error",
        net=net,
        net_class="",
        layer="Top",
        plane_layer="Inner 1",
        plane_net="GND",
        at_mm=(12.3, 45.1),
        gap_mm=1.2,
        detour_mm=34.5,
        added_nh=3.2145,
        error_nh=0.643,
        method="estimated",
        noise_mv=128.604,
        rise_ns=1.0,
        corner_khz=None,
        stray_db=None,
        islands=("I1", "I1"),
        bridges=(),
        gap="G1",
        shares_gap_with=(),
        pair=None,
        source=Source("pump-top.gbr", 118),
        waived=None,
        fingerprint=f"{number:08x}",
        reason="A slot 35 mm long cuts Inner 1 under the trace; the return goes round its end.",
    )
    return replace(plain, **changes)  # type: ignore[arg-type]  # the names are the caller's


def _leg(row: Finding) -> Leg:
    """The only step of a net's way: its finding."""
    planes = (row.plane_layer,) if row.plane_layer else ()
    nets = (row.plane_net,) if row.plane_layer else ()
    return Leg("finding", row.layer, planes, nets, 41.25, (1.0, 2.0), row.added_nh, row.id)


def pump() -> Report:
    """A four-layer board: a bus of four over one slot, a split, and a corner without plane."""
    bus = tuple(
        finding(
            place,
            f"BUS{place - 1}",
            level="error" if place < 3 else "warning",
            added_nh=3.2145 / place,
            noise_mv=128.604 / place,
            at_mm=(12.3, 45.1 + place),
            shares_gap_with=tuple(
                GapShare(f"BUS{other}", None) for other in range(4) if other != place - 1
            ),
        )
        for place in range(1, 5)
    )
    split = finding(
        5,
        "MOTOR_EN",
        kind="split-crossing",
        level="warning",
        layer="Bottom",
        plane_layer="Inner 2",
        plane_net="3V3",
        at_mm=(-0.00001, 7.0),
        gap_mm=0.3,
        detour_mm=None,
        added_nh=None,
        error_nh=None,
        method="none",
        noise_mv=None,
        islands=("I2", "I3"),
        bridges=(BridgeUse("via", (3.0, 4.0), "GND"),),
        gap="G2",
        reason="Nothing joins the islands 3V3 and 5V: the return has no way back in copper.",
    )
    corner = finding(
        6,
        "LED",
        kind="no-plane",
        level="note",
        plane_layer="",
        plane_net="",
        at_mm=(70.0, 50.0),
        gap_mm=22.75,
        detour_mm=None,
        added_nh=None,
        error_nh=None,
        method="none",
        noise_mv=None,
        islands=(),
        gap="G3",
        reason="No layer has reference copper under 22.75 mm of the trace.",
    )
    findings = (*bus, split, corner)
    nets = tuple(
        NetRow(row.net, "", 41.25, (row.layer,), 1, row.added_nh, (_leg(row),), row.added_nh)
        for row in findings
    )
    return Report(
        board="pump",
        size_mm=(80.0, 60.0),
        layers=(
            LayerRow("Top", "pump-top.gbr", 1, 1.6, 35.0, "signal"),
            LayerRow("Inner 1", "pump-in1.gbr", 2, 1.4, 17.5, "plane"),
            LayerRow("Inner 2", "pump-in2.gbr", 3, 0.2, 17.5, "plane"),
            LayerRow("Bottom", "pump-bottom.gbr", 4, 0.0, 35.0, "mixed"),
        ),
        assumptions=(
            (
                "The job file gives no thickness for the core between Inner 1 and Inner 2; "
                "1.2 mm is assumed from the total of 1.6 mm."
            ),
            "Every net is judged at a rise time of 1 ns.",
        ),
        remarks=("pump-top.gbr:7: G54 is deprecated",),
        facts=("118 of 120 plated holes land on copper of two layers or more.",),
        inputs=(
            InputRow("pump-bottom.gbr", "copper", "b" * 64, "its attributes say layer 4, bottom"),
            InputRow("pump-in1.gbr", "copper", "c" * 64, "its attributes say layer 2, inner"),
            InputRow("pump-in2.gbr", "copper", "d" * 64, "its attributes say layer 3, inner"),
            InputRow("pump-top.gbr", "copper", "a" * 64, "its attributes say layer 1, top"),
            InputRow("pump.drl", "drill", "e" * 64, "its name ends in .drl"),
        ),
        islands=(
            IslandRow("I1", "Inner 1", "GND", 4712.34567),
            IslandRow("I2", "Inner 2", "3V3", 2100.0),
            IslandRow("I3", "Inner 2", "5V", 2411.5),
        ),
        nets=tuple(sorted(nets, key=lambda net: net.name)),
        findings=findings,
        counts=(Count("nets exempt: they are reference copper", 3),),
        seconds=(("read", 0.5), ("cross", 0.25)),
        classes=(ClassRow("default", 6, 1.0, 1650.0, 50.0, 100.0, 33.0, False, "common practice"),),
        pairs=(PairRow(("BUS0", "BUS1"), "name", 0.35, 38.5),),
        waivers=(
            WaiverRow("bring-up only", "2031-01-31", 0, "unmatched", Source("splitcheck.toml", 9)),
        ),
        corner_mm=(0.0, 0.0),
    )
