"""Steady response to harmonic excitation: question and answer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Answer, Strict, fault
from schemas.quantities import (
    AnyAcceleration,
    AnyDisplacement,
    AnyVelocity,
    DegreeOfFreedom,
    Force,
    Frequency,
    MassEccentricity,
    Moment,
    Motion,
    Point,
    PositiveMass,
    PositiveRatio,
    PositiveSpeed,
    Speed,
)
from schemas.question import Question
from schemas.response.observed import (
    Carriers,
    Degrees,
    MaxPoints,
    Observed,
    ResponseQuantity,
    SeriesQuantity,
    Severity,
    SeverityZone,
)

MOST_POINTS = 20_000
Points = Annotated[int, Field(ge=2, le=MOST_POINTS)]
Spacing = Literal["linear", "log", "resolved"]
Grade = Annotated[float, Field(strict=True, allow_inf_nan=False, gt=0, le=1e6)]


class Frequencies(Strict):
    """The frequencies of excitation: a range or a list."""

    from_hz: Frequency | None = None
    """Lowest frequency, Hz."""
    to_hz: Frequency | None = None
    """Highest frequency, Hz."""
    points: Points = 200
    """How many (no unit)."""
    spacing: Spacing = "resolved"
    """"linear", "log", or "resolved": dense where resonances are (no unit)."""
    list_hz: Annotated[list[Frequency], Field(min_length=1, max_length=MOST_POINTS)] | None = None
    """Or each frequency, Hz."""

    @model_validator(mode="after")
    def _range_or_list(self) -> Self:
        _check_range(self, "hz", self.from_hz, self.to_hz, self.list_hz)
        return self


class Speeds(Strict):
    """The speeds of the shaft: a range or a list. Excitation turns with the shaft."""

    from_rpm: PositiveSpeed | None = None
    """Lowest speed, rpm."""
    to_rpm: PositiveSpeed | None = None
    """Highest speed, rpm."""
    points: Points = 200
    """How many (no unit)."""
    spacing: Spacing = "resolved"
    """"linear", "log", or "resolved": dense where resonances are (no unit)."""
    list_rpm: Annotated[list[PositiveSpeed], Field(min_length=1, max_length=MOST_POINTS)] | None = (
        None
    )
    """Or each speed, rpm."""

    @model_validator(mode="after")
    def _range_or_list(self) -> Self:
        _check_range(self, "rpm", self.from_rpm, self.to_rpm, self.list_rpm)
        return self


def _check_range(
    given: Strict, unit: str, low: float | None, high: float | None, listed: list[float] | None
) -> None:
    if listed is not None:
        for field in (f"from_{unit}", f"to_{unit}", "points", "spacing"):
            if field in given.model_fields_set:
                raise fault(f"goes with a range, not with list_{unit}", field)
        return
    for field, value in ((f"from_{unit}", low), (f"to_{unit}", high)):
        if value is None:
            raise fault(f"a range needs from_{unit} and to_{unit}; or give list_{unit}", field)
    if low is not None and high is not None and low >= high:
        raise fault(f"to_{unit} must be above from_{unit}", f"to_{unit}")


class Unbalance(Strict):
    """An unbalance: mass times eccentricity, or a balance quality grade of a rotor."""

    mass_eccentricity: MassEccentricity | None = None
    """Unbalance U = m·e, kg·m."""
    balance_grade_mm_s: Grade | None = None
    """Or the balance quality grade G of ISO 21940-11: the permissible eccentricity times the
    angular velocity at the rotor's highest service speed, mm/s."""
    rotor_mass: PositiveMass | None = None
    """Mass of the rotor, kg; goes with the grade."""
    service_rpm: PositiveSpeed | None = None
    """The rotor's highest service speed, rpm, at which the grade is meant; where absent, order
    times the highest of `speeds`."""

    @model_validator(mode="after")
    def _one_description(self) -> Self:
        if (self.mass_eccentricity is None) == (self.balance_grade_mm_s is None):
            raise fault(
                "exactly one of mass_eccentricity and balance_grade_mm_s is needed",
                "mass_eccentricity",
            )
        if self.balance_grade_mm_s is not None and self.rotor_mass is None:
            raise fault("a balance grade needs the rotor's mass", "rotor_mass")
        for field in ("rotor_mass", "service_rpm"):
            if self.balance_grade_mm_s is None and getattr(self, field) is not None:
                raise fault("goes with balance_grade_mm_s", field)
        return self


