"""From the bytes of an SWC file to numbers: encodings, line ends, columns. It knows nothing of trees."""

from __future__ import annotations

import codecs
import re
from array import array
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from morphology.findings import Finding, excerpt, listed, subject

COLUMNS = ("id", "kind", "x", "y", "z", "radius", "parent")
WHOLE = (0, 1, 6)  # the columns that must hold whole numbers
LARGEST_WHOLE = 2.0**53  # whole numbers beyond are not all told apart in double precision
NEEDS = "Each row needs seven columns: id kind x y z radius parent."
_DECIMAL_COMMA = re.compile(r"\d,\d")
_SEPARATOR = re.compile(r"\s*,\s*|\s+")
_CONTROL = re.compile(r"[\x00-\x08\x0e-\x1f]")


@dataclass(frozen=True, eq=False)
class Cells:
    """The numbers of a file as they stand.

    Attributes:
        values: (N, 7) the columns; NaN where a position or a radius is no number.
        lines: (N,) line of the file of each row, from 1.
        unread: for such a row, by its line: the column and the word found there.
        findings: what was odd in the text.
    """

    values: NDArray[np.float64]
    lines: NDArray[np.int64]
    unread: dict[int, tuple[str, str]] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()


def decode(data: bytes) -> tuple[str, list[Finding]]:
    """The text of a file (UTF-8, UTF-16 with its mark, else Latin-1), and what was odd about it."""
    for mark, encoding in (
        (codecs.BOM_UTF16_LE, "utf-16"),
        (codecs.BOM_UTF16_BE, "utf-16"),
        (codecs.BOM_UTF8, "utf-8-sig"),
    ):
        if data.startswith(mark):
            try:
                text = data.decode(encoding)
            except UnicodeDecodeError:
                break
            name = encoding.removesuffix("-sig").upper()
            return text, [
                Finding(
                    "bom",
                    "note",
                    1,
                    f"the file begins with a byte-order mark and was read as {name}",
                    "Nothing to do.",
                )
            ]
    try:
        return data.decode("utf-8"), []
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        message = "the file is not UTF-8 and was read as Latin-1, which matters for comments only"
        return data.decode("latin-1"), [Finding("latin-1", "note", line, message, "Nothing to do.")]


def parse(text: str) -> Cells:
    """The rows of an SWC text. Comment lines and blank lines may stand anywhere."""
    head = text[:65536]
    if "\x00" in text or len(_CONTROL.findall(head)) > len(head) // 50:
        line = text.count("\n", 0, max(text.find("\x00"), 0)) + 1
        return _none(
            [Finding("not-text", "error", line, "the file is not text", "Give the SWC file itself, unpacked.")]
        )
    findings = []
    text = text.removeprefix("\ufeff")
    if "\r" in text:
        text, note = _plain_line_ends(text)
        findings.append(note)
    lines = text.split("\n")
    numbers = [n for n, line in enumerate(lines, 1) if (bare := line.lstrip()) and bare[0] != "#"]
    if not numbers:
        message = "the file has no row" if text.strip() else "the file is empty"
        return _none([*findings, Finding("empty", "error", None, message, NEEDS)])
    bodies = [lines[n - 1] for n in numbers]
    values = _all_numbers(bodies, "," if "," in bodies[0].partition("#")[0] else None)
    if values is not None:
        return Cells(values, np.array(numbers, dtype=np.int64), {}, tuple(findings))
    cells = _one_by_one(bodies, numbers)
    return Cells(cells.values, cells.lines, cells.unread, (*findings, *cells.findings))


def _none(findings: list[Finding]) -> Cells:
    return Cells(np.empty((0, 7)), np.empty(0, dtype=np.int64), {}, tuple(findings))


def _plain_line_ends(text: str) -> tuple[str, Finding]:
    """The text with LF line ends; several CR before one LF are one line end, a lone CR is one too."""
    many, pairs = text.count("\r\r\n"), text.count("\r\n")
    plain = re.sub(r"\r+\n", "\n", text)
    lone = plain.count("\r")
    found = "CR CR LF" if many else "CR" if lone else "CR LF"
    where = "in some lines" if "\n" in plain and (many < pairs or lone) and found != "CR LF" else "throughout"
    if found == "CR LF" and pairs < text.count("\n"):
        where = "in some lines"
    return plain.replace("\r", "\n"), Finding(
        "line-ends", "note", None, f"line ends are {found} {where}", "Nothing to do."
    )


def _all_numbers(bodies: list[str], delimiter: str | None) -> NDArray[np.float64] | None:
    """(N, 7) the rows, if each is seven numbers, whole where due; None sends them to a closer look."""
    try:
        values = np.loadtxt(bodies, comments="#", delimiter=delimiter, ndmin=2)
    except (ValueError, OverflowError):
        return None
    if values.shape != (len(bodies), 7):
        return None
    whole = values[:, WHOLE]
    sound = np.isfinite(whole).all() and (np.abs(whole) < LARGEST_WHOLE).all() and (whole == np.floor(whole)).all()
    return values if sound else None


