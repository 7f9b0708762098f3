"""Margins between natural frequencies and what excites the machine."""

from dataclasses import dataclass
from math import inf

NEAR = 1e-12  # relative: an edge that differs by less is met


@dataclass(frozen=True, slots=True)
class Excitation:
    """A band of frequency that follows the speed (`order` cycles per turn), or a fixed frequency.

    Exactly one of `order` (already times the ratio of its shaft) and `frequency` (Hz) is given.
    """

    name: str
    order: float | None
    frequency: float | None

    def band(self, low_rpm: float, high_rpm: float) -> tuple[float, float]:
        """Edges in Hz over a range of speed."""
        if self.order is None:
            assert self.frequency is not None
            return self.frequency, self.frequency
        return self.order * low_rpm / 60.0, self.order * high_rpm / 60.0


@dataclass(frozen=True, slots=True)
class Required:
    """Margins required of a mode above and below the excited band, as fractions of the edge."""

    above: float
    below: float


UNAMPLIFIED = 2.5  # amplification factor below which a mode counts as critically damped


def required_by_amplification(damping_ratio: float) -> Required:
    """Margins that grow with the amplification factor AF = 1/(2ζ).

    API 617 (7th edition), lateral separation, from memory: none for AF < 2.5; else
    17·(1 − 1/(AF − 1.5)) % of the lowest speed for a mode below it, and 10 % more of the highest
    speed for a mode above it.
    """
    factor = 1.0 / (2.0 * damping_ratio) if damping_ratio > 0.0 else inf
    if factor < UNAMPLIFIED:
        return Required(0.0, 0.0)
    share = 0.17 * (1.0 - 1.0 / (factor - 1.5))
    return Required(0.10 + share, share)


@dataclass(frozen=True, slots=True)
class Margin:
    """How far a mode keeps from a band: `margin` and what is `required`, `side` of the band."""

    margin: float
    required: float
    side: str

    @property
    def is_kept(self) -> bool:
        """Whether the mode lies outside the band, by what is required up to roundoff."""
        return self.side != "inside" and self.margin >= self.required - NEAR


def margin(frequency: float, low: float, high: float, required: Required) -> Margin:
    """Distance of `frequency` from the nearer edge of [low, high] over that edge (all in Hz)."""
    if frequency > high * (1.0 + NEAR):
        return Margin((frequency - high) / high, required.above, "above")
    if frequency < low * (1.0 - NEAR):
        return Margin((low - frequency) / low, required.below, "below")
    nearer_top = high - frequency <= frequency - low
    return Margin(0.0, required.above if nearer_top else required.below, "inside")


def coincidence_rpm(frequency: float, excitation: Excitation) -> float | None:
    """The speed at which `excitation` meets a mode of `frequency` (Hz); None for a fixed one."""
    return None if excitation.order is None else 60.0 * frequency / excitation.order


def barred(frequency: float, excitation: Excitation, required: Required) -> tuple[float, float]:
    """The open range of speed (rpm) at which the mode's margin from an order is too small.

    Clear is f ≥ (1 + above)·f_e or f ≤ (1 − below)·f_e.
    """
    assert excitation.order is not None
    at = 60.0 * frequency / excitation.order
    return at / (1.0 + required.above), at / (1.0 - required.below)


def free_ranges(
    low: float, high: float, barred_ranges: list[tuple[float, float]]
) -> list[tuple[float, float]]:
    """What open ranges leave of [low, high], ascending; a single point only where low = high."""
    free: list[tuple[float, float]] = []
    start = low
    for a, b in sorted(barred_ranges):
        if b <= start or a >= high:
            continue
        if a > start:
            free.append((start, a))
        start = max(start, b)
    if start < high or (low == high and start == low):
        free.append((start, high))
    return free