class HarmonicExcitation(Strict):
    """A force, moment, unbalance or motion of the base that varies harmonically, zero-to-peak."""

    at: DegreeOfFreedom | None = None
    """Where a force, a moment or an unbalance acts, BODY/MOTION."""
    force: Force | None = None
    """Amplitude of a force, N."""
    moment: Moment | None = None
    """Or amplitude of a moment, N·m."""
    unbalance: Unbalance | None = None
    """Or an unbalance: its force is U·ω², ω the angular frequency of excitation."""
    base: Motion | None = None
    """Or the motion of the base (the ground, with all that is held): x y z, or rx ry rz about the
    point `about` (no unit)."""
    displacement: AnyDisplacement | None = None
    """Amplitude of the base's displacement, m or rad."""
    velocity: AnyVelocity | None = None
    """Or of its velocity, m/s or rad/s."""
    acceleration: AnyAcceleration | None = None
    """Or of its acceleration, m/s² or rad/s²."""
    about: Point | None = None
    """The point that a rotating base turns about, m; the origin of space where absent."""
    phase_deg: Degrees = 0.0
    """Its phase in e^{+iωt}, degrees; a lag is negative."""
    order: PositiveRatio | None = None
    """Cycles per turn of the shaft (no unit), over `speeds`; 1 where absent."""

    @model_validator(mode="after")
    def _one_kind(self) -> Self:
        kinds = ("force", "moment", "unbalance", "base")
        given = [kind for kind in kinds if getattr(self, kind) is not None]
        if len(given) != 1:
            raise fault(
                "exactly one of force, moment, unbalance and base is needed",
                *(given[1:2] or ["force"]),
            )
        motions = [
            name
            for name in ("displacement", "velocity", "acceleration")
            if getattr(self, name) is not None
        ]
        if given == ["base"]:
            self._of_base(motions)
            return self
        if self.at is None:
            raise fault("this field is needed", "at")
        for field in (*motions, *(["about"] if self.about is not None else [])):
            raise fault("goes with base", field)
        self._fits(given[0])
        return self

    def _of_base(self, motions: list[str]) -> None:
        if self.at is not None:
            raise fault("goes with a force, a moment or an unbalance, not with base", "at")
        if len(motions) != 1:
            raise fault(
                "exactly one of displacement, velocity and acceleration is needed",
                *(motions[1:2] or ["displacement"]),
            )
        if self.about is not None and self.base not in ("rx", "ry", "rz"):
            raise fault("goes with a rotation of the base", "about")

    def _fits(self, kind: str) -> None:
        turns = (self.at or "").rpartition("/")[2][0] == "r"
        if kind == "force" and turns:
            raise fault("a force acts on a translation: give a moment", "force")
        if kind == "moment" and not turns:
            raise fault("a moment acts on a rotation: give a force", "moment")
        if kind == "unbalance" and turns:
            raise fault("an unbalance acts on a translation", "at")


