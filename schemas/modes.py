"""Natural frequencies and mode shapes: question and answer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Answer, fault
from schemas.quantities import DegreeOfFreedom, Frequency, Motion, Speed
from schemas.question import Question

Count = Annotated[int, Field(ge=1, le=2000)]
ModeKind = Literal["rigid-body", "oscillating", "overdamped", "diverging"]


class ModesQuestion(Question):
    """Which natural frequencies and mode shapes are asked for."""

    count: Count | None = None
    """How many modes, lowest first (no unit); all up to 50 degrees of freedom, else 20."""
    below_hz: Frequency | None = None
    """Or all modes below this frequency, Hz."""
    damped: bool = False
    """Whether damping is taken into account (no unit)."""
    at_rpm: Speed | None = None
    """Speed of the machine's shaft, rpm, for gyroscopic terms and bearings; where absent, modes at
    rest."""
    shape_scale: Literal["mass", "largest"] = "mass"
    """"mass": φᵀMφ = 1; "largest": the largest entry of each shape is 1 (no unit)."""

    shapes_of: Annotated[list[DegreeOfFreedom], Field(min_length=1, max_length=1000)] | None = None
    """Degrees of freedom whose part of the shapes comes back, BODY/MOTION; all where absent."""

    @model_validator(mode="after")
    def _count_or_limit(self) -> Self:
        if self.count is not None and self.below_hz is not None:
            raise fault("count and below_hz exclude each other", "below_hz")
        return self


class EffectiveMass(Answer):
    """How much of the machine's mass takes part when its supports move in one direction."""

    kg: float | None = None
    """Effective mass for a translation, kg."""
    kg_m2: float | None = None
    """Effective moment of inertia for a rotation about the centre of mass, kg·m²."""
    share: float
    """Fraction of the whole moving mass (no unit)."""


class EnergyShare(Answer):
    """One part's share of a mode's energy."""

    of: str
    """The connection (strain) or body (kinetic)."""
    kind: Literal["strain", "kinetic"]
    """Which energy."""
    share: float
    """Fraction of the mode's strain or kinetic energy (no unit)."""


class ComplexShape(Answer):
    """A shape whose parts don't move in step."""

    real: list[float]
    """Real parts, m or rad; the largest entry of the shape is real and positive."""
    imaginary: list[float]
    """Imaginary parts, m or rad."""


class Mode(Answer):
    """One mode of vibration."""

    number: int
    """1 for the lowest (no unit)."""
    kind: ModeKind
    """rigid-body: 0 Hz; oscillating; overdamped: a real root that decays; diverging: grows."""
    frequency_hz: float
    """Natural frequency, Hz: |λ|/2π of the mode's root λ."""
    frequency_rad_s: float
    """Natural angular frequency, rad/s."""
    period_s: float | None
    """Period of the oscillation, s; null where the mode doesn't oscillate."""
    speed_rpm: float | None
    """The speed whose once-per-turn excitation meets the mode, rpm; null where it doesn't
    oscillate."""
    growth_rate_per_s: float | None = None
    """Re λ, 1/s; negative where the motion decays. Of damped, turning and diverging modes."""
    damping_ratio: float | None = None
    """−Re λ/|λ| (no unit)."""
    damped_frequency_hz: float | None = None
    """Im λ/2π, Hz."""
    whirl: Literal["forward", "backward", "mixed"] | None = None
    """Where bodies spin: whether they orbit with their spin or against it."""
    frequency_bound_hz: float
    """The frequency lies within this of `frequency_hz`, Hz: from the residual (Krylov–Weinstein)
    and a stated roundoff term."""
    shape: list[float] | ComplexShape
    """Per degree of freedom, in the order of `degrees_of_freedom`: m or rad per unit of modal
    coordinate."""
    effective_mass: dict[Motion, EffectiveMass]
    """Per direction of motion of the supports."""
    energy: list[EnergyShare]
    """Shares of strain and kinetic energy of at least half a per cent, the largest first (at most
    12 of each)."""
    reading: str
    """One sentence: which body moves how, what carries the energy."""


class ModesEvidence(Answer):
    """What lets a reader trust the modes without trusting the program."""

    method: str
    """How the modes were computed."""
    sturm_count: int
    """Eigenvalues below `sturm_below_hz`, counted by the inertia of K − σM (Sylvester's law), apart
    from the computation of the modes (no unit)."""
    sturm_below_hz: float
    """Where the count was taken, Hz, just above the highest returned mode."""
    modes_returned: int
    """Modes returned (no unit)."""
    complete: bool
    """Whether the count equals the number of modes found: no mode was missed."""
    largest_relative_residual: float
    """The largest ‖Kφ − λMφ‖ / (‖Kφ‖ + |λ|·‖Mφ‖) over the modes (no unit)."""
    largest_cross_product: float
    """The largest |φᵢᵀMφⱼ| over pairs of different mass-normalized modes (no unit)."""


class DampedEvidence(Answer):
    """What lets a reader trust damped or turning modes without trusting the program."""

    method: str
    """How the modes were computed."""
    roots_found: int
    """Roots found, both of each conjugate pair counted (no unit)."""
    roots_expected: int
    """Roots that the equations of motion have: two for each motion with inertia, one for each
    damped motion without (no unit)."""
    modes_returned: int
    """Modes returned (no unit)."""
    complete: bool
    """Whether all roots were found."""
    largest_relative_residual: float
    """The largest ‖(λ²M + λC + K)φ‖ over the sum of its parts' norms, of the full problem
    (no unit)."""
    largest_condition: float
    """The largest condition of a returned root: how much it may move per unit of relative change of
    the matrices (no unit)."""
    nearly_defective: list[int]
    """Numbers of modes whose shapes nearly coincide with another's, so that the root is poorly
    determined (no unit)."""


class ModesAnswer(Answer):
    """Natural frequencies and mode shapes, lowest first."""

    id: str
    """The id of this answer."""
    task: Literal["modes"]
    """Which task it answers."""
    system_id: str
    """The id of the machine it is about."""
    degrees_of_freedom: list[str]
    """BODY/MOTION, in the order of every shape."""
    modes: list[Mode]
    """The modes."""
    warnings: list[str]
    """What a careful engineer would question."""
    evidence: ModesEvidence | DampedEvidence
    """What the numbers rest on."""
    caution: str
    """How far the answer goes."""
