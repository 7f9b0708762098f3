"""Separation of natural frequencies from what excites the machine: question and answer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Answer, Strict, fault
from schemas.modes import DampedEvidence, ModesEvidence
from schemas.quantities import (
    DegreeOfFreedom,
    Frequency,
    Name,
    PositiveRatio,
    PositiveSpeed,
    Ratio,
    Speed,
)
from schemas.question import Question

Verdict = Literal["clear", "short", "coincident"]
MOST_OPERATIONS, MOST_EXCITATIONS = 20, 60


class Operation(Strict):
    """A range of speeds at which the machine runs."""

    name: Name
    """What the range is called."""
    min_rpm: Speed
    """Lowest speed, rpm."""
    max_rpm: PositiveSpeed
    """Highest speed, rpm."""

    @model_validator(mode="after")
    def _is_a_range(self) -> Self:
        if self.min_rpm > self.max_rpm:
            raise fault("min_rpm is above max_rpm", "min_rpm")
        return self


class Excitation(Strict):
    """Something that excites the machine: an order of a shaft's speed, or a fixed frequency."""

    name: Name
    """What the excitation is called."""
    order: PositiveRatio | None = None
    """Cycles per turn of its shaft (no unit)."""
    shaft_ratio: PositiveRatio | None = None
    """Speed of its shaft over the machine's speed (no unit); 1 where absent."""
    frequency_hz: Frequency | None = None
    """Or a fixed frequency, Hz."""

    @model_validator(mode="after")
    def _order_or_frequency(self) -> Self:
        if (self.order is None) == (self.frequency_hz is None):
            raise fault("an excitation has either an order or a frequency_hz", "order")
        if self.shaft_ratio is not None and self.order is None:
            raise fault("shaft_ratio goes with an order", "shaft_ratio")
        return self


class FractionRule(Strict):
    """A fixed margin, as a fraction of the edge of the excited band."""

    kind: Literal["fraction"]
    """Always "fraction"."""
    mode_above: Ratio = 0.2
    """Margin required of a mode above the excited band (no unit)."""
    mode_below: Ratio = 0.2
    """Margin required of a mode below the excited band, less than 1 (no unit)."""

    @model_validator(mode="after")
    def _below_one(self) -> Self:
        if self.mode_below >= 1.0:
            raise fault("must be less than 1", "mode_below")
        if self.mode_above > 10.0:
            raise fault("must be at most 10", "mode_above")
        return self


class TorsionalRule(Strict):
    """Ten per cent on both sides, as the published machinery standards ask of torsional modes."""

    kind: Literal["torsional"]
    """Always "torsional"."""


class AmplificationRule(Strict):
    """A margin that grows with the mode's amplification factor, as the published standards for
    rotating machinery ask of lateral modes; needs damping."""

    kind: Literal["amplification"]
    """Always "amplification"."""


Rule = Annotated[FractionRule | TorsionalRule | AmplificationRule, Field(discriminator="kind")]
Places = Annotated[list[DegreeOfFreedom], Field(min_length=1, max_length=100)]


class SeparationQuestion(Question):
    """Whether every mode keeps its separation from every excitation in every operation."""

    operation: Annotated[list[Operation], Field(min_length=1, max_length=MOST_OPERATIONS)]
    """The ranges of speed at which the machine runs."""
    excitations: Annotated[list[Excitation], Field(min_length=1, max_length=MOST_EXCITATIONS)]
    """What excites the machine."""
    rule: Rule = FractionRule(kind="fraction")
    """The margin that is required."""
    forces_at: dict[Name, Places] | None = None
    """Per excitation, the degrees of freedom where it acts, BODY/MOTION; a mode that it can't drive
    there is reported `unexcited`."""
    damped: bool = False
    """Whether damping is taken into account (no unit)."""

    @model_validator(mode="after")
    def _names(self) -> Self:
        for field, items in (("operation", self.operation), ("excitations", self.excitations)):
            names = [item.name for item in items]
            if len(set(names)) < len(names):
                twice = next(i for i, name in enumerate(names) if name in names[:i])
                raise fault("the name stands already in this list", field, twice, "name")
        unknown = set(self.forces_at or {}) - {item.name for item in self.excitations}
        if unknown:
            raise fault("there is no such excitation", "forces_at", min(unknown))
        return self


class Finding(Answer):
    """One mode against one excitation in one operation."""

    mode: int
    """Number of the mode (no unit)."""
    frequency_hz: float
    """Its natural frequency, Hz."""
    excitation: str
    """The excitation."""
    operation: str
    """The operation."""
    excitation_min_hz: float
    """Lower edge of the excited band, Hz."""
    excitation_max_hz: float
    """Upper edge of the excited band, Hz."""
    margin: float
    """Distance from the mode to the nearer edge over that edge's frequency (no unit); 0 inside the
    band."""
    required: float
    """Margin required by the rule (no unit)."""
    verdict: Literal["clear", "short", "coincident", "unexcited"]
    """clear: margin at least as required; short: less; coincident: inside the band; unexcited: the
    excitation can't drive the mode."""
    coincidence_rpm: float | None
    """Speed of the machine at which the excitation meets the mode, rpm; null for a fixed
    frequency."""
    damping_ratio: float | None = None
    """Of damped modes: the damping ratio there (no unit)."""
    amplification_factor: float | None = None
    """Of damped modes: 1/(2·damping ratio) (no unit)."""
    participation: float | None = None
    """With `forces_at`: the mode's share of the driving-point mobility where the excitation acts,
    0 to 1 (no unit)."""
    reading: str
    """One sentence on the finding."""


class Coincidence(Answer):
    """A speed at which an excitation meets a mode, from rest to the highest operating speed."""

    mode: int
    """Number of the mode (no unit)."""
    excitation: str
    """The excitation."""
    rpm: float
    """The speed, rpm."""
    operation: str | None
    """The operation that the speed lies in; null where the machine only passes it."""


class SpeedRange(Answer):
    """A range of speeds."""

    min_rpm: float
    """Lowest speed, rpm."""
    max_rpm: float
    """Highest speed, rpm."""


class MapEvidence(Answer):
    """What the map rests on."""

    method: str
    """How it was made."""
    speeds_added: int
    """Speeds solved between the points asked for, where shapes changed much (no unit)."""
    least_correlation: float
    """The smallest correlation of a mode's shapes at neighbouring speeds (no unit)."""
    largest_relative_residual: float
    """The largest relative residual of the full quadratic problem at the crossings and the last
    speed (no unit)."""


class SeparationAnswer(Answer):
    """Whether every mode keeps its separation, the worst finding first."""

    id: str
    """The id of this answer."""
    task: Literal["separation"]
    """Which task it answers."""
    system_id: str
    """The id of the machine it is about."""
    verdict: Verdict
    """The worst of all findings."""
    reading: str
    """One sentence on the whole."""
    findings: list[Finding]
    """Every mode that an excitation can reach, against every excitation and operation, worst
    first."""
    coincidences: list[Coincidence]
    """Speeds at which an excitation meets a mode."""
    clear_speeds: list[SpeedRange]
    """Where in the whole operation every finding is clear."""
    warnings: list[str]
    """What a careful engineer would question."""
    evidence: ModesEvidence | DampedEvidence | MapEvidence
    """What the modes rest on."""
    caution: str
    """How far the answer goes."""
