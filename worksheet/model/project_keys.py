"""Every key of biasbook.toml, once."""

from __future__ import annotations

from dataclasses import replace

from worksheet.model import dimension as dim
from worksheet.model.keys import Key, Kind, Table
from worksheet.model.shared_keys import SETTLING_TOLERANCE, TARGET_KEYS

PROCESS_CORNER = Key(
    "process",
    "Corner",
    'A corner of the process file; "typical" always exists.',
    Kind.NAME,
    listed=True,
    required=True,
    example="typical",
)
TEMPERATURE = Key(
    "temperature",
    "Temperature",
    "Junction temperature of the chip.",
    dimension=dim.TEMPERATURE,
    symbol="T",
    low_open=True,
    listed=True,
    required=True,
    example="27 °C",
)
SUPPLY = Key(
    "supply",
    "Supply voltage",
    "Supply of the block, from ground. Stay within the rating; the foundry's reliability rules have the last word.",
    dimension=dim.VOLTAGE,
    symbol="V_DD",
    low_open=True,
    listed=True,
    required=True,
    example="1.8 V",
)

CONDITION = Table("at", "One condition.", keys=(PROCESS_CORNER, TEMPERATURE, SUPPLY))
"""One condition as an inline table (nominal, evidence at, ...); each key holds one value there."""

CHAIN_METRICS = (
    "dc_gain",
    "bandwidth",
    "output_noise",
    "input_noise",
    "settling_time",
    "supply_current",
    "power",
    "gate_area",
)
"""Metrics that a chain of sheets has as well, under the same key and in the same unit."""

CHAIN = Table(
    "chain",
    "Signal paths through several sheets, each with what it must achieve as a whole.",
    entry=Table(
        "",
        "One chain.",
        keys=(
            Key("title", "Title", "What the path is, for people.", Kind.TEXT, moves_results=False),
            Key(
                "sheets",
                "Sheets",
                "The sheets along the path, in the order of the signal; a sheet at most as often as its count says.",
                Kind.NAME,
                listed=True,
                required=True,
                moves_results=False,
                example='["element_buffer", "line_driver"]',
            ),
            replace(
                SETTLING_TOLERANCE,
                help="Share of the final change within which the end of the path counts as settled.",
                annotated=False,
                formula=False,
                moves_results=False,
            ),
        ),
        entry=Table(
            "",
            "A limit on what the whole path achieves.",
            keys=tuple(key for key in TARGET_KEYS if key.name not in ("formula", "unit", "yield")),
        ),
        names=f"one of {', '.join(CHAIN_METRICS)}",
    ),
    names="a name of your own",
)

PROJECT = Table(
    "",
    "A project: a folder of sheets over one process.",
    keys=(
        Key(
            "schema",
            "Schema",
            "Version of the file format.",
            Kind.WHOLE,
            low=1.0,
            high=1.0,
            required=True,
            example="1",
            moves_results=False,
        ),
        Key(
            "title",
            "Title",
            "What the project is, for people.",
            Kind.TEXT,
            moves_results=False,
            example="Tide gauge readout",
        ),
        Key("owner", "Owner", "Who answers for the project.", Kind.TEXT, moves_results=False),
        Key(
            "process",
            "Process file",
            "Name of the process file: process/NAME.toml.",
            Kind.NAME,
            required=True,
            example="example_180",
        ),
    ),
    tables=(
        Table(
            "conditions",
            "Every combination of these is reviewed, and the nominal with it.",
            keys=(
                PROCESS_CORNER,
                TEMPERATURE,
                SUPPLY,
                Key(
                    "nominal",
                    "Nominal",
                    "The condition at which nominal values are stated.",
                    Kind.CONDITION,
                    required=True,
                    example='{ process = "typical", temperature = "27 °C", supply = "1.8 V" }',
                ),
            ),
            required=True,
        ),
        Table(
            "budget",
            "Sums over all sheets, each times its count.",
            entry=Key(
                "budget", "Budget", "The most that all sheets together may take.", Kind.LIMIT, moves_results=False
            ),
            names="a metric that adds up over sheets",
        ),
        Table(
            "requirement",
            "What the specification asks of the chip, by number: one that no target's id names is listed in reviews.",
            entry=Key(
                "requirement",
                "Requirement",
                "What is required, in words; a target covers it by carrying its number as id.",
                Kind.TEXT,
                moves_results=False,
                example="Bandwidth of the element buffer",
            ),
            names="the number of a requirement",
        ),
        CHAIN,
    ),
)
"""The whole project file."""
