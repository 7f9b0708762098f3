"""Modes over the speed of a turning machine: question and answer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Answer, fault
from schemas.quantities import Speed
from schemas.question import Question
from schemas.separation import MOST_EXCITATIONS, Excitation, MapEvidence


class SpeedmapQuestion(Question):
    """How natural frequencies, damping and whirl change with speed, and what they meet."""

    from_rpm: Speed = 0.0
    """Lowest speed, rpm."""
    to_rpm: Speed
    """Highest speed, rpm."""
    points: Annotated[int, Field(ge=2, le=2000)] = 101
    """How many speeds (no unit)."""
    excitations: Annotated[list[Excitation], Field(max_length=MOST_EXCITATIONS)] = []
    """What excites the machine."""
    count: Annotated[int, Field(ge=1, le=200)] = 12
    """How many of the lowest modes at the first speed are followed (no unit)."""
    damped: bool = True
    """Whether damping is taken into account (no unit)."""

    @model_validator(mode="after")
    def _is_a_range(self) -> Self:
        if self.from_rpm >= self.to_rpm:
            raise fault("must be above from_rpm", "to_rpm")
        names = [item.name for item in self.excitations]
        for place, name in enumerate(names):
            if name in names[:place]:
                raise fault("the name stands already in this list", "excitations", place, "name")
        return self


class MappedMode(Answer):
    """One mode, followed by its shape over all speeds."""

    number: int
    """Its place at the first speed, 1 for the lowest (no unit)."""
    frequency_hz: list[float]
    """|λ|/2π at each speed, Hz."""
    damping_ratio: list[float]
    """−Re λ/|λ| at each speed (no unit)."""
    growth_rate_per_s: list[float]
    """Re λ at each speed, 1/s."""
    whirl: list[Literal["forward", "backward", "mixed"] | None]
    """Which way the turning bodies orbit at each speed; null where none does."""
    least_correlation: float
    """The smallest correlation of its shapes at neighbouring speeds, 0 to 1 (no unit)."""
    reading: str
    """One sentence on how it changes."""


class Crossing(Answer):
    """A speed at which an excitation meets a mode."""

    mode: int
    """Number of the mode (no unit)."""
    excitation: str
    """The excitation."""
    rpm: float
    """The speed, rpm, solved to 1e-10."""
    frequency_hz: float
    """The frequency there, Hz."""
    damping_ratio: float
    """The mode's damping ratio there (no unit)."""
    amplification_factor: float | None
    """1/(2·damping ratio) (no unit); null without damping."""
    whirl: Literal["forward", "backward", "mixed"] | None
    """Which way the turning bodies orbit there."""
    reading: str
    """One sentence on the crossing."""


class Instability(Answer):
    """Where a mode starts to grow."""

    rpm: float
    """Onset speed, rpm."""
    mode: int
    """Number of the mode (no unit)."""
    frequency_hz: float
    """Frequency at which it grows there, Hz."""
    reading: str
    """One sentence on it."""


class SpeedmapAnswer(Answer):
    """Modes over speed."""

    id: str
    """The id of this answer."""
    task: Literal["speedmap"]
    """Which task it answers."""
    system_id: str
    """The id of the machine it is about."""
    rpm: list[float]
    """The speeds, rpm."""
    modes: list[MappedMode]
    """The modes, each followed by its shape."""
    crossings: list[Crossing]
    """Speeds at which an excitation meets a mode, lowest first."""
    instability: Instability | None
    """The lowest speed at which a mode starts to grow; null where none does in this range."""
    warnings: list[str]
    """What a careful engineer would question."""
    evidence: MapEvidence
    """What the numbers rest on."""
    caution: str
    """How far the answer goes."""
