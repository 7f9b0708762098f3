"""Exact elimination of rigid ties: q = T r, with no penalty springs.

Each constraint is a row that must vanish on the motions. One after another they are solved for one
motion (Gauss–Jordan elimination with the largest pivot), which leaves every dependent motion as a
combination of independent ones. A row that vanishes by itself is redundant: it ties what earlier
rows tie already.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.sparse import csr_array

from service.compute.machine import Integers

DENSE_UP_TO = 1500  # motions
NEGLIGIBLE = 1e-10  # of the largest entry of a row: what is left of it by roundoff


@dataclass(frozen=True, slots=True)
class Ties:
    """The outcome of the elimination.

    Attributes
    ----------
    T : (n, r) every motion from the r independent ones, or None where nothing is tied; sparse
        above `DENSE_UP_TO` motions
    kept : (r,) which motions are the independent ones
    redundant : names of ties of which some row says nothing new
    locking : names of ties that hold a motion to zero which is otherwise free
    """

    T: Any
    kept: Integers
    redundant: tuple[str, ...]
    locking: tuple[str, ...]


def eliminate(constraints: tuple[tuple[str, list[tuple[int, float]]], ...], size: int) -> Ties:
    """Solve the constraint rows of `size` motions for dependent motions."""
    if not constraints:
        return Ties(None, np.arange(size), (), ())
    dependent: dict[int, dict[int, float]] = {}
    redundant: list[str] = []
    locking: list[str] = []
    for name, row in constraints:
        left = _substituted(row, dependent)
        largest = max((abs(value) for _, value in row), default=0.0)
        left = {column: v for column, v in left.items() if abs(v) > NEGLIGIBLE * largest}
        if not left:
            redundant.append(name)
            continue
        if len(left) == 1 and len(row) > 1:
            locking.append(name)
        _solve(left, dependent)
    kept = [column for column in range(size) if column not in dependent]
    place = {column: number for number, column in enumerate(kept)}
    entries = [(column, number, 1.0) for number, column in enumerate(kept)]
    for column, combination in dependent.items():
        entries += [(column, place[other], value) for other, value in combination.items()]
    rows, columns, values = zip(*entries, strict=True) if entries else ((), (), ())
    sparse = csr_array((values, (rows, columns)), shape=(size, len(kept)))
    T = sparse.toarray() if size <= DENSE_UP_TO else sparse
    return Ties(
        T, np.array(kept, dtype=int), tuple(dict.fromkeys(redundant)), tuple(dict.fromkeys(locking))
    )


def _substituted(
    row: list[tuple[int, float]], dependent: dict[int, dict[int, float]]
) -> dict[int, float]:
    left: dict[int, float] = {}
    for column, value in row:
        for other, factor in dependent.get(column, {column: 1.0}).items():
            left[other] = left.get(other, 0.0) + value * factor
    return left


def _solve(row: dict[int, float], dependent: dict[int, dict[int, float]]) -> None:
    """Solve `row` = 0 for its largest entry (the last of equals) and put that into the others."""
    largest = max(abs(value) for value in row.values())
    pivot = max(column for column, value in row.items() if abs(value) >= (1 - 1e-9) * largest)
    combination = {column: -value / row[pivot] for column, value in row.items() if column != pivot}
    for others in dependent.values():
        factor = others.pop(pivot, None)
        if factor is not None:
            for column, value in combination.items():
                others[column] = others.get(column, 0.0) + factor * value
    dependent[pivot] = combination
