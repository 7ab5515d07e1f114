"""A text table from the bytes of a file: encoding, comments, delimiter, header, rows of equal width.

Whatever the bytes are, the answer is a :class:`TextTable` or one :class:`~soiltemp.errors.DataFileError`.

A plain body (ASCII, no comments, every row of the right width, quotation marks around whole cells only) is cut into
cells by the places of its delimiters, a column at a time: forty years of hours in a tenth of a second. Any other body
goes through the `csv` module row by row, which also finds the line of a fault.
"""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.moments import show_value
from soiltemp.errors import DataFileError, message

__all__ = ["Cells", "TextTable", "is_number", "read_numbers", "read_table"]

Cells = Sequence[str] | npt.NDArray[np.str_]
"""Cells of one column: an array where the body is plain, else a list."""

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


_MISSING_WORDS = frozenset(
    [
        "na",
        "n/a",
        "nan",
        "null",
        "none",
        "nil",
        "nodata",
        "m",
        "missing",
        "-",
        "--",
        "---",
        ".",
        "#n/a",
        "#value!",
        "#div/0!",
        "#num!",
    ]
)
_SAMPLE = 50  # rows from which the kind of a column is told
_WIDEST = 64  # letters of a cell that is cut out by places; wider ones would make the arrays huge


@dataclass(frozen=True)
class TextTable:
    """Cells of a delimited text file, as text, and where each row stands in the file."""

    source: str
    comments: tuple[str, ...]
    header: tuple[str, ...]
    sample: tuple[tuple[str, ...], ...]
    """The first rows."""
    lines: npt.NDArray[np.int64]
    delimiter: str
    notes: tuple[str, ...]
    cells: Callable[[int], Cells]

    def column(self, index: int) -> Cells:
        """Cells of one column, blanks at both ends removed."""
        cells = self.cells(index)
        if isinstance(cells, np.ndarray):
            return np.strings.strip(cells)
        return [cell.strip() for cell in cells]

    def without_first_row(self) -> TextTable:
        """The table without its first row."""
        return replace(self, sample=self.sample[1:], lines=self.lines[1:], cells=lambda index: self.cells(index)[1:])

    @property
    def decimal_comma(self) -> bool:
        """Whether numbers may be written with a comma: where the comma does not separate columns."""
        return self.delimiter != ","


def is_number(text: str) -> bool:
    """Whether `text` is a plain decimal number (no spaces, underscores or words)."""
    return _NUMBER.fullmatch(text) is not None


