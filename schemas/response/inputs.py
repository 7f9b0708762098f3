"""What acts on a machine over time: forces, and motions of its base."""

from typing import Annotated, Literal, Self

from pydantic import BeforeValidator, Field, model_validator

from schemas.base import Strict, fault
from schemas.quantities import (
    AnyAcceleration,
    AnyDisplacement,
    AnyForce,
    AnyVelocity,
    DegreeOfFreedom,
    Force,
    MassEccentricity,
    Moment,
    Motion,
    Point,
    PositiveRatio,
    PositiveTime,
    Speed,
    Time,
)
from schemas.response.observed import Degrees

MOST_SAMPLES = 500_000
Times = Annotated[list[Time], Field(min_length=2, max_length=MOST_SAMPLES)]
Shape = Literal["step", "half-sine", "ramp", "chirp"]


class Shaped(Strict):
    """An input over time as samples or as a shape."""

    time_s: Times | None = None
    """Times of the samples, s, ascending; a time that stands twice is a jump. Straight lines join
    the samples; before and after them a force is zero."""
    shape: Shape | None = None
    """Or a shape: "step" (to `peak`), "half-sine" (one half wave), "ramp" (rises to `peak` over
    `duration_s` and stays), "chirp" (a run-up, the phase integrated over the changing speed)."""
    start_s: Time = 0.0
    """When a shape begins, s."""
    duration_s: PositiveTime | None = None
    """How long a shape lasts, s; a step without it stays."""
    from_rpm: Speed | None = None
    """Of a chirp: speed at its start, rpm."""
    to_rpm: Speed | None = None
    """Of a chirp: speed at its end, rpm; speed changes at a constant rate."""
    order: PositiveRatio = 1.0
    """Of a chirp: cycles per turn (no unit)."""
    phase_deg: Degrees = 0.0
    """Of a chirp: phase at its start, degrees; it is a sine."""

    def _check_time(self, values: list[tuple[str, list[float] | None]], peak: str | None) -> None:
        """Samples with values, or a shape with a peak."""
        given = [(field, samples) for field, samples in values if samples is not None]
        if self.shape is None:
            self._check_samples([field for field, _ in values], given)
            return
        for field, _ in [*given, *([("time_s", None)] if self.time_s is not None else [])]:
            raise fault("samples and a shape exclude each other", field)
        if peak is not None and getattr(self, peak) is None:
            raise fault("a shape needs its peak", peak)
        if self.duration_s is None and self.shape != "step":
            raise fault(f"a {self.shape} needs its duration", "duration_s")
        self._check_chirp()

    def _check_samples(self, fields: list[str], given: list[tuple[str, list[float]]]) -> None:
        if self.time_s is None:
            raise fault("either samples (time_s and values) or a shape is needed", "time_s")
        if len(given) != 1:
            place = given[1][0] if given else fields[0]
            raise fault(f"exactly one of {', '.join(fields)} is needed", place)
        field, values = given[0]
        if len(values) != len(self.time_s):
            raise fault(f"{len(values)} values for {len(self.time_s)} times", field)
        for index in range(1, len(self.time_s)):
            if self.time_s[index] < self.time_s[index - 1]:
                raise fault("times must ascend", "time_s", index)
            if index > 1 and self.time_s[index] == self.time_s[index - 2]:
                raise fault("a time may stand twice, not three times", "time_s", index)
        if self.time_s[0] == self.time_s[-1]:
            raise fault("the samples take no time", "time_s")
        for option in ("peak", "duration_s", "start_s", "from_rpm", "to_rpm", "order"):
            if option in self.model_fields_set:
                raise fault("goes with a shape", option)

    def _check_chirp(self) -> None:
        chirp = self.shape == "chirp"
        for field in ("from_rpm", "to_rpm"):
            if chirp and getattr(self, field) is None:
                raise fault("a chirp needs from_rpm and to_rpm", field)
        for field in ("from_rpm", "to_rpm", "order", "phase_deg", "mass_eccentricity"):
            if not chirp and field in self.model_fields_set:
                raise fault("goes with a chirp", field)


class ForceInput(Shaped):
    """A force or moment over time."""

    at: DegreeOfFreedom
    """Where it acts, BODY/MOTION."""
    force: list[Force] | None = None
    """Samples of a force, N."""
    moment: list[Moment] | None = None
    """Or samples of a moment, N·m."""
    peak: AnyForce | None = None
    """Of a shape: its largest value, N or N·m."""
    mass_eccentricity: MassEccentricity | None = None
    """Of a chirp, instead of `peak`: an unbalance, kg·m, whose force grows with the square of the
    speed."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        unbalance = self.mass_eccentricity is not None
        if unbalance and self.peak is not None:
            raise fault("peak and mass_eccentricity exclude each other", "mass_eccentricity")
        values = [("force", self.force), ("moment", self.moment)]
        self._check_time(values, None if unbalance else "peak")
        turns = self.at.rpartition("/")[2][0] == "r"
        if turns and (self.force is not None or unbalance):
            raise fault("acts on a rotation: give a moment", "force" if self.force else "at")
        if not turns and self.moment is not None:
            raise fault("a moment acts on a rotation: give a force", "moment")
        return self


class BaseInput(Shaped):
    """A motion of the base (the ground, with all that is held) over time."""

    motion: Motion
    """Which way the base moves (no unit): x y z, or rx ry rz about `about`."""
    displacement: list[AnyDisplacement] | None = None
    """Samples of displacement, m or rad; it starts from zero, and the last one stays."""
    velocity: list[AnyVelocity] | None = None
    """Or samples of velocity, m/s or rad/s; zero after the last one."""
    acceleration: list[AnyAcceleration] | None = None
    """Or samples of acceleration, m/s² or rad/s²; zero after the last one."""
    quantity: Literal["displacement", "velocity", "acceleration"] = "acceleration"
    """Of a shape: what it is a shape of (no unit)."""
    peak: Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-1e12, le=1e12)] | None = None
    """Of a shape: its largest value, in m, m/s or m/s² (rad for a rotation)."""
    about: Point | None = None
    """The point that a rotating base turns about, m; the origin of space where absent."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        values = [
            ("displacement", self.displacement),
            ("velocity", self.velocity),
            ("acceleration", self.acceleration),
        ]
        self._check_time(values, "peak")
        if self.shape is None and "quantity" in self.model_fields_set:
            raise fault("goes with a shape", "quantity")
        if self.about is not None and self.motion[0] != "r":
            raise fault("goes with a rotation of the base", "about")
        return self


def _listed(value: object) -> object:
    return [value] if isinstance(value, dict) else value


BaseInputs = Annotated[list[BaseInput], BeforeValidator(_listed), Field(min_length=1, max_length=6)]
