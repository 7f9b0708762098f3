"""From bytes to rows of cells."""

import csv
import re
from collections.abc import Iterator
from email.message import Message
from io import StringIO

from schemas.faults import Fault, Malformed
from schemas.sheet.places import Place

MOST_CELLS = 4_000_000  # blank ones counted
MOST_BROKEN_ROWS = 100
TAB_SEPARATED = "text/tab-separated-values"
_CODECS = {
    "": "utf-8-sig",
    "utf-8": "utf-8-sig",
    "utf8": "utf-8-sig",
    "us-ascii": "utf-8-sig",
    "utf-16": "utf-16",
    "utf-16le": "utf-16le",
    "utf-16be": "utf-16be",
    "iso-8859-1": "cp1252",  # what programs mean by it (WHATWG Encoding Standard)
    "windows-1252": "cp1252",
}
_UTF_16_MARKS = (b"\xff\xfe", b"\xfe\xff")
_BLOCK_LINE = re.compile(r'\s*"?\[[^\[\]]{1,80}\]"?[ ]*(.?)')
_QUOTED_OR_IN_BRACKETS = re.compile(r'"[^"]*"|\[[^\[\]]*\]')
_SEPARATOR = re.compile(r"[,;\t]")


def read_rows(data: bytes, content_type: str) -> tuple[list[list[str]], str]:
    """The rows of a sheet, blank ones included, and the separator of its cells.

    Raises
    ------
    Malformed
        Bytes that are no text, broken quotes, too many cells; each fault names row and column.
    """
    header = Message()
    header["Content-Type"] = content_type
    tabs = header.get_content_type() == TAB_SEPARATED
    text = _decoded(data, str(header.get_param("charset") or "").lower(), tabs)
    separator = "\t" if tabs else separator_of(text)
    return _rows(text, separator), separator


def _decoded(data: bytes, charset: str, tabs: bool) -> str:
    if not data.strip():
        raise Malformed([Fault("", "the body is empty: a sheet is expected")])
    if charset not in _CODECS:
        raise Malformed([Fault("", f"the charset '{charset[:32]}' isn't known: send UTF-8")])
    codec = "utf-16" if data.startswith(_UTF_16_MARKS) else _CODECS[charset]
    try:
        text = data.decode(codec)
    except UnicodeDecodeError as error:
        raise Malformed([_undecodable(data, codec, error.start, tabs)]) from None
    if "\0" in text[:2]:
        raise Malformed([Place(1, 1).fault(_UNMARKED)])
    return text


_UNMARKED = "this looks like UTF-16 without a byte order mark: send UTF-8"


def _undecodable(data: bytes, codec: str, offset: int, tabs: bool) -> Fault:
    before = data[:offset].decode(codec, "ignore") + "?"  # the cell that the byte stands in
    separator = "\t" if tabs else separator_of(before)
    try:
        *above, row = csv.reader(StringIO(before, newline=""), delimiter=separator)
    except csv.Error:  # a cell before it is too long
        above, row = [], [""]
    detail = f"byte {offset} can't be read as {codec.removesuffix('-sig').upper()}"
    if codec == "utf-8-sig":
        letter = data[offset : offset + 1].decode("cp1252", "replace")
        detail += (
            f" (in Windows-1252 it would be '{letter}'): save the sheet as UTF-8, or send "
            "`charset=windows-1252` in the content type"
        )
    return Place(len(above) + 1, len(row)).fault(detail)


def separator_of(text: str) -> str:
    """What separates the cells, from the first row that shows it: that of a block or a header.

    >>> separator_of("[bodies];;")
    ';'
    >>> separator_of('[bodies]\\nname,"mass [lb;oz]"')
    ','
    """
    header = False
    for line in StringIO(text, newline=""):
        if not line.strip(',;\t"\r\n '):
            continue
        block = _BLOCK_LINE.match(line)
        outside = block[1] if block else ""
        if header and not block:
            outside = _QUOTED_OR_IN_BRACKETS.sub("", line)
        found = _SEPARATOR.search(outside)
        if found:
            return found[0]
        header = block is not None
    return ","


class _Lines:
    """The lines of a text; `record` holds those of the record that is being read."""

    def __init__(self, text: str) -> None:
        self._lines = StringIO(text, newline="")
        self.record: list[str] = []

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        line = next(self._lines)
        self.record.append(line)
        return line


def _rows(text: str, separator: str) -> list[list[str]]:
    lines = _Lines(text)
    reader = csv.reader(lines, delimiter=separator, strict=True, skipinitialspace=True)
    rows: list[list[str]] = []
    faults: list[Fault] = []
    cells = 0
    while len(faults) < MOST_BROKEN_ROWS:
        try:
            rows.append(next(reader))
        except StopIteration:
            break
        except csv.Error:
            rows.append([])
            faults.append(_broken("".join(lines.record), separator, len(rows)))
        cells += len(rows[-1]) or 1
        if cells > MOST_CELLS:
            place = Place(len(rows), max(len(rows[-1]), 1))
            raise Malformed([place.fault(f"the sheet has more than {MOST_CELLS:,} cells")])
        lines.record.clear()
    if faults:
        raise Malformed(faults)
    return rows


def _broken(record: str, separator: str, row: int) -> Fault:
    """What is wrong with a record that can't be read, at its cell."""
    column, begin = 1, 0
    longest = csv.field_size_limit()
    cell = re.compile(
        rf' *(?:"(?:[^"]|"")*+"|(?!")[^{re.escape(separator)}\r\n]*+)(?={separator}|[\r\n]|$)'
    )
    while match := cell.match(record, begin):
        if len(match[0]) > longest:
            return Place(row, column).fault(f"a cell has at most {longest:,} characters")
        if match.end() >= len(record) or record[match.end()] != separator:
            break
        begin = match.end() + 1
        column += 1
    return Place(row, column).fault(
        "a quote is opened and not closed, or text follows where it closes; a quote within quotes "
        'is written twice, ""'
    )
