"""The lowest modes of a pencil, dense or sparse."""

from typing import TypeAlias

import numpy as np
from scipy.sparse import csc_array, csr_array, diags_array

from service.compute.assembly import Assembly
from service.compute.constraints import eliminate
from service.compute.machine import Unsound
from service.compute.memory import (
    check_memory,
    dense_bytes,
    sparse_bytes,
)
from service.compute.pencil import Pencil, pencil_of, rows_at
from service.compute.real_modes import ELSE, Modes, Wanted, real_modes
from service.compute.sparse_modes import SparsePencil, sparse_modes

AnyPencil: TypeAlias = Pencil | SparsePencil


def lowest_modes(pencil: AnyPencil, wanted: Wanted) -> Modes:
    """The wanted modes, by the method that suits the pencil.

    Raises
    ------
    Unsound
        They would need more memory than there is.
    """
    if isinstance(pencil, SparsePencil):
        pattern = csr_array(abs(pencil.K) + abs(pencil.M))
        check_memory(sparse_bytes(pattern, wanted.count or ELSE), "bodies")
        return sparse_modes(pencil, wanted)
    return real_modes(pencil, wanted)


def pencil_at(assembly: Assembly, rpm: float) -> AnyPencil:
    """The pencil of an assembled machine, dense where it is small.

    Raises
    ------
    Unsound
        As `pencil_of`, or where a dense pencil wouldn't fit.
    """
    size = len(assembly.names)
    if not isinstance(assembly.J, np.ndarray):
        if not size:
            raise Unsound("nothing can move: every motion of every body is held", "bodies")
        return _sparse_pencil(assembly, rpm)
    check_memory(dense_bytes(size), "bodies")
    return pencil_of(assembly, rpm)


def _sparse_pencil(assembly: Assembly, rpm: float) -> SparsePencil:
    ties = eliminate(assembly.constraints, len(assembly.names))
    rows, k = rows_at(assembly, rpm)
    M = assembly.M
    if ties.T is not None:
        rows, M = rows @ ties.T, ties.T.T @ M @ ties.T
    K = rows.T @ diags_array(k) @ rows
    names = tuple(assembly.names[number] for number in ties.kept)
    return SparsePencil(csc_array(K), csc_array(M), ties.T, names, ties)