def read_table(data: bytes, source: str, *, header: Sequence[str] = ()) -> TextTable:
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
    header : sequence of str
        Names of the columns of a file known to have no header line.

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
    >>> table.header, table.sample
    (('date', 't [degC]'), (('2020-01-01', '-3.5'),))
    """
    text, notes = _decode(data, source)
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    is_whole = text.endswith("\n")
    comments, header_line, body_start, body = _split_header(text, source)
    delimiter = _find_delimiter(header_line, body, source)
    if header:
        header_line, body, body_start = delimiter.join(header), f"{header_line}\n{body}", body_start - 1
    plain = _plain_cells(header_line, body, delimiter)
    if plain is not None:
        names, count, cells = plain
        lines = body_start + np.arange(count, dtype=np.int64)
        sample = _split(body.split("\n", _SAMPLE)[:_SAMPLE], delimiter)
        tail = _split(body.rstrip("\n").rsplit("\n", _SAMPLE + 1)[-_SAMPLE - 1 :], delimiter)
    else:
        names, rows, numbers = _cells(header_line + "\n" + body, delimiter, source, body_start)
        lines = np.asarray(numbers, dtype=np.int64)
        sample, tail = rows[:_SAMPLE], rows[-_SAMPLE - 1 :]

        def cells(index: int) -> list[str]:
            return [row[index] for row in rows]

    _check_header(names, source, body_start - 1)
    if not lines.size:
        found = "a header line and no rows below it"
        raise DataFileError(message(source, found, "at least two rows of data", "check that the export is complete"))
    if not is_whole:
        _check_last_line(names, tail, int(lines[-1]), source)
        notes.append("the last line has no line end; it is complete, and is used")
    if plain is None:
        _check_width(names, rows, numbers, source)
    return TextTable(source, tuple(comments), names, tuple(sample), lines, delimiter, tuple(notes), cells)


def _split(lines: Sequence[str], delimiter: str) -> list[tuple[str, ...]]:
    """Cells of a few good lines."""
    return [tuple(row) for row in csv.reader([line for line in lines if line], delimiter=delimiter)]


def _plain_cells(header: str, body: str, delimiter: str) -> tuple[tuple[str, ...], int, Callable[[int], Cells]] | None:
    """Names, number of rows and columns of a plain body, by the places of the delimiters; None if it is not plain."""
    try:
        (names,) = csv.reader([header], delimiter=delimiter, strict=True)
    except (csv.Error, ValueError):
        return None
    between = len(names) - 1
    if not body.isascii() or "#" in body or between == 0 or not header.strip(f"{delimiter} \t"):
        return None
    text = np.frombuffer(body.rstrip("\n").encode("ascii") + b"\n", dtype=np.uint8)
    ends = np.flatnonzero(text == ord("\n"))
    marks = np.flatnonzero(text == ord(delimiter))
    if text.size == 1 or marks.size != between * ends.size:
        return None
    starts = np.concatenate([[0], ends[:-1] + 1])
    inner = marks.reshape(ends.size, between)  # each row's own, if all rows have as many as the header
    if np.any(inner[:, 0] < starts) or np.any(inner[:, -1] > ends):
        return None
    is_ink = (text > ord(" ")) & (text != ord(delimiter))
    if np.add.reduceat(is_ink, starts, dtype=np.int64).min() == 0:
        return None  # a blank row, which the other way drops
    first, after = np.column_stack([starts, inner + 1]), np.column_stack([inner, ends])
    if '"' in body:
        is_quote = text == ord('"')
        quoted = is_quote[first] & (after - first > 1)
        paired = np.array_equal(quoted, quoted & is_quote[after - 1])
        if not paired or np.count_nonzero(is_quote) != 2 * np.count_nonzero(quoted):
            return None  # a quotation mark inside a cell, or alone
        first, after = first + quoted, after - quoted
    names = [name.strip() for name in names]
    return tuple(names), ends.size, lambda index: _cut_out(text, first[:, index], after[:, index])


def _cut_out(text: npt.NDArray[np.uint8], first: npt.NDArray[np.int64], after: npt.NDArray[np.int64]) -> Cells:
    """The pieces of an ASCII text from `first` to before `after`."""
    lengths = after - first
    width = max(int(lengths.max()), 1)
    if width > _WIDEST:
        data = text.tobytes().decode("ascii")
        return [data[a:b] for a, b in zip(first.tolist(), after.tolist(), strict=True)]
    places = first[:, None] + np.arange(width)
    letters = text[np.minimum(places, text.size - 1)]
    letters[np.arange(width) >= lengths[:, None]] = 0
    cells: npt.NDArray[np.str_] = letters.astype(np.uint32).view(f"U{width}")[:, 0]
    return cells


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


def _check_last_line(header: tuple[str, ...], rows: Sequence[tuple[str, ...]], line: int, source: str) -> None:
    """Refuse a last line, without line end, that is shorter than its neighbours: the file broke off there."""
    last, before = rows[-1], rows[-_SAMPLE - 1 : -1]
    where = f"{source}, line {line}"
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


def read_numbers(
    cells: Cells,
    lines: npt.NDArray[np.int64],
    source: str,
    column: str,
    missing_words: Sequence[str] = (),
    *,
    decimal_comma: bool = False,
) -> npt.NDArray[np.float64]:
    """Numbers of a column, NaN where the cell is empty or says that there is none.

    Parameters
    ----------
    cells : sequence of str
        The cells, without blanks at their ends.
    lines : array of int
        Line of the file of each, for the message.
    source, column : str
        File and column, for the message.
    missing_words : sequence of str
        Words that stand for "no value", beside the usual ones.
    decimal_comma : bool
        Whether numbers may be written with a comma.

    Returns
    -------
    array of float

    Raises
    ------
    DataFileError
        The first cell that is neither.
    """
    words = _MISSING_WORDS | {word.lower() for word in missing_words}
    codes, known = pd.factorize(np.asarray(cells, dtype=object))  # each text once: records repeat their numbers
    comma = decimal_comma and any("," in cell for cell in known)
    values = np.full(len(known), np.nan)
    is_read = np.ones(len(known), dtype=bool)
    for number, cell in enumerate(known):
        text = cell.replace("\u2212", "-")
        if comma:
            text = text.replace(",", ".") if "." not in text else text + ","  # a point beside commas is no number
        if is_number(text) and math.isfinite(float(text)):
            values[number] = float(text)
        elif cell and cell.lower() not in words:
            is_read[number] = False
    if not is_read.all():
        row = int(np.flatnonzero(~is_read[codes])[0])
        allowed = "a number" + (" with decimal comma" if comma else "") + ", an empty cell or NA"
        remedy = "correct the line, or name the mark in missing_values"
        place = f'{source}, line {lines[row]}, column "{column}"'
        raise DataFileError(message(place, show_value(cells[row]), allowed, remedy))
    return values[codes]
