"""The stage drawn from its table: every stage of the catalogue, its mirror image, and one that is not in it."""

import pytest

from worksheet.stages import catalogue
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import GROUND, IN, LINE, OUT, Stage, Transistor
from worksheet.tui.drawing import Drawing
from worksheet.tui.rows import width
from worksheet.tui.signs import FULL, PLAIN

VALUES: dict[str, float | str | None] = {
    "gate_voltage": 1.2,
    "drain_voltage": 1.8,
    "source_voltage": 0.58,
    "inversion_coefficient": 0.167,
    "current": 4e-6,
    "region": "moderate",
}


def drawn(circuit: Circuit, *, plain: bool = False) -> list[str]:
    operating = {device.name: VALUES for device in circuit.devices}
    picture = Drawing(circuit, operating, load=1.2e-12, current=4e-6, supply=1.8)
    lines = picture.lines(PLAIN if plain else FULL)
    assert all(width(line) <= 34 for line in lines)
    return ["".join(span.text for span in line).rstrip() for line in lines]


def stage(key: str) -> Stage:
    found = catalogue.find(key)
    assert found is not None
    return found


def test_a_source_follower_reads_from_supply_to_ground() -> None:
    assert drawn(Circuit(stage("source-follower"), "n", ideal_bias=True)) == [
        "           V_DD 1.8 V",
        "          ┌──┘",
        "    in ───┤  main IC 0.167",
        "   1.2 V  └─▸┐ 4 µA moderate",
        "             ├─ out 580 mV",
        "             │  C_L 1.2 pF",
        "            (↓)  4 µA ideal",
        "             │",
        "           ground",
    ]


def test_its_p_channel_image_is_upside_down() -> None:
    picture = drawn(Circuit(stage("source-follower"), "p", ideal_bias=True))
    assert picture[0].strip().startswith("V_DD")
    assert picture[-1].strip() == "ground"
    assert picture.index("            (↓)  4 µA ideal") < next(k for k, line in enumerate(picture) if "main" in line)
    assert any("◂" in line for line in picture)
    assert not any("▸" in line for line in picture)


def test_a_cascode_shows_both_devices_their_current_source_and_the_node_between() -> None:
    picture = drawn(Circuit(stage("cascode"), "n", ideal_bias=False))
    names = [word for line in picture for word in line.split() if word in {"bias", "cascode", "main", "out", "fold"}]
    assert names == ["bias", "out", "cascode", "fold", "main"]


@pytest.mark.parametrize("key", catalogue.keys())
@pytest.mark.parametrize("polarity", ["n", "p"])
@pytest.mark.parametrize("ideal", [True, False])
def test_every_device_and_node_of_every_stage_is_drawn(key: str, polarity: str, ideal: bool) -> None:
    circuit = Circuit(stage(key), polarity, ideal_bias=ideal)
    text = "\n".join(drawn(circuit))
    wanted = {device.name for device in circuit.devices} | set(circuit.stage.internal_nodes) | {"out", "in", "C_L"}
    assert [name for name in wanted if name not in text.split() and f"{name} " not in text] == []
    assert ("ideal" in text) is ideal


def test_only_ascii_where_nothing_else_can_be_shown() -> None:
    for key in (one.key for one in catalogue.stages()):
        assert all(line.isascii() for line in drawn(Circuit(stage(key), "n", ideal_bias=False), plain=True))


def test_a_sixth_stage_draws_too() -> None:
    """Three devices in one stack: nothing in the drawing knows the stages by name."""
    triple = Stage(
        key="triple",
        title="Triple",
        purpose="A test of the drawing.",
        transistors=(
            Transistor("main", gate=IN, drain="low", source=GROUND),
            Transistor("middle", gate=LINE, drain="high", source="low"),
            Transistor("top", gate=LINE, drain=OUT, source="high"),
        ),
        levels=("output_level",),
    )
    text = "\n".join(drawn(Circuit(triple, "n", ideal_bias=True)))
    places = [text.index(name) for name in ("out", "top", "high", "middle", "low", "main", "ground")]
    assert places == sorted(places)
