"""Handbook values of noise and settling, met by whole sheets.

Sources: kT/C and settling in time constants are common practice; the noise bandwidths stand in T. Sobering, "Equivalent
noise bandwidth", technote 1; N ln 2 is printed in a converter pocket reference (TI SLYW038); the noise efficiency
factor is that of M. Steyaert and W. Sansen, 1987, and its value 4.0 for 2.2 uV rms, 7.2 kHz and 16 uA that of
R. Harrison and C. Charles, 2003.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from tests.published.bench import BOLTZMANN, ELEMENTARY_CHARGE, metric, point, solved

EFFICIENCY = "v_noise*sqrt(2*i_total/(pi*u_t*4*k_b*temperature*bandwidth_seen))"


@pytest.mark.parametrize(("load", "microvolts"), [(10e-15, 643.6), (1e-12, 64.36), (10e-12, 20.35)])
def test_thermal_noise_of_a_capacitor(tmp_path: Path, load: float, microvolts: float) -> None:
    """sqrt(kT/C) at 300 K. Two equal devices in weak inversion, each with 2 q I, on the node of a follower make it up:
    4 q I U_T/(4 I C) = kT/C.
    """
    sheet = solved(
        tmp_path,
        "source-follower",
        {
            "bias_current": 1e-9,
            "width": 1e-4,
            "length": 1e-6,
            "bias_width": 1e-4,
            "bias_length": 1e-6,
            "load_capacitance": load,
        },
        bias={"device": "nfet"},
        device={"gate_capacitance": 1e-12},
        temperature=300.0,
    )
    assert point(sheet, "inversion_coefficient") < 1e-4
    assert metric(sheet, "output_noise") == pytest.approx(microvolts * 1e-6, rel=5e-4)


def test_noise_bandwidth_of_one_pole(tmp_path: Path) -> None:
    """1.5708 times the 3-dB bandwidth."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 1e-6, "width": 1e-5, "length": 1e-6},
        bias={"device": "ideal", "output_conductance": 1e-7},
    )
    assert noise_bandwidth(sheet) / metric(sheet, "bandwidth") == pytest.approx(1.5708, rel=1e-5)


def noise_bandwidth(sheet: dict[str, object]) -> float:
    """Of white noise at the input, from what the sheet says."""
    return (metric(sheet, "input_noise") / metric(sheet, "noise_density")) ** 2


def test_noise_bandwidth_of_two_equal_poles(tmp_path: Path) -> None:
    """1.2203 times the 3-dB bandwidth.

    The noisy drive resistance and the gate make the one pole, the output the other.
    """
    gate_capacitance = {"gate_capacitance": 1e-3, "kappa": 1.0}
    choose = {"bias_current": 1e-6, "width": 1e-5, "length": 1e-6}
    bias = {"device": "ideal", "output_conductance": 1e-7}
    (tmp_path / "alone").mkdir()
    alone = solved(tmp_path / "alone", "common-source", choose, bias=bias, device=gate_capacitance)
    entry = metric(alone, "input_capacitance")
    pole = 2 * math.pi * metric(alone, "pole_frequency")
    resistance = 1 / (pole * entry)
    assert resistance * 4 * BOLTZMANN * 300 > 2000 * metric(alone, "noise_density") ** 2
    (tmp_path / "driven").mkdir()
    driven = solved(
        tmp_path / "driven",
        "common-source",
        choose,
        bias=bias,
        device=gate_capacitance,
        assume={"drive_resistance": resistance},
    )
    assert metric(driven, "bandwidth") / metric(driven, "pole_frequency") == pytest.approx(0.6436, rel=1e-3)
    assert noise_bandwidth(driven) / metric(driven, "bandwidth") == pytest.approx(1.2203, rel=1e-3)


@pytest.mark.parametrize(
    ("tolerance", "constants"),
    [
        (1e-2, 4.605),
        (1e-3, 6.908),
        (1e-4, 9.210),
        (2.0**-8, 5.545),  # the pocket reference prints 5.5
        (2.0**-10, 6.93),
        (2.0**-12, 8.32),
        (2.0**-11, 11 * math.log(2)),  # half an LSB of 10 bit: (N + 1) ln 2
    ],
)
def test_settling_in_time_constants(tmp_path: Path, tolerance: float, constants: float) -> None:
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 1e-6, "width": 1e-5, "length": 1e-6},
        bias={"device": "ideal", "output_conductance": 1e-7},
        assume={"settling_tolerance": tolerance},
    )
    tau = 1 / (2 * math.pi * metric(sheet, "pole_frequency"))
    assert metric(sheet, "settling_time") / tau == pytest.approx(constants, abs=0.006)


def test_noise_efficiency_of_one_device_in_weak_inversion(tmp_path: Path) -> None:
    """1/(sqrt(2) kappa) for one device alone (this model's); sqrt(2)/kappa = 2.02 at kappa 0.7 for a differential pair
    (from memory): twice the noise power and twice the current of the one device.
    """
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 1e-8, "width": 1e-3, "length": 1e-6},
        bias={"device": "ideal", "output_conductance": 1e-9},
        device={"kappa": 0.7, "gate_capacitance": 1e-12},
        own={"u_t": BOLTZMANN * 300 / ELEMENTARY_CHARGE, "k_b": BOLTZMANN},
        targets={
            "noise_efficiency": {
                "formula": "input_noise*sqrt(2*supply_current/(pi*u_t*4*k_b*temperature*bandwidth))",
                "max": 2.0,
                "unit": "",
            }
        },
    )
    (target,) = sheet["targets"]
    assert target["verdict"] == "met"
    assert target["nominal"] == pytest.approx(1 / (math.sqrt(2) * 0.7), rel=1e-3)
    assert 2 * target["nominal"] == pytest.approx(2.02, rel=2e-3)


def test_noise_efficiency_of_a_published_amplifier(tmp_path: Path) -> None:
    """2.2 uV rms, 7.2 kHz, 16 uA: 4.0. A figure of the sheet's own over the published numbers."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": 1e-6, "width": 1e-5, "length": 1e-6},
        bias={"device": "ideal", "output_conductance": 1e-7},
        own={
            "v_noise": 2.2e-6,
            "i_total": 16e-6,
            "bandwidth_seen": 7.2e3,
            "u_t": BOLTZMANN * 300 / ELEMENTARY_CHARGE,
            "k_b": BOLTZMANN,
        },
        targets={"noise_efficiency": {"formula": EFFICIENCY, "max": 4.1, "unit": ""}},
    )
    (target,) = sheet["targets"]
    assert target["nominal"] == pytest.approx(4.0, abs=0.05)


@pytest.mark.parametrize("current", ["4 uA", "4 µA", "4 μA", "0.004 mA", "4000 nA", "4e6 pA", "4e-6 A"])
def test_prefixes_scale_as_the_si_brochure_says(tmp_path: Path, current: str) -> None:
    """SI brochure, ISO/IEC 80000: prefixes and their symbols."""
    sheet = solved(
        tmp_path,
        "common-source",
        {"bias_current": current, "width": 1e-5, "length": 1e-6},
        bias={"device": "ideal", "output_conductance": 1e-7},
    )
    assert sheet["choose"]["bias_current"]["value"] == 4e-6
