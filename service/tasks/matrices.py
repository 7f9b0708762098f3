"""From a posted matrix to an array, with a fault at the entry or line that is wrong."""

from io import BytesIO
from typing import Any

import numpy as np
from scipy.io import mminfo, mmread
from scipy.sparse import coo_array, csc_array

from schemas.faults import Fault, pointer
from schemas.matrix import EntryList, MatrixMarket
from service.compute.machine import Floats

SYMMETRIC_WITHIN = 1e-9  # of the larger of the two entries: what printing and reading may lose
NOTHING = 1e-14  # of the diagonal: what roundoff leaves of an entry that is zero
LARGEST = 1e30
Posted = list[list[float]] | EntryList | MatrixMarket


def matrix_of(posted: Posted, field: str, size: int, faults: list[Fault]) -> csc_array[Any] | None:
    """The (size, size) matrix, sparse; None where a fault was added to `faults`."""
    before = len(faults)
    if isinstance(posted, EntryList):
        found = _from_entries(posted, field, size, faults)
    elif isinstance(posted, MatrixMarket):
        found = _from_text(posted.matrix_market, field, size, faults)
    else:
        found = coo_array(np.array(posted))
    return None if len(faults) > before or found is None else csc_array(found)


def _from_entries(
    posted: EntryList, field: str, size: int, faults: list[Fault]
) -> coo_array[Any] | None:
    row, column = np.array(posted.rows, dtype=int), np.array(posted.columns, dtype=int)
    value = np.array(posted.values, dtype=float)
    for name, index in (("rows", row), ("columns", column)):
        outside = np.flatnonzero(index >= size)
        if outside.size:
            place = int(outside[0])
            faults.append(
                Fault(
                    pointer((field, name, place)),
                    f"{index[place]} is outside: {size} degrees of freedom are numbered from 0",
                )
            )
    if any(fault.pointer.startswith(f"/{field}/") for fault in faults):
        return None
    if posted.symmetric and (row > column).any() and (row < column).any():
        minority = row > column if (row > column).sum() <= (row < column).sum() else row < column
        place = int(np.flatnonzero(minority)[0])
        faults.append(
            Fault(
                pointer((field, "rows", place)),
                "lies in the other triangle: a symmetric list has the upper or the lower one",
            )
        )
        return None
    found = coo_array((value, (row, column)), shape=(size, size))
    return _mirrored(found) if posted.symmetric else found


def _mirrored(triangle: coo_array[Any]) -> coo_array[Any]:
    away = triangle.row != triangle.col
    return coo_array(
        (
            np.concatenate([triangle.data, triangle.data[away]]),
            (
                np.concatenate([triangle.row, triangle.col[away]]),
                np.concatenate([triangle.col, triangle.row[away]]),
            ),
        ),
        shape=triangle.shape,
    )


def _from_text(text: str, field: str, size: int, faults: list[Fault]) -> coo_array[Any] | None:
    place = pointer((field, "matrix_market"))
    data = text.encode()
    try:
        rows, columns, entries, _, values, symmetry = mminfo(BytesIO(data))
        complaint = _complaint(rows, columns, entries, values, symmetry, size, text.count("\n") + 1)
        found = None if complaint else coo_array(mmread(BytesIO(data)))
    except (ValueError, OverflowError) as error:
        complaint, found = str(error)[:200], None
    if complaint:
        faults.append(Fault(place, complaint))
        return None
    assert found is not None
    if not (np.isfinite(found.data).all() and (np.abs(found.data) <= LARGEST).all()):
        faults.append(Fault(place, _line_of_wild_value(text)))
        return None
    return coo_array(found.astype(float))


def _complaint(
    rows: int, columns: int, entries: int, values: str, symmetry: str, size: int, lines: int
) -> str | None:
    if values not in ("real", "double", "integer"):
        return f"Line 1: the field '{values}' can't be used: real or integer is expected"
    if symmetry not in ("general", "symmetric", "skew-symmetric"):
        return f"Line 1: the symmetry '{symmetry}' can't be used"
    if (rows, columns) != (size, size):
        return f"{rows} rows and {columns} columns for {size} degrees of freedom"
    if entries > max(lines, 1):
        return f"{entries} entries are announced, but the text has only {lines} lines"
    return None


def _line_of_wild_value(text: str) -> str:
    for number, line in enumerate(text.splitlines(), 1):
        last = line.split()[-1] if line.split() and not line.startswith("%") else "0"
        try:
            if not abs(float(last)) <= LARGEST:
                return f"Line {number}: '{last[:24]}' isn't a finite number up to {LARGEST:g}"
        except ValueError:
            continue
    return f"a value isn't a finite number up to {LARGEST:g}"


def symmetric_part(
    A: csc_array[Any], posted: Posted, field: str, faults: list[Fault]
) -> csc_array[Any]:
    """A with both triangles averaged; a fault names the entry that is off the most."""
    difference = abs(A - A.T)
    over = (difference - SYMMETRIC_WITHIN * abs(A).maximum(abs(A.T))).tocoo()
    diagonal = np.sqrt(np.abs(A.diagonal()))
    excess = over.data - NOTHING * diagonal[over.row] * diagonal[over.col]
    if over.nnz and excess.max() > 0.0:
        worst = int(excess.argmax())
        row, column = int(over.row[worst]), int(over.col[worst])
        where = (field, row, column) if isinstance(posted, list) else (field,)
        faults.append(
            Fault(
                pointer(where),
                f"not symmetric: {A[row, column]:.9g} in row {row}, column {column} (from 0), "
                f"{A[column, row]:.9g} in row {column}, column {row}",
            )
        )
    return csc_array((A + A.T) / 2)


def dense(A: csc_array[Any]) -> Floats:
    """A as an ordinary array."""
    return np.asarray(A.toarray(), dtype=float)