def _number(token: str) -> float | None:
    """The number a token says; None if it says none. Python's extras (1_000, other digits) are no SWC."""
    if "_" in token or not token.isascii():
        return None
    try:
        return float(token)
    except ValueError:
        return None


@dataclass
class _Oddities:
    """Lines of the careful reading by what is wrong with them; the first of each with a sample."""

    short: list[tuple[int, int]] = field(default_factory=list)
    comma: list[tuple[int, str]] = field(default_factory=list)
    no_number: list[tuple[int, str]] = field(default_factory=list)
    not_whole: list[tuple[int, str]] = field(default_factory=list)
    long: list[tuple[int, int]] = field(default_factory=list)


def _one_by_one(bodies: list[str], numbers: list[int]) -> Cells:
    rows, lines = array("d"), array("q")
    unread: dict[int, tuple[str, str]] = {}
    odd = _Oddities()
    for body, line in zip(bodies, numbers, strict=True):
        body = body.partition("#")[0]
        if "," in body and _has_decimal_comma(body):
            odd.comma.append((line, body.strip()))
            continue
        # an empty field between two commas stays a field: dropping it would shift the columns
        tokens = _SEPARATOR.split(body.strip().removesuffix(",").rstrip()) if "," in body else body.split()
        if len(tokens) < 7:
            odd.short.append((line, len(tokens)))
            continue
        if len(tokens) > 7:
            odd.long.append((line, len(tokens)))
        row = _row(tokens, line, unread, odd)
        if row is not None:
            rows.extend(row)
            lines.append(line)
    values = np.array(rows, dtype=np.float64).reshape(-1, 7)
    return Cells(values, np.array(lines, dtype=np.int64), unread, tuple(_described(odd, len(bodies))))


def _has_decimal_comma(body: str) -> bool:
    """Whether blanks alone make seven columns and a comma stands inside one of them, as in 0,5."""
    tokens = body.split()
    return len(tokens) >= 7 and any(_DECIMAL_COMMA.search(t) for t in tokens)


def _row(tokens: list[str], line: int, unread: dict[int, tuple[str, str]], odd: _Oddities) -> list[float] | None:
    """The seven numbers of a row; None where its id, kind or parent cannot be told."""
    row = []
    for column, token in enumerate(tokens[:7]):
        number = _number(token)
        if column in WHOLE:
            if number is None:
                odd.no_number.append((line, token))
                return None
            if not abs(number) < LARGEST_WHOLE or number != int(number):
                odd.not_whole.append((line, token))
                return None
        elif number is None:
            unread.setdefault(line, (COLUMNS[column], token))
            number = np.nan
        row.append(number)
    return row


def _described(odd: _Oddities, total: int) -> list[Finding]:
    findings = []
    widths = {n for _, n in odd.long}
    ragged = bool(odd.long) and (len(odd.long) < total or len(widths) > 1)
    uneven = sorted(odd.short + (odd.long if ragged else []))
    if uneven:
        line, n = uneven[0]
        message = (
            f"{subject(len(uneven), 'do', 'does', 'line')} not have seven columns "
            f"(lines {listed([at for at, _ in uneven])}); line {line} has {n}"
        )
        findings.append(Finding("column-count", "error", line, message, f"{NEEDS} A comment begins with #."))
    elif odd.long:
        line, n = odd.long[0]
        message = f"every row has {n} columns where SWC has seven; those from the eighth on were ignored"
        findings.append(
            Finding(
                "extra-columns",
                "warning",
                line,
                message,
                "Check that the first seven are id kind x y z radius parent.",
            )
        )
    if odd.comma:
        line, body = odd.comma[0]
        message = f"{subject(len(odd.comma), 'have', 'has', 'line')} a decimal comma: {excerpt(body, 40)}"
        findings.append(Finding("decimal-comma", "error", line, message, "Write decimal points."))
    if odd.no_number:
        line, token = odd.no_number[0]
        n = len(odd.no_number)
        message = f"{subject(n, 'hold', 'holds', 'line')} {excerpt(token)} where a number is due"
        findings.append(Finding("not-a-number", "error", line, message, f"{NEEDS} A comment begins with #."))
    if odd.not_whole:
        line, token = odd.not_whole[0]
        n = len(odd.not_whole)
        message = f"{subject(n, 'have', 'has', 'line')} an id, kind or parent that is not whole: {excerpt(token)}"
        findings.append(Finding("not-whole", "error", line, message, "Write ids, kinds and parents as whole numbers."))
    return findings
