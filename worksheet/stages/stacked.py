"""Stages of several stacked transistors that share one current."""

from __future__ import annotations

from worksheet.stages.stage import GROUND, IN, LINE, OUT, Stage, Transistor

CASCODE = Stage(
    key="cascode",
    title="Cascode",
    purpose="Amplify a voltage with more gain than a common source: a common gate holds the main device's drain still.",
    transistors=(
        Transistor("main", gate=IN, drain="fold", source=GROUND),
        Transistor("cascode", gate=LINE, drain=OUT, source="fold"),
    ),
    levels=("output_level",),
)
