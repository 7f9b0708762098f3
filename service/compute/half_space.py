"""A rigid footing on an elastic half-space.

Richart, Hall and Woods, Vibrations of Soils and Foundations (1970): Lysmer's analogue and its
counterparts, spring constants and damping ratios; restated in UFC 3-220-01N (2005), table 12-1.
Coefficients from memory.
"""

from dataclasses import dataclass
from math import pi, sqrt

SOURCE = (
    "Richart, Hall and Woods, Vibrations of Soils and Foundations (1970): rigid circular footing "
    "on an elastic half-space, values that don't change with frequency; a rectangle by its "
    "equivalent radii"
)


@dataclass(frozen=True, slots=True)
class Radii:
    """Equivalent radii of a footing, m: for translation, rocking about x and y, and twist."""

    slide: float
    rock_x: float
    rock_y: float
    twist: float


@dataclass(frozen=True, slots=True)
class Soil:
    """Shear modulus (Pa), Poisson's ratio and density (kg/m³)."""

    G: float
    nu: float
    rho: float


def circle(radius: float) -> Radii:
    """Radii of a circular footing."""
    return Radii(radius, radius, radius, radius)


def rectangle(length: float, width: float) -> Radii:
    """Equivalent radii of a footing `length` long in x and `width` wide in y (m).

    Equal area for translation, equal second moments of area for rotation.
    """
    return Radii(
        sqrt(length * width / pi),
        (length * width**3 / (3 * pi)) ** 0.25,
        (width * length**3 / (3 * pi)) ** 0.25,
        (length * width * (length**2 + width**2) / (6 * pi)) ** 0.25,
    )


def stiffness(soil: Soil, radii: Radii) -> tuple[float, ...]:
    """Six spring constants x y z rx ry rz: N/m and N·m/rad."""
    G, nu = soil.G, soil.nu
    slide = 32 * (1 - nu) * G * radii.slide / (7 - 8 * nu)
    return (
        slide,
        slide,
        4 * G * radii.slide / (1 - nu),
        8 * G * radii.rock_x**3 / (3 * (1 - nu)),
        8 * G * radii.rock_y**3 / (3 * (1 - nu)),
        16 * G * radii.twist**3 / 3,
    )


def damping(soil: Soil, radii: Radii, inertia: tuple[float, float, float]) -> tuple[float, ...]:
    """Six dampers x y z rx ry rz (N·s/m, N·m·s/rad), c = 2D√(k·m).

    Parameters
    ----------
    inertia : of the body on the footing about x, y, z through the middle of the footing, kg·m²

    Notes
    -----
    D = 0.288/√Bx, 0.425/√Bz, 0.15/((1+Bψ)√Bψ), 0.50/(1+2Bθ) with the mass ratios
    Bx = (7−8ν)m/(32(1−ν)ρr³), Bz = (1−ν)m/(4ρr³), Bψ = 3(1−ν)I/(8ρr⁵), Bθ = I/(ρr⁵). In
    translation c doesn't depend on the mass; without rotary inertia rocking and twist have none.
    """
    rho, nu = soil.rho, soil.nu
    k = stiffness(soil, radii)
    # In translation √(m)/√(B) doesn't depend on the mass.
    slide = 2 * 0.288 * sqrt(k[0] * 32 * (1 - nu) * rho * radii.slide**3 / (7 - 8 * nu))
    bounce = 2 * 0.425 * sqrt(k[2] * 4 * rho * radii.slide**3 / (1 - nu))
    rocking = []
    for about, radius, stiff in ((0, radii.rock_x, k[3]), (1, radii.rock_y, k[4])):
        ratio = 3 * (1 - nu) * inertia[about] / (8 * rho * radius**5)
        share = 0.15 / ((1 + ratio) * sqrt(ratio)) if ratio > 0.0 else 0.0
        rocking.append(2 * share * sqrt(stiff * inertia[about]))
    ratio = inertia[2] / (rho * radii.twist**5)
    twist = 2 * 0.50 / (1 + 2 * ratio) * sqrt(k[5] * inertia[2])
    return (slide, slide, bounce, rocking[0], rocking[1], twist)
