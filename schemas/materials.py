"""A short table of common materials.

Values are those that design standards prescribe or list for general use, from memory; a machine's
own certificate goes before them. Shear moduli follow from E/(2(1+ν)) where the standard gives none.
"""

from dataclasses import dataclass
from typing import Literal

MaterialName = Literal[
    "steel", "stainless steel", "aluminium", "grey cast iron", "ductile cast iron", "concrete"
]


@dataclass(frozen=True, slots=True)
class Material:
    """Young's modulus and shear modulus (Pa), density (kg/m³), Poisson's ratio, and the source."""

    youngs_modulus: float
    shear_modulus: float
    density: float
    poissons_ratio: float
    source: str


def _isotropic(E: float, nu: float, density: float, source: str) -> Material:
    return Material(E, E / (2 * (1 + nu)), density, nu, source)


MATERIALS: dict[str, Material] = {
    "steel": _isotropic(210e9, 0.30, 7850.0, "EN 1993-1-1, 3.2.6; EN 1991-1-1, annex A"),
    "stainless steel": _isotropic(200e9, 0.30, 7900.0, "EN 1993-1-4, 2.1; EN 10088-1"),
    "aluminium": _isotropic(70e9, 0.30, 2700.0, "EN 1999-1-1, 3.2.5"),
    "grey cast iron": _isotropic(110e9, 0.26, 7200.0, "EN 1561, EN-GJL-250, annex"),
    "ductile cast iron": _isotropic(169e9, 0.275, 7100.0, "EN 1563, EN-GJS-400, annex"),
    "concrete": _isotropic(33e9, 0.20, 2500.0, "EN 1992-1-1, table 3.1, C30/37; EN 1991-1-1"),
}
