"""Response over time: question and answer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Answer, Strict, fault
from schemas.quantities import (
    AnyDisplacement,
    AnyVelocity,
    DegreeOfFreedom,
    Frequency,
    Motion,
    PositiveTime,
    Ratio,
    Speed,
)
from schemas.question import Question
from schemas.response.inputs import BaseInputs, ForceInput
from schemas.response.observed import (
    Carriers,
    MaxPoints,
    Observed,
    ResponseQuantity,
    SeriesQuantity,
    Severity,
    SeverityZone,
)

MOST_STEPS, MOST_VALUES = 1_000_000, 4_000_000
MOST_OSCILLATORS = 2_000


class Initial(Strict):
    """Where the machine is and how it moves at time 0; at rest in its place where not said."""

    displacement: dict[DegreeOfFreedom, AnyDisplacement] = {}
    """Displacement by degree of freedom, m or rad."""
    velocity: dict[DegreeOfFreedom, AnyVelocity] = {}
    """Velocity by degree of freedom, m/s or rad/s."""


class ShockSpectrumQuestion(Strict):
    """Asks for the shock response spectrum of the base's acceleration."""

    from_hz: Frequency
    """Lowest natural frequency, Hz."""
    to_hz: Frequency
    """Highest natural frequency, Hz."""
    points: Annotated[int, Field(ge=2, le=MOST_OSCILLATORS)] = 60
    """How many, evenly on a logarithmic scale (no unit)."""
    damping_ratios: Annotated[list[Ratio], Field(min_length=1, max_length=10)] = [0.05]
    """Damping ratios of the oscillators, less than 1 (no unit)."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        if self.from_hz >= self.to_hz:
            raise fault("to_hz must be above from_hz", "to_hz")
        for index, ratio in enumerate(self.damping_ratios):
            if ratio >= 1.0:
                raise fault("must be less than 1", "damping_ratios", index)
        return self


class TransientQuestion(Question):
    """What the machine does over time: released, pushed, shaken or run up."""

    initial: Initial | None = None
    """Displacements and velocities at time 0."""
    forces: Annotated[list[ForceInput], Field(min_length=1, max_length=100)] | None = None
    """Forces and moments over time; all act together."""
    base: BaseInputs | None = None
    """Motions of the base over time: one, or a list."""
    duration_s: PositiveTime
    """How long to follow the machine, s."""
    time_step_s: PositiveTime
    """Time between the values that come back, s. It has no influence on them."""
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
    at_rpm: Speed = 0.0
    """The shaft's speed for gyroscopic terms and bearings, rpm."""
    max_points: MaxPoints | None = None
    """Thins long series to at most this many points (no unit): of each of equal stretches every
    series keeps its smallest and largest value, so that no peak is lost."""
    severity: Severity | None = None
    """Asks for zones of vibration severity of what is observed."""
    shock_spectrum: ShockSpectrumQuestion | None = None
    """Asks for the shock response spectrum of each base acceleration."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        if self.initial is None and self.forces is None and self.base is None:
            raise fault("nothing moves the machine: give initial, forces or base", "forces")
        if self.time_step_s > self.duration_s:
            raise fault("longer than duration_s", "time_step_s")
        if self.duration_s / self.time_step_s > MOST_STEPS:
            raise fault(f"more than {MOST_STEPS:,} steps", "time_step_s")
        if self.relative_to_base and self.base is None:
            raise fault("no base motion is given", "relative_to_base")
        if self.severity is not None and self.observe is None and self.forces_in is not None:
            raise fault("severity needs `observe`", "severity")
        if self.shock_spectrum is not None and not self._base_accelerates():
            raise fault("a shock spectrum needs a base acceleration", "shock_spectrum")
        return self

    def _base_accelerates(self) -> bool:
        return any(
            item.acceleration is not None
            or (item.shape is not None and item.quantity == "acceleration")
            for item in self.base or ()
        )


class TransientSeries(Answer):
    """One quantity at one place over time."""

    at: str
    """Degree of freedom BODY/MOTION, or CONNECTION/AXIS for a force or moment carried."""
    quantity: SeriesQuantity
    """What it is."""
    unit: str
    """Unit of `values`."""
    values: list[float]
    """The values at `time_s`, in `unit`. At a jump of the input: those just after it."""


class ModalTerm(Answer):
    """One place's part in a mode of free motion."""

    at: str
    """Degree of freedom."""
    cosine: float
    """Coefficient of e^(−decay·t)·cos ω_d t, m or rad."""
    sine: float
    """Coefficient of e^(−decay·t)·sin ω_d t, m or rad."""
    drift_per_s: float | None = None
    """Of a rigid-body motion: coefficient of t, m/s or rad/s."""


