"""Worked designs in print, put into a sheet and reviewed.

Sources: C. Enz, "Improved voltage followers", design report, 2026 (generic 180 nm n-channel, U_T 25.875 mV); C. Enz,
"Cascode gain stage", design report, 2025 (IHP 130 nm set, U_T 25.865 mV). 0.2 % covers the rounding in print.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.published.bench import metric, point, solved, temperature_of

PRINTED = 2e-3

FOLLOWER = {
    "kappa": 1 / 1.27136,
    "specific_current": 715e-9,
    "length_modulation": 1 / 13e6,  # V_M = 13 V/um
}
CASCODE = {"kappa": 1 / 1.22, "specific_current": 708.3e-9}
CASCODE_SHRINK = 58.8e-9
CASCODE_GROWTH = 20e-9


def test_follower_for_1_mhz_into_10_pf(tmp_path: Path) -> None:
    """IC 1, L 1 um: I 3.344 uA and W/L 4.677 give g_m 62.832 uA/V and g_ds 257.26 nA/V.

    With a sink of 438.29 nA/V the gain is 0.989 and the output resistance 15.741 kohm.
    """
    sheet = solved(
        tmp_path,
        "source-follower",
        {"bias_current": 3.344e-6, "width": 4.677e-6, "length": 1e-6, "load_capacitance": 10e-12},
        bias={"device": "ideal", "output_conductance": 438.29e-9},
        bulk="source",
        device=FOLLOWER,
        temperature=temperature_of(25.875e-3),
        supply=3.0,
    )
    assert point(sheet, "inversion_coefficient") == pytest.approx(1.0, rel=PRINTED)
    assert point(sheet, "transconductance") == pytest.approx(62.832e-6, rel=PRINTED)
    assert point(sheet, "drain_conductance") == pytest.approx(257.26e-9, rel=PRINTED)
    assert metric(sheet, "dc_gain") == pytest.approx(0.989, abs=0.0005)
    assert metric(sheet, "output_resistance") == pytest.approx(15.741e3, rel=PRINTED)
    # The report's bandwidth is g_m/(2 pi C); the pole also carries g_ds and the sink.
    share = 62.832 / (62.832 + 0.25726 + 0.43829)
    assert metric(sheet, "bandwidth") * share == pytest.approx(1e6, rel=PRINTED)


def test_follower_of_50_ohm(tmp_path: Path) -> None:
    """R_out 50 ohm at IC 100 needs 6.916 mA (output conductances neglected there)."""
    device = {key: value for key, value in FOLLOWER.items() if key != "length_modulation"}
    ratio = 6.916e-3 / (715e-9 * 100)
    sheet = solved(
        tmp_path,
        "source-follower",
        {"bias_current": 6.916e-3, "width": ratio * 1e-6, "length": 1e-6},
        bulk="source",
        device=device,
        temperature=temperature_of(25.875e-3),
    )
    assert point(sheet, "inversion_coefficient") == pytest.approx(100, rel=1e-9)
    assert metric(sheet, "output_resistance") == pytest.approx(50.0, rel=PRINTED)


def effective(width: float, length: float) -> dict[str, float]:
    """W_eff = W + 20 nm, L_eff = L - 58.8 nm."""
    return {"width": width + CASCODE_GROWTH, "length": length - CASCODE_SHRINK}


@pytest.mark.parametrize(
    ("width", "specific_current", "inversion", "source_conductance"),
    [(0.88e-6, 3335e-9, 0.075, 9.033e-6), (4.40e-6, 16378e-9, 0.015, 9.522e-6)],
    ids=["M1", "M2"],
)
def test_devices_of_the_cascode(
    tmp_path: Path, width: float, specific_current: float, inversion: float, source_conductance: float
) -> None:
    """M1 0.88/0.25 um and M2 4.40/0.25 um at 250 nA."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 250e-9} | effective(width, 0.25e-6),
        bias={"device": "ideal", "output_conductance": 1e-9},
        device=CASCODE,
        temperature=temperature_of(25.865e-3),
    )
    assert point(sheet, "specific_current") == pytest.approx(specific_current, rel=PRINTED)
    assert point(sheet, "inversion_coefficient") == pytest.approx(inversion, rel=0.02)  # printed to two digits
    assert point(sheet, "source_conductance") == pytest.approx(source_conductance, rel=PRINTED)
    assert point(sheet, "transconductance") == pytest.approx(source_conductance / 1.22, rel=PRINTED)


def test_drain_conductance_of_the_first_device(tmp_path: Path) -> None:
    """M1: g_ms 9.033, g_m 7.404 uA/V and g_ds 727.3 nA/V, which is sigma g_s here."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 250e-9} | effective(0.88e-6, 0.25e-6),
        device=CASCODE | {"drain_coupling": 727.3 / 9033, "drain_coupling_length": 0.25e-6 - CASCODE_SHRINK},
        temperature=temperature_of(25.865e-3),
    )
    assert point(sheet, "transconductance") == pytest.approx(7.404e-6, rel=PRINTED)
    assert point(sheet, "drain_conductance") == pytest.approx(727.3e-9, rel=PRINTED)
    assert metric(sheet, "dc_gain") == pytest.approx(7404 / 727.3, rel=PRINTED)


def test_output_resistance_of_the_cascode(tmp_path: Path) -> None:
    """From g_ms2 8.362 uA/V, g_ds1 520.2 and g_ds2 638.1 nA/V: 28.7 Mohm.

    The report's g_ms does not hold the drain-source conductance, ours is the whole slope at the source: g_s2 is
    8.362 uA/V + 638.1 nA/V here. Sizes are those that give these slopes at 250 nA.
    """
    thermal, current = 25.865e-3, 250e-9
    source_2 = 8.362e-6 + 638.1e-9
    slope = source_2 * thermal / current
    inversion = (1 - slope) / slope**2
    source_1 = current * 0.934 / thermal
    inversion_1 = (1 - 0.934) / 0.934**2
    long = 2 * (520.2e-9 / source_1) / (638.1e-9 / source_2)
    length_2 = 0.25e-6
    length_1 = 2 * length_2 / long
    sheet = solved(
        tmp_path,
        "cascode",
        {
            "bias_current": current,
            "length": length_1,
            "width": current / (708.3e-9 * inversion_1) * length_1,
            "cascode_length": length_2,
            "cascode_width": current / (708.3e-9 * inversion) * length_2,
        },
        device=CASCODE | {"drain_coupling": 638.1e-9 / source_2, "drain_coupling_length": length_2},
        temperature=temperature_of(thermal),
    )
    assert point(sheet, "drain_conductance", "main") == pytest.approx(520.2e-9, rel=PRINTED)
    assert point(sheet, "drain_conductance", "cascode") == pytest.approx(638.1e-9, rel=PRINTED)
    assert metric(sheet, "output_resistance") == pytest.approx(28.7e6, rel=PRINTED)


def test_least_current_for_1_mhz_into_1_pf(tmp_path: Path) -> None:
    """Weak inversion, n 1.22: 198 nA for a gain-bandwidth of 1 MHz."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 198e-9, "width": 2e-3, "length": 1e-6, "load_capacitance": 1e-12},
        bias={"device": "ideal", "output_conductance": 1e-9},
        device=CASCODE | {"gate_capacitance": 1e-12},
        temperature=temperature_of(25.865e-3),
    )
    assert metric(sheet, "unity_gain_frequency") == pytest.approx(1e6, rel=2.5e-3)  # 198 is printed to three digits
