"""A text table from the bytes of a file: encoding, comments, delimiter, header, rows of equal width.

Whatever the bytes are, the answer is a :class:`TextTable` or one :class:`~soiltemp.errors.DataFileError`.
"""

from __future__ import annotations

import csv
import io
import re
from dataclasses import dataclass

from soiltemp.climate.moments import show_value
from soiltemp.errors import DataFileError, message

__all__ = ["TextTable", "is_number", "read_table"]

_EXPORT = "export the record again as plain text with one header line"
_SIGNATURES = (
    (b"PK\x03\x04", "a zip archive (or a spreadsheet workbook)"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"%PDF", "a PDF document"),
    (b"\xd0\xcf\x11\xe0", "an old spreadsheet workbook"),
    (b"\x89PNG", "a PNG picture"),
)
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_DECIMALS = re.compile(r"[.,]([0-9]+)$")
_DELIMITERS = ((";", "semicolon"), ("\t", "tab"), (",", "comma"))
_NAMES = dict(_DELIMITERS)


@dataclass(frozen=True)
class TextTable:
    """Cells of a delimited text file, as text, and where each row stands in the file."""

    source: str
    comments: tuple[str, ...]
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    lines: tuple[int, ...]
    delimiter: str
    notes: tuple[str, ...]

    def column(self, index: int) -> list[str]:
        """Cells of one column, blanks at both ends removed."""
        return [row[index].strip() for row in self.rows]

    @property
    def decimal_comma(self) -> bool:
        """Whether numbers may be written with a comma: where the comma does not separate columns."""
        return self.delimiter != ","


def is_number(text: str) -> bool:
    """Whether `text` is a plain decimal number (no spaces, underscores or words)."""
    return _NUMBER.fullmatch(text) is not None


def read_table(data: bytes, source: str) -> TextTable:
    r"""Read a delimited text file held in memory.

    Lines before the header that start with ``#`` are comments; the first line after them names the columns.
    The columns are separated by semicolons, tabs or commas. UTF-8, UTF-16 with a byte order mark and Latin-1
    are read.

    Parameters
    ----------
    data : bytes
        Content of the file.
    source : str
        Name of the file, for messages.

    Returns
    -------
    TextTable
        Header, rows and the notes that a quality report should carry.

    Raises
    ------
    DataFileError
        Empty, binary, a web page, no header, no delimiter, rows of unequal width, or cut short.

    Examples
    --------
    >>> table = read_table(b"# made up\ndate,t [degC]\n2020-01-01,-3.5\n", "a.csv")
    >>> table.header, table.rows
    (('date', 't [degC]'), (('2020-01-01', '-3.5'),))
    """
    text, notes = _decode(data, source)
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    ends_with_line_end = text.endswith("\n")
    comments, header_line, body_start, body = _split_header(text, source)
    delimiter = _find_delimiter(header_line, body, source)
    header, rows, lines = _cells(header_line + "\n" + body, delimiter, source, body_start)
    _check_header(header, source, body_start - 1)
    if not rows:
        found = "a header line and no rows below it"
        raise DataFileError(message(source, found, "at least two rows of data", "check that the export is complete"))
    if not ends_with_line_end:
        _check_last_line(header, rows, lines, source)
        notes.append("the last line has no line end; it is complete, and is used")
    _check_width(header, rows, lines, source)
    return TextTable(source, tuple(comments), header, tuple(rows), tuple(lines), delimiter, tuple(notes))


def _decode(data: bytes, source: str) -> tuple[str, list[str]]:
    """Text of `data`, and notes on how it was decoded."""
    allowed = "delimited text (CSV) or NetCDF"
    if not data.strip(b" \t\r\n\x00"):
        found = "an empty file" if not data else "a file of blanks only"
        raise DataFileError(message(source, found, allowed, "check that the download or export has finished"))
    for magic, kind in _SIGNATURES:
        if data.startswith(magic):
            raise DataFileError(message(source, kind, allowed, "unpack it, or export the record as CSV text"))
    if re.match(rb"(\xef\xbb\xbf)?\s*<(!doctype|html|\?xml|head|body)", data[:200], re.IGNORECASE):
        remedy = "download the data file itself (the server may have sent a page with an error or a log-in)"
        raise DataFileError(message(source, "a web page or XML", allowed, remedy))
    notes: list[str] = []
    try:
        if data.startswith((b"\xff\xfe", b"\xfe\xff")):
            text = data.decode("utf-16")
            notes.append("text in UTF-16")
        else:
            _refuse_nul(data, source, allowed)
            text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        if data.startswith((b"\xff\xfe", b"\xfe\xff")):
            found = f"bytes that are not UTF-16 text, from byte {error.start} on"
            raise DataFileError(message(source, found, allowed, "save the file as UTF-8 text")) from error
        text = data.decode("latin-1")
        notes.append("text is not UTF-8; read as Latin-1")
    bad = re.search("[\x00-\x08\x0e-\x1f\x7f-\x9f]", text)
    if bad is not None:
        line = text.count("\n", 0, bad.start()) + 1
        found = f"a control character (code {ord(bad.group())}), which text does not hold"
        raise DataFileError(message(f"{source}, line {line}", found, allowed, _EXPORT))
    return text, notes


