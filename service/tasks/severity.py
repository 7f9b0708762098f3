"""Zones of vibration severity from published boundaries of overall r.m.s. velocity."""

from typing import Any

from schemas.response.observed import Severity

SOURCE = (
    "ISO 20816-3 (formerly 10816-3), industrial machines 120 to 15 000 rpm, vibration of "
    "non-rotating parts; boundaries from memory: check against your copy. The standard's band "
    "starts at 10 Hz (2 Hz below 600 rpm). A screening, no verdict on safety."
)
# Upper limits of zones A, B and C, mm/s r.m.s. From memory: check against your copy.
BOUNDARIES_MM_S: dict[tuple[str, str], tuple[float, float, float]] = {
    ("large", "rigid"): (2.3, 4.5, 7.1),
    ("large", "flexible"): (3.5, 7.1, 11.0),
    ("medium", "rigid"): (1.4, 2.8, 4.5),
    ("medium", "flexible"): (2.3, 4.5, 7.1),
}


def zone(at: str, rms_velocity: float | None, wanted: Severity) -> dict[str, Any]:
    """The zone of an overall r.m.s. velocity in m/s; None stands for one without bound."""
    limits = BOUNDARIES_MM_S[wanted.machine, wanted.support]
    speed = None if rms_velocity is None else 1000.0 * rms_velocity
    above = 3 if speed is None else sum(speed > limit for limit in limits)
    return {
        "at": at,
        "rms_velocity_mm_s": speed,
        "zone": "ABCD"[above],
        "zone_boundaries_mm_s": list(limits),
        "source": SOURCE,
    }
