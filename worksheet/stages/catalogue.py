"""The stages that the program knows. A new stage is one table, entered here."""

from __future__ import annotations

from worksheet.stages import one_transistor, stacked
from worksheet.stages.stage import Stage

_STAGES: dict[str, Stage] = {}


def register(stage: Stage) -> None:
    """Enter a stage; every command, screen and page knows it from then on. ValueError where its key is taken."""
    if stage.key in _STAGES:
        raise ValueError(f"a stage {stage.key!r} exists already")
    _STAGES[stage.key] = stage


def withdraw(key: str) -> None:
    """Take a stage out again. KeyError where there is none of that key."""
    del _STAGES[key]


def find(key: str) -> Stage | None:
    """The stage of that key, or None."""
    return _STAGES.get(key)


def keys() -> tuple[str, ...]:
    """Keys of all stages, in the order they were entered."""
    return tuple(_STAGES)


def stages() -> tuple[Stage, ...]:
    """All stages, in the order they were entered."""
    return tuple(_STAGES.values())


for _stage in (
    one_transistor.SOURCE_FOLLOWER,
    one_transistor.COMMON_SOURCE,
    one_transistor.COMMON_GATE,
    one_transistor.DRAIN_FOLLOWER,
    stacked.CASCODE,
):
    register(_stage)