class ModalTerms(Answer):
    """One mode of a free motion: the displacement is Σ e^(−decay·t)(cosine·cos ω_d t +
    sine·sin ω_d t)."""

    mode: int
    """Number of the root, sorted by |λ|, 1 for the lowest (no unit)."""
    frequency_hz: float
    """|λ|/2π of its root λ, Hz."""
    damped_frequency_hz: float
    """ω_d/2π = Im λ/2π, Hz; 0 where it doesn't oscillate."""
    decay_per_s: float
    """−Re λ, 1/s; negative for a motion that grows."""
    terms: list[ModalTerm]
    """Coefficients at the observed degrees of freedom."""


class Largest(Answer):
    """The value of largest size that a series reaches, looked for between the steps too."""

    at: str
    """Where, as in the series."""
    quantity: SeriesQuantity
    """What it is."""
    unit: str
    """Unit of `value`."""
    value: float
    """The value with its sign, in `unit`."""
    time_s: float
    """When, s."""


class ShockSpectrum(Answer):
    """Largest responses of single oscillators on the base, during the record and after it."""

    motion: Motion
    """Which way the base moves."""
    damping_ratio: float
    """Of the oscillators (no unit)."""
    frequency_hz: list[float]
    """Natural frequencies of the oscillators, Hz."""
    absolute_acceleration_m_s2: list[float]
    """Largest absolute acceleration of the oscillators, m/s² (rad/s² for a rotation)."""
    relative_displacement_m: list[float]
    """Largest displacement relative to the base, m (rad for a rotation)."""
    pseudo_velocity_m_s: list[float]
    """ω times the relative displacement, m/s (rad/s for a rotation)."""


class TransientEvidence(Answer):
    """What the response rests on."""

    method: str
    """How it was computed."""
    largest_relative_residual: float | None
    """Largest residual of the equation of motion at the checked times over the size of its terms,
    with the matrices themselves (no unit)."""
    checked_at_s: list[float]
    """Times at which the equation of motion was checked, s."""
    energy_balance: float | None
    """Of a free motion: energy at the end plus energy dissipated, less that at the start, over the
    largest of them (no unit); null where something drives the machine or the balance isn't drawn
    (loss factors, damping assumptions by mode)."""


class TransientAnswer(Answer):
    """Response over time."""

    id: str
    """The id of this answer."""
    task: Literal["response/transient"]
    """Which task it answers."""
    system_id: str
    """The id of the machine it is about."""
    time_s: list[float]
    """Times, s."""
    series: list[TransientSeries]
    """Values over `time_s`, one item per place and quantity."""
    modal_terms: list[ModalTerms]
    """The modes of a free motion; empty where something drives the machine."""
    largest: list[Largest]
    """Of each series, in the order of the series."""
    reading: str
    """One sentence on the whole."""
    severity: list[SeverityZone] | None = None
    """Zones of vibration severity, where asked for."""
    shock_spectrum: list[ShockSpectrum] | None = None
    """Shock response spectra, where asked for."""
    warnings: list[str]
    """What a careful engineer would question."""
    evidence: TransientEvidence
    """What the numbers rest on."""
    caution: str
    """How far the answer goes."""