def _refuse_nul(data: bytes, source: str, allowed: str) -> None:
    first = data.find(b"\x00")
    if first < 0:
        return
    if data.count(b"\x00") > 0.3 * len(data):
        found, remedy = (
            "NUL bytes between the letters (UTF-16 text without its mark?)",
            "save the file as UTF-8 text",
        )
    else:
        found = f"a NUL byte at byte {first}, as in a binary file or one whose writing broke off"
        remedy = "export or download the file again"
    raise DataFileError(message(f"{source}, line {data.count(bytes([10]), 0, first) + 1}", found, allowed, remedy))


def _split_header(text: str, source: str) -> tuple[list[str], str, int, str]:
    """Comments, header line, file line number of the first body line, and body."""
    comments: list[str] = []
    position, number = 0, 0
    while position < len(text):
        end = text.find("\n", position)
        end = len(text) if end < 0 else end
        line = text[position:end]
        number += 1
        position = end + 1
        if line.lstrip().startswith("#"):
            comments.append(line.lstrip().lstrip("#").strip())
        elif line.strip():
            return comments, line, number + 1, text[position:]
    raise DataFileError(
        message(
            source,
            "comment lines only",
            "a header line and rows of data",
            "check that the export is complete",
        )
    )


def _find_delimiter(header: str, body: str, source: str) -> str:
    sample = [line for line in body[:20000].split("\n")[:50] if line.strip() and not line.startswith("#")]
    present = [(mark, name) for mark, name in _DELIMITERS if mark in header]
    for mark, _ in present:
        width = header.count(mark)
        if sample and sum(line.count(mark) == width for line in sample) > 0.5 * len(sample):
            return mark
    if present:
        return present[0][0]
    allowed = "columns separated by commas, semicolons or tabs, named in the first line that is not a comment"
    found = f"the line {show_value(header)} with one column only"
    raise DataFileError(message(source, found, allowed, _EXPORT))


def _cells(
    text: str, delimiter: str, source: str, body_start: int
) -> tuple[tuple[str, ...], list[tuple[str, ...]], list[int]]:
    """Header cells, rows, and the file line of each row; blank and comment lines dropped."""
    reader = csv.reader(io.StringIO(text), delimiter=delimiter, strict=True)
    rows: list[tuple[str, ...]] = []
    lines: list[int] = []
    fault: object = None
    previous = 0
    try:
        for cells in reader:
            line = body_start - 2 + reader.line_num
            if reader.line_num != previous + 1:
                break
            previous = reader.line_num
            if cells and not cells[0].startswith("#") and any(cell and not cell.isspace() for cell in cells):
                rows.append(tuple(cells))
                lines.append(line)
    except csv.Error as error:
        fault = error
    if fault is not None or reader.line_num != previous:
        reason = show_value(fault or "a quoted cell runs over several lines", 80).strip('"')
        where = f"{source}, line {body_start - 1 + previous}"
        allowed = "one row a line, quotation marks in pairs"
        raise DataFileError(message(where, f"a cell that cannot be read ({reason})", allowed, _EXPORT))
    if not rows:
        found = "a line of delimiters where the column names should stand"
        raise DataFileError(message(source, found, "a header line that names the columns", _EXPORT))
    header = tuple(cell.strip() for cell in rows[0])
    return header, rows[1:], lines[1:]


def _check_header(header: tuple[str, ...], source: str, line: int) -> None:
    named = [name for name in header if name]
    if any(is_number(name.replace(",", ".")) for name in named) or (named and all(name[0].isdigit() for name in named)):
        found = f"the values {show_value(', '.join(header))} where the column names should stand"
        allowed = "a header line that names the columns"
        raise DataFileError(message(f"{source}, line {line}", found, allowed, "put the column names in the first line"))


def _check_width(header: tuple[str, ...], rows: list[tuple[str, ...]], lines: list[int], source: str) -> None:
    width = len(header)
    for row, line in zip(rows, lines, strict=True):
        if len(row) != width:
            last = line == lines[-1]
            remedy = "the file was cut short: download or export it again" if last else "correct or delete the line"
            found = f"{len(row)} cells ({show_value(', '.join(row))})"
            allowed = f"{width} cells, as in the header"
            raise DataFileError(message(f"{source}, line {line}", found, allowed, remedy))


def _check_last_line(header: tuple[str, ...], rows: list[tuple[str, ...]], lines: list[int], source: str) -> None:
    """Refuse a last line, without line end, that is shorter than its neighbours: the file broke off there."""
    last, before = rows[-1], rows[-51:-1]
    where = f"{source}, line {lines[-1]}"
    remedy = "the file was cut short: download or export it again, or delete the last line"
    if len(last) < len(header):
        found = f"{len(last)} cells ({show_value(', '.join(last))}) and no line end"
        raise DataFileError(message(where, found, f"{len(header)} cells, as in the header", remedy))
    if not before or len(last) != len(header):
        return
    cell = last[-1].strip()
    others = [row[-1].strip() for row in before if len(row) == len(last) and row[-1].strip()]
    if not others:
        return
    fewest = min(_decimals(other) for other in others)
    numeric = all(is_number(other.replace(",", ".")) for other in others)
    same_length = len({len(other) for other in others}) == 1
    if (numeric and _decimals(cell) < fewest) or (not numeric and same_length and len(cell) < len(others[0])):
        found = f"{show_value(cell)} in the last cell and no line end"
        raise DataFileError(message(where, found, f"a whole value like {show_value(others[-1])}", remedy))


def _decimals(cell: str) -> int:
    match = _DECIMALS.search(cell)
    return len(match.group(1)) if match else 0
