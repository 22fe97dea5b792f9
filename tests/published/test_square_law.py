"""Square-law textbooks as the limit of the all-region model at a few kelvin.

At the same n and beta the thermal voltage falls with temperature, so that every current is strong inversion: textbook
numbers must come out to 1 %. I_sq = 2 n beta' U_T^2 with n 1 carries the textbook's k' = mu C_ox over.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest

from tests.published.bench import BOLTZMANN, ELEMENTARY_CHARGE, metric, point, solved

KELVIN = 3.0
SQUARE_LAW = 1e-2


def per_square(transconductance_parameter: float) -> float:
    """I_sq at 3 K of a textbook k' = mu C_ox, n = 1. [A]"""
    return 2 * transconductance_parameter * (BOLTZMANN * KELVIN / ELEMENTARY_CHARGE) ** 2


def sedra_and_smith(folder: Path) -> dict[str, Any]:
    """Common source with a current-source load: k'n 200 uA/V^2, W/L 10, I 100 uA, Early voltages 20 V and 10 V."""
    device = {"specific_current": per_square(200e-6), "length_modulation": 1e-6 / 20}
    return solved(
        folder,
        "common-source",
        {"bias_current": 100e-6, "width": 10e-6, "length": 1e-6, "bias_width": 10e-6, "bias_length": 1e-6},
        bias={"device": "pfet"},
        device=device,
        bias_device=device | {"length_modulation": 1e-6 / 10},
        temperature=KELVIN,
        supply=5.0,
    )


def test_common_source_with_a_current_source_load(tmp_path: Path) -> None:
    """Sedra and Smith, Microelectronic Circuits (from memory): g_m 0.63 mA/V, gain -42 V/V."""
    sheet = sedra_and_smith(tmp_path)
    assert sheet["operating_point"]["main"]["region"] == "strong"
    assert point(sheet, "transconductance") == pytest.approx(0.63e-3, rel=SQUARE_LAW)
    assert metric(sheet, "dc_gain") == pytest.approx(42, rel=SQUARE_LAW)
    assert metric(sheet, "output_resistance") == pytest.approx(1 / (1 / 200e3 + 1 / 100e3), rel=SQUARE_LAW)


def test_overdrive_is_that_of_the_square_law(tmp_path: Path) -> None:
    """I = k'/2 W/L V_ov^2 (any textbook): 0.316 V, and the gate stands that much above threshold."""
    sheet = sedra_and_smith(tmp_path)
    overdrive = math.sqrt(2 * 100e-6 / (200e-6 * 10))
    assert point(sheet, "gate_source_voltage") - 0.4 == pytest.approx(overdrive, rel=SQUARE_LAW)
    assert point(sheet, "saturation_voltage") == pytest.approx(overdrive, rel=SQUARE_LAW)


def test_mirror_moves_by_5_percent_per_volt(tmp_path: Path) -> None:
    """Sedra and Smith, current mirror (from memory): V_A' 20 V/um at 1 um, output current changes 5 % per volt."""
    device = {"specific_current": per_square(200e-6), "length_modulation": 1 / 20e6}
    sheet = solved(
        tmp_path,
        "source-follower",
        {"bias_current": 100e-6, "width": 10e-6, "length": 1e-6, "bias_width": 10e-6, "bias_length": 1e-6},
        bias={"device": "nfet"},
        device=device,
        temperature=KELVIN,
        supply=5.0,
    )
    change = point(sheet, "drain_conductance", "bias") / point(sheet, "current", "bias")
    assert change == pytest.approx(0.05, rel=SQUARE_LAW)


def test_intrinsic_gain_of_a_50_by_half_micron_device(tmp_path: Path) -> None:
    """Razavi, Design of Analog CMOS Integrated Circuits (parameters read, answer computed).

    50/0.5, 0.5 mA, mobility 350 cm^2/Vs, t_ox 9 nm, lambda 0.1/V: g_m 3.66 mA/V, r_o 20 kohm, intrinsic gain 73.3.
    """
    oxide = 3.9 * 8.854e-12 / 9e-9
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 0.5e-3, "width": 50e-6, "length": 0.5e-6},
        device={"specific_current": per_square(350e-4 * oxide), "length_modulation": 0.1 * 0.5e-6},
        temperature=KELVIN,
        supply=5.0,
    )
    assert point(sheet, "transconductance") == pytest.approx(3.66e-3, rel=SQUARE_LAW)
    assert metric(sheet, "output_resistance") == pytest.approx(20e3, rel=SQUARE_LAW)
    assert metric(sheet, "dc_gain") == pytest.approx(73.3, rel=SQUARE_LAW)


@pytest.mark.parametrize(("oxide_nanometres", "per_area"), [(4.09, 8.443e-3), (2.2404, 15.413e-3)])
def test_gate_source_capacitance_is_two_thirds_of_the_oxide(
    tmp_path: Path, oxide_nanometres: float, per_area: float
) -> None:
    """Two thirds of W L C_ox in strong inversion (any textbook), with the oxides of two open process tables:
    4.09 nm gives 8.443 fF/um^2 and 2.2404 nm 15.413, with 3.9 times 8.854 pF/m (open PDK documentation, Apache 2.0).
    """
    assert 3.9 * 8.854e-12 / (oxide_nanometres * 1e-9) == pytest.approx(per_area, rel=1e-4)
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 100e-6, "width": 10e-6, "length": 1e-6},
        device={"specific_current": per_square(200e-6), "gate_capacitance": per_area, "length_modulation": 1e-7},
        temperature=KELVIN,
        supply=5.0,
    )
    assert point(sheet, "gate_source_capacitance") == pytest.approx(2 / 3 * per_area * 1e-11, rel=SQUARE_LAW)
