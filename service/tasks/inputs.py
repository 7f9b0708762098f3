"""From posted forces and base motions over time to signals."""

from math import pi

import numpy as np

from schemas.faults import Fault, Invalid
from schemas.response.inputs import BaseInput, ForceInput
from service.compute.machine import Floats
from service.compute.signals import Signal, constant, samples, smooth

MOST_TURNS = 50_000


def force_signal(item: ForceInput, end: float) -> Signal | None:
    """The force over time up to `end`, None where it begins later."""
    if item.shape is None:
        values = item.force if item.force is not None else item.moment
        return samples(np.array(item.time_s), np.array(values))
    if item.mass_eccentricity is not None:
        return _chirp(item, item.mass_eccentricity, end, grows=True) if item.start_s < end else None
    return _shape(item, item.peak or 0.0, end)


def base_signal(item: BaseInput, end: float) -> Signal | None:
    """The given quantity of the base's motion over time, and None where it begins after `end`."""
    if item.shape is None:
        values = next(v for v in (item.displacement, item.velocity, item.acceleration) if v)
        return samples(np.array(item.time_s), np.array(values))
    return _shape(item, item.peak or 0.0, end)


def base_quantity(item: BaseInput) -> str:
    """Which quantity of the base's motion is given."""
    if item.shape is not None:
        return item.quantity
    fields = ("displacement", "velocity", "acceleration")
    return next(field for field in fields if getattr(item, field) is not None)


def _shape(item: ForceInput | BaseInput, peak: float, end: float) -> Signal | None:
    start, lasting = item.start_s, item.duration_s
    if start >= end:
        return None
    if item.shape == "step":
        return constant(peak, start, end if lasting is None else start + lasting)
    assert lasting is not None
    if item.shape == "half-sine":
        rate = pi / lasting
        return smooth(lambda t: peak * np.sin(rate * (t - start)), start, start + lasting, rate)
    if item.shape == "ramp":
        rising = samples(np.array([start, start + lasting]), np.array([0.0, peak]))
        return rising.held_until(end)
    return _chirp(item, peak, end, grows=False)


def _chirp(item: ForceInput | BaseInput, size: float, end: float, grows: bool) -> Signal:
    """size·sin φ, or with an unbalance size·φ′²·sin φ; the phase φ is the integral of the speed.

    Raises
    ------
    Invalid
        More cycles than are followed; the pointer starts at the input.
    """
    assert item.duration_s is not None
    start, lasting = item.start_s, item.duration_s
    first, last = (item.order * (rpm or 0.0) * pi / 30.0 for rpm in (item.from_rpm, item.to_rpm))
    gain = (last - first) / lasting

    def wave(t: Floats) -> Floats:
        passed = t - start
        phase = np.deg2rad(item.phase_deg) + first * passed + gain * passed**2 / 2
        sine: Floats = size * np.sin(phase)
        return sine * (first + gain * passed) ** 2 if grows else sine

    turning = max(first, last, 2 * pi / lasting)
    stop = min(start + lasting, end)
    if turning * (stop - start) > 2 * pi * MOST_TURNS:
        raise Invalid([Fault("/to_rpm", f"more than {MOST_TURNS:,} cycles: follow a shorter part")])
    return smooth(wave, start, stop, turning)
