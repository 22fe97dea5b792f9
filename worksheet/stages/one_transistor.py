"""The four stages of one transistor and a current source: hold two terminals, drive one, watch one."""

from __future__ import annotations

from worksheet.stages.stage import GROUND, IN, LINE, OUT, SUPPLY, Stage, Transistor

SOURCE_FOLLOWER = Stage(
    key="source-follower",
    title="Source follower",
    purpose="Buffer a voltage: high input resistance, gain just below one, low output resistance.",
    transistors=(Transistor("main", gate=IN, drain=SUPPLY, source=OUT),),
    levels=("input_level", "output_level"),
    one_level=True,
)

COMMON_SOURCE = Stage(
    key="common-source",
    title="Common source",
    purpose="Amplify a voltage: high input resistance, inverting gain, high output resistance.",
    transistors=(Transistor("main", gate=IN, drain=OUT, source=GROUND),),
    levels=("output_level",),
)

COMMON_GATE = Stage(
    key="common-gate",
    title="Common gate",
    purpose="Amplify from a source input: low input resistance, gain without inversion, high output resistance.",
    transistors=(Transistor("main", gate=LINE, drain=OUT, source=IN),),
    levels=("input_level", "output_level"),
)

DRAIN_FOLLOWER = Stage(
    key="drain-follower",
    title="Drain-driven follower",
    purpose="Divide a voltage by the drain coupling: the output sees little of what the drain does.",
    transistors=(Transistor("main", gate=LINE, drain=IN, source=OUT),),
    levels=("input_level", "output_level"),
    undefined={"supply_rejection": "supply_rejection has no meaning for this stage: its input stands on the supply"},
)