class HarmonicQuestion(Question):
    """How the machine vibrates under harmonic excitation, once it has settled."""

    frequencies: Frequencies | None = None
    """Over frequencies of excitation;"""
    speeds: Speeds | None = None
    """or over speeds of the shaft, the excitation turning with it."""
    at_rpm: Speed | None = None
    """With `frequencies`: the shaft's speed, rpm, for gyroscopic terms and bearings; 0 where
    absent."""
    excite: Annotated[list[HarmonicExcitation], Field(min_length=1, max_length=100)]
    """What excites the machine; all act together."""
    observe: Observed | None = None
    """Degrees of freedom to look at, BODY/MOTION; where absent all, up to 50, unless `forces_in`
    is given."""
    quantity: ResponseQuantity = "displacement"
    """What is observed (no unit)."""
    relative_to_base: bool = False
    """Whether motion is taken relative to the base that moves (no unit)."""
    forces_in: Carriers | None = None
    """Connections whose force and moment are wanted: what they exert on ground where they reach
    it, else on their second end."""
    max_points: MaxPoints | None = None
    """Thins long series to at most this many points (no unit): of each of equal stretches every
    series keeps its smallest and largest amplitude, so that no peak is lost."""
    severity: Severity | None = None
    """Asks for zones of vibration severity of what is observed."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        if (self.frequencies is None) == (self.speeds is None):
            raise fault("exactly one of frequencies and speeds is needed", "frequencies")
        if self.at_rpm is not None and self.speeds is not None:
            raise fault("goes with frequencies", "at_rpm")
        for index, item in enumerate(self.excite):
            if item.order is not None and self.speeds is None:
                raise fault("an order goes with speeds", "excite", index, "order")
            grade = item.unbalance and item.unbalance.balance_grade_mm_s
            if grade and self.speeds is None and item.unbalance.service_rpm is None:  # type: ignore[union-attr]
                raise fault(
                    "over frequencies a balance grade needs its service speed",
                    "excite", index, "unbalance", "service_rpm",
                )  # fmt: skip
        orders = [item.order or 1.0 for item in self.excite]
        for index, order in enumerate(orders):
            if order != orders[0]:
                raise fault(
                    "excitations of different orders have different frequencies and can't be added "
                    "to one amplitude: ask for one order at a time",
                    "excite", index, "order",
                )  # fmt: skip
        if self.relative_to_base and not any(item.base for item in self.excite):
            raise fault("no base motion is given", "relative_to_base")
        if self.severity is not None and self.observe is None and self.forces_in is not None:
            raise fault("severity needs `observe`", "severity")
        return self


class HarmonicAxis(Answer):
    """What the series run over."""

    quantity: Literal["frequency", "speed"]
    """Frequency of excitation, or speed of the shaft."""
    unit: Literal["Hz", "rpm"]
    """Unit of `values`."""
    values: list[float]
    """The values, in `unit`."""
    frequency_hz: list[float]
    """Frequency of excitation at each value, Hz."""


class HarmonicSeries(Answer):
    """Amplitude and phase of one quantity at one place."""

    at: str
    """Degree of freedom BODY/MOTION, or CONNECTION/AXIS for a force or moment carried."""
    quantity: SeriesQuantity
    """What it is."""
    unit: str
    """Unit of `amplitude`."""
    amplitude: list[float | None]
    """Zero-to-peak amplitude; null where it is without bound."""
    phase_deg: list[float | None]
    """Argument of the response relative to the excitation in e^{+iωt}, degrees, −180 to 180; a lag
    is negative."""


class Peak(Answer):
    """A largest amplitude, found between the points of the axis to full accuracy."""

    at: str
    """Where, as in the series."""
    quantity: SeriesQuantity
    """What it is."""
    frequency_hz: float
    """Frequency of excitation, Hz."""
    rpm: float
    """Speed of the shaft at which it occurs, rpm: order 1 where the axis is frequency."""
    amplitude: float | None
    """Zero-to-peak amplitude; null where it is without bound (no damping)."""
    amplification_factor: float | None
    """Frequency over the width of the peak at amplitude/√2 (half power) (no unit); null where the
    response doesn't fall that far on both sides within the axis, or is without bound."""


class HarmonicEvidence(Answer):
    """What the response rests on."""

    method: str
    """How it was computed."""
    largest_relative_residual: float | None
    """Largest ‖Zq − f‖ over ‖Z‖‖q‖ + ‖f‖ at the checked frequencies, Z the dynamic stiffness
    assembled from the matrices themselves (no unit)."""
    checked_at_hz: list[float]
    """Frequencies at which the equation of motion was checked, Hz."""
    reciprocity_difference: float | None
    """Largest relative difference between the response at one place to a force at another and the
    reverse (no unit); null where gyroscopic or cross-coupled terms break reciprocity, or where
    there is only one place."""


class HarmonicAnswer(Answer):
    """Steady response to harmonic excitation."""

    id: str
    """The id of this answer."""
    task: Literal["response/harmonic"]
    """Which task it answers."""
    system_id: str
    """The id of the machine it is about."""
    axis: HarmonicAxis
    """Frequencies or speeds that the series run over."""
    series: list[HarmonicSeries]
    """Amplitude and phase, one item per place and quantity."""
    peaks: list[Peak]
    """Peaks of every series, the lowest frequency first."""
    reading: str
    """One sentence on the whole."""
    severity: list[SeverityZone] | None = None
    """Zones of vibration severity, where asked for."""
    warnings: list[str]
    """What a careful engineer would question."""
    evidence: HarmonicEvidence
    """What the numbers rest on."""
    caution: str
    """How far the answer goes."""
