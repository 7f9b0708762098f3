"""What one cell holds: text, a number, a number with its unit, true or false, or a list of them."""

import re

from schemas.sheet.columns import Content

LIST = "|"
LONGEST_QUANTITY = 96
# Text that a spreadsheet would run as a formula, that would open a block, or that is protected.
_PROTECTED = ("'", "=", "+", "-", "@", "[", "\t", "\r")

_DIGITS = r"[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d+)?"
_NUMBER = re.compile(_DIGITS, re.ASCII)
_NUMBER_AND_UNIT = re.compile(rf"({_DIGITS})\s*((?!['’]\d)[^\d\s.,+\-].*)", re.ASCII | re.DOTALL)
_GROUPED = re.compile(r"[+-]?\d{1,3}(?:[.,'’ \u00a0\u202f]\d{3})+(?:[.,]\d+)?(?!\d).*", re.ASCII)
_LONGEST_WHOLE = 15  # digits that a double holds exactly


class Unreadable(ValueError):
    """A cell doesn't hold what its column needs; the message says why."""


def is_blank(cell: str) -> bool:
    """Whether nothing stands in a cell."""
    return not cell or cell.isspace()


def protected(text: str) -> str:
    """`text` as a cell that no spreadsheet runs as a formula, and that is read back as `text`.

    >>> protected("=1+1"), protected(" a"), protected("")
    ("'=1+1", "' a", "'")
    """
    return f"'{text}" if _needs_protection(text) else text


def _needs_protection(text: str) -> bool:
    at_an_end = text != text.strip() or f" {LIST}" in text or f"{LIST} " in text
    return not text or text.startswith(_PROTECTED) or at_an_end


def plain(cell: str) -> tuple[str, bool]:
    """The text of a cell, and whether it was protected and so counts to the last space."""
    if cell.startswith("'") and _needs_protection(cell[1:]):
        return cell[1:], True
    return cell.strip(), False


class CellReader:
    """Reads the cells of one column.

    Parameters
    ----------
    content : what the column holds
    decimal_comma : whether a comma may stand for the point
    unit : the unit in the header
    """

    def __init__(self, content: Content, decimal_comma: bool, unit: str | None = None) -> None:
        self._content = content
        self._items = content.items if content.listed else None
        self._scalar = content.scalar
        self._decimal_comma = decimal_comma
        self._unit = unit

    def read(self, cell: str) -> object:
        """The value of a cell that isn't blank, as JSON would have given it.

        Raises
        ------
        Unreadable
        """
        text, exact = plain(cell)
        items = self._items
        if items is None or (self._scalar and LIST not in text):
            return self._one(text, self._content)
        if not text:
            return []
        return [self._one(part if exact else part.strip(), items) for part in text.split(LIST)]

    def _one(self, text: str, content: Content) -> object:
        if content.boolean and text.lower() in ("true", "false"):
            return text.lower() == "true"
        if content.text and not content.number:
            return text
        value = self._number(text)
        if content.whole and isinstance(value, float) and value.is_integer():
            return int(value)
        return value

    def _number(self, text: str) -> object:
        if len(text) > LONGEST_QUANTITY:
            return text
        if _NUMBER.fullmatch(text):
            number = self._point(text)
            return f"{number} {self._unit}" if self._unit else _value(number)
        with_unit = _NUMBER_AND_UNIT.fullmatch(text)
        if with_unit and self._unit:
            raise Unreadable(f"the unit stands in the header already: [{self._unit}]")
        if with_unit:
            return f"{self._point(with_unit[1])} {with_unit[2]}"
        if _GROUPED.fullmatch(text):
            raise Unreadable("separators of thousands aren't read: write 12345.6")
        return text

    def _point(self, number: str) -> str:
        if "," not in number:
            return number
        if not self._decimal_comma:
            raise Unreadable(
                "a decimal comma is read only where cells are separated by semicolons or tabs: "
                "write a point"
            )
        return number.replace(",", ".")


def _value(number: str) -> int | float:
    if len(number) <= _LONGEST_WHOLE and number.lstrip("+-").isdigit():
        return int(number)
    return float(number)
