"""Every key of [fitted.NAME] of a process file, once: where the fit of a device holds, and what it was made from."""

from __future__ import annotations

from worksheet.model import dimension as dim
from worksheet.model.keys import Key, Kind, Table

FITTED_KEYS = (
    Key(
        "inversion_low",
        "Lowest inversion",
        "Inversion coefficient from which on the fit of this device may be trusted.",
        dimension=dim.NUMBER,
        low_open=True,
        example="0.001",
        moves_results=False,
    ),
    Key(
        "inversion_high",
        "Highest inversion",
        "Inversion coefficient up to which the fit of this device may be trusted.",
        dimension=dim.NUMBER,
        low_open=True,
        example="30",
        moves_results=False,
    ),
    Key(
        "length_low",
        "Shortest length fitted",
        "Least channel length that the fit of this device covers.",
        dimension=dim.LENGTH,
        low_open=True,
        example="0.18 um",
        moves_results=False,
    ),
    Key(
        "length_high",
        "Longest length fitted",
        "Greatest channel length that the fit of this device covers.",
        dimension=dim.LENGTH,
        low_open=True,
        example="10 um",
        moves_results=False,
    ),
    Key(
        "source_voltage_high",
        "Highest source voltage fitted",
        "Greatest source-bulk voltage that the fit of this device covers.",
        dimension=dim.VOLTAGE,
        low=None,
        example="1.2 V",
        moves_results=False,
    ),
    Key(
        "drain_voltage_high",
        "Highest drain voltage fitted",
        "Greatest drain-source voltage that the fit of this device covers.",
        dimension=dim.VOLTAGE,
        low=None,
        example="1.2 V",
        moves_results=False,
    ),
    Key(
        "temperature_low",
        "Coldest fitted",
        "Lowest temperature that the fit of this device covers.",
        dimension=dim.TEMPERATURE,
        example="-40 °C",
        moves_results=False,
    ),
    Key(
        "temperature_high",
        "Hottest fitted",
        "Highest temperature that the fit of this device covers.",
        dimension=dim.TEMPERATURE,
        example="125 °C",
        moves_results=False,
    ),
    Key(
        "rms_log_error",
        "Error of the fit",
        "Root mean square of the logarithm of fitted over measured current, over the rows that were used.",
        dimension=dim.NUMBER,
        example="0.04",
        moves_results=False,
    ),
    Key("dated", "Date of the fit", "The day this device was fitted.", Kind.DATE, moves_results=False),
    Key("files", "Tables fitted", "The tables of currents this device was fitted to.", Kind.TEXT, moves_results=False),
    Key(
        "digest",
        "Digest of the tables",
        "SHA-256 of each table fitted, so that another version of it is noticed.",
        Kind.TEXT,
        moves_results=False,
    ),
)

FITTED = Table(
    "fitted",
    "Where the fit of a device holds; sheets that use it beyond are told. Written by `biasbook extract --into`.",
    keys=FITTED_KEYS,
)
