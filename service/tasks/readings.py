"""Sentences that say what a number means for the machine."""

from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from service.compute.machine import AXES, Floats
from service.tasks.machines import Analysed

NOTABLE = 0.15  # of a mode's kinetic energy: a motion or a body worth naming


def number(value: float, digits: int = 4) -> str:
    """`value` to a few significant digits, without an exponent where that reads well."""
    if value != 0.0 and not 1e-3 <= abs(value) < 1e6:
        return f"{value:.{digits}g}"
    return f"{float(f'{value:.{digits}g}'):,}".removesuffix(".0")


def percent(share: float, digits: int = 1) -> str:
    """A fraction as a percentage: 12 %, 0.4 %."""
    return f"{100.0 * share:.{digits}f}".removesuffix("." + digits * "0") + " %"


def two_percents(first: float, second: float) -> tuple[str, str]:
    """Two fractions, with as many digits as tell them apart."""
    digits = 1
    while first != second and digits < 9 and percent(first, digits) == percent(second, digits):
        digits += 1
    return percent(first, digits), percent(second, digits)


def listed(parts: list[str]) -> str:
    """a; a and b; a, b and c."""
    return parts[0] if len(parts) == 1 else f"{', '.join(parts[:-1])} and {parts[-1]}"


def mode_readings(
    analysed: Analysed,
    shapes: Floats,
    frequencies: list[float],
    kinds: list[str],
    shares: list[list[dict[str, Any]]],
) -> list[str]:
    """One sentence on each mode: which body moves how, what carries the energy.

    Parameters
    ----------
    shapes : (n, m) mass-normalized shapes
    frequencies : |ω|/2π of each, Hz
    """
    energies = np.abs(shapes * (analysed.M @ shapes))
    per_body = np.zeros((len(analysed.points), energies.shape[1]))
    np.add.at(per_body, analysed.owners, energies)
    rows: list[list[int]] = [[] for _ in analysed.points]
    for row, owner in enumerate(analysed.owners.tolist()):
        rows[owner].append(row)
    machine = _Moving(analysed.points, rows, analysed.axes.tolist())
    return [
        _mode_reading(frequency, kind, part, _what_moves(machine, energy, bodies, motion))
        for frequency, kind, part, energy, bodies, motion in zip(
            frequencies,
            kinds,
            shares,
            energies.T.tolist(),
            per_body.T.tolist(),
            shapes.T.tolist(),
            strict=True,
        )
    ]


@dataclass(frozen=True, slots=True)
class _Moving:
    """Names of the points, the rows of their motions, and the axis of each row."""

    points: tuple[str, ...]
    rows: list[list[int]]
    axes: list[int]


def _mode_reading(frequency: float, kind: str, shares: list[dict[str, Any]], moving: str) -> str:
    if kind == "rigid-body":
        return f"Free to move, nothing brings it back (0 Hz): {moving}."
    if kind == "diverging":
        seconds = number(1.0 / (2 * pi * frequency), 3)
        return f"Statically unstable, grows e-fold in {seconds} s: {moving}."
    strained = [part for part in shares if part["kind"] == "strain" and part["share"] >= 0.1]
    sentence = f"At {number(frequency)} Hz {moving}"
    if strained:
        carriers = [f"{part['of']} ({percent(part['share'])})" for part in strained[:3]]
        sentence += f"; most of the strain energy is in {listed(carriers)}"
    return sentence + "."


def _what_moves(
    machine: _Moving, energy: list[float], per_body: list[float], motion: list[float]
) -> str:
    """The bodies with most kinetic energy and the motions that carry it."""
    notable = NOTABLE * sum(per_body)
    leading = [body for body, part in enumerate(per_body) if part >= notable and part > 0.0]
    if not leading:
        return "many bodies move, none with a large part of the kinetic energy"
    leading.sort(key=lambda body: -_rounded(per_body[body], notable))
    leading = leading[:3]
    own = {body: _motions(machine, energy, body) for body in leading}
    first = own[leading[0]]
    if len(leading) > 1 and all(motions == first for motions in own.values()):
        signs = {
            motion[row] > 0.0
            for body in leading
            for row in machine.rows[body]
            if machine.axes[row] == first[0]
        }
        names = listed([machine.points[body] for body in leading])
        return f"{names} move {_words(first)}{_together(len(signs) == 1, len(leading))}"
    return listed([f"{machine.points[body]} moves {_words(own[body])}" for body in leading])


def _rounded(part: float, unit: float) -> int:
    """Energies that differ in the last digits only count as equal, so that order is settled."""
    return round(part / unit * 1e6)


def _motions(machine: _Moving, energy: list[float], body: int) -> list[int]:
    """The axes that carry a notable part of one body's kinetic energy, the largest first."""
    parts = [(energy[row], machine.axes[row]) for row in machine.rows[body]]
    notable = NOTABLE * sum(part for part, _ in parts)
    chosen = [(part, axis) for part, axis in parts if part >= notable]
    chosen.sort(key=lambda pair: -_rounded(pair[0], notable))
    return [axis for _, axis in chosen[:3]]


def _words(axes: list[int]) -> str:
    return listed(
        [f"along {AXES[axis]}" if axis < 3 else f"about {AXES[axis][1]}" for axis in axes]
    )


def _together(same: bool, bodies: int) -> str:
    if same:
        return " together"
    return " against each other" if bodies == 2 else ", not all the same way"
