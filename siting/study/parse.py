"""Turn the text of one cell into what its column holds, or say in words why not."""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass

from siting.cells import is_plain_number, number_text
from siting.study.columns import Column, Kind
from siting.study.gathering import nearest

UNLIMITED = "unlimited"

YES = frozenset({"yes", "true", "1"})
NO = frozenset({"no", "false", "0"})

_THOUSANDS_COMMA = re.compile(r"-?[0-9]{1,3}(,[0-9]{3})+(\.[0-9]+)?")
_THOUSANDS_OTHER = re.compile(r"-?[0-9]{1,3}(['\u2019\s][0-9]{3})+([.,][0-9]+)?")
_THOUSANDS_POINT = re.compile(r"-?[0-9]{1,3}(\.[0-9]{3})+,[0-9]+|-?[0-9]{1,3}(\.[0-9]{3}){2,}")
_DECIMAL_COMMA = re.compile(r"-?[0-9]+,[0-9]+")
_DOUBTFUL = re.compile(r"-?[1-9][0-9]{0,2}[.,][0-9]{3}")
_PER_CENT = re.compile(r"(-?[0-9]+(?:[.,][0-9]+)?)\s*%")
_CURRENCY = re.compile(r"[^\W\d_]{3}\s?-?[0-9].*|.*[0-9]\s?[^\W\d_]{3}|.*[€$£¥].*")
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f]")
_UNSEEN = frozenset({"Cc", "Zl", "Zp", "Zs"})
"""Unicode categories of control characters, of separators of lines and paragraphs, and of blanks."""

_MONTHS = r"(?:jan|feb|mar|apr|may|jun|jul|aug|sep|oct|nov|dec)[a-z]*"
_DATE = re.compile(
    rf"[0-9]{{4}}-[0-9]{{1,2}}-[0-9]{{1,2}}(?:[T ].*)?|[0-9]{{1,2}}[./-][0-9]{{1,2}}[./-](?:[0-9]{{2}}|[0-9]{{4}})"
    rf"|[0-9]{{1,2}}[-. ]+{_MONTHS}(?:[-. ]+[0-9]{{2,4}})?|{_MONTHS}[-. ]+[0-9]{{1,4}}"
    rf"|[0-9]{{1,2}}:[0-9]{{2}}(?::[0-9.]+)?",
    re.IGNORECASE,
)
"""Dates and times of day, as text or as a sheet's date cells become text."""

_NOT_FINITE = frozenset({"nan", "inf", "-inf", "+inf", "infinity", "-infinity", "+infinity"})


@dataclass(frozen=True, slots=True)
class Refusal:
    """Why a value is refused."""

    wrong: str
    repair: str


def parse_text(column: Column, text: str) -> str | Refusal:
    """Return the text, or a refusal where a name has blanks around it or cannot be told apart from another."""
    if column.kind is not Kind.NAME:
        return check_text(text) or text
    if text != text.strip():
        return Refusal("the name begins or ends with a blank", f"Write {text.strip()!r}")
    if any(unicodedata.category(letter) in _UNSEEN and letter != " " for letter in text):
        return Refusal("the name holds a line break or an unusual blank", "Retype the name")
    return text


def check_text(text: str) -> Refusal | None:
    """Return why a text cannot be kept: a workbook holds no control characters, line breaks and tabs aside."""
    if _CONTROL.search(text):
        return Refusal("the text holds a control character", "Retype the text")
    return None


def parse_number(column: Column, text: str) -> float | Refusal:
    """
    Return a number in the range of its column, or why the text is none.

    Parameters
    ----------
    column
        Says the range and whether `unlimited` may be typed.
    text
        As typed, not blank.

    Returns
    -------
    number
        In the unit of the column; infinity for `unlimited`.
    """
    if text == UNLIMITED and column.unlimited:
        return math.inf
    if not is_plain_number(text):
        return _not_a_number(column, text)
    value = float(text)
    if not math.isfinite(value):
        return Refusal("not a finite number", "Write a number that is smaller than 1e308")
    return value if column.pair else in_range(column, value)


def in_range(column: Column, value: float) -> float | Refusal:
    """Return the number, or a refusal where it is outside the range of its column or not whole where it must be."""
    too_low = column.low is not None and (value <= column.low if column.low_open else value < column.low)
    too_high = column.high is not None and (value >= column.high if column.high_open else value > column.high)
    if too_high and column.fraction:
        top = "below 1" if column.high_open else "of at most 1"
        or_all = ", or 0.9999 where nearly all is meant" if value == 1 else ""
        repair = f"Write {number_text(value)} % as {value / 100:.6g}{or_all}"
        return Refusal(f"a share is a fraction {top}, got {number_text(value)}", repair)
    if too_low or too_high:
        wrong = "negative" if column.low == 0 and value < 0 else f"out of range ({range_words(column)})"
        return Refusal(wrong, f"Write a number {range_words(column)}")
    if column.kind is Kind.WHOLE and value != int(value):
        return Refusal("not a whole number", f"Write a whole number such as {math.ceil(value)}")
    return value


def range_words(column: Column) -> str:
    """Return the range of a column in words, such as ``above 0`` or ``from 1 to 5``."""
    if column.low is not None and column.high is not None:
        return f"from {column.low:g} to {'below ' if column.high_open else ''}{column.high:g}"
    if column.low is not None:
        return f"above {column.low:g}" if column.low_open else f"of at least {column.low:g}"
    return "such as 1250"


def parse_choice(column: Column, text: str) -> str | Refusal:
    """Return one of the choices of a column, or a refusal that names the nearest."""
    if text in column.choices:
        return column.enum(text) if column.enum else text
    near = nearest(text, column.choices)
    listed = ", ".join(column.choices)
    repair = f"Write {near!r} if that is meant; allowed are {listed}" if near else f"Write one of {listed}"
    return Refusal(f"not {'an' if column.name[0] in 'aeiou' else 'a'} {column.name}", repair)


def parse_yes_no(text: str) -> bool | Refusal:
    """Return True or False, or a refusal."""
    word = text.casefold()
    if word in YES or word in NO:
        return word in YES
    return Refusal("neither yes nor no", "Write yes or no")


def parse_names(text: str) -> tuple[str, ...] | Refusal:
    """Return the names of a list separated by semicolons, blanks around them taken off, or a refusal."""
    names = tuple(name.strip() for name in text.split(";"))
    if all(names):
        return names
    return Refusal("a name is missing between two semicolons or at an end", "Write names as in Brno;Graz")


def parse_cell(column: Column, text: str) -> object:
    """Return the value of a cell that is not blank, or a `Refusal`."""
    match column.kind:
        case Kind.NUMBER:
            return parse_number(column, text)
        case Kind.WHOLE:
            value = parse_number(column, text)
            return value if isinstance(value, Refusal) else int(value)
        case Kind.CHOICE:
            return parse_choice(column, text)
        case Kind.YES_NO:
            return parse_yes_no(text)
        case Kind.NAMES:
            return parse_names(text)
        case _:
            return parse_text(column, text)


def _not_a_number(column: Column, text: str) -> Refusal:
    for refusal in (_separated(text), _per_cent(column, text), _dated(text), _worded(column, text)):
        if refusal is not None:
            return refusal
    return Refusal("not a number", "Write a number such as 1250 or 1250.5")


def _separated(text: str) -> Refusal | None:
    digits = text.strip()
    if is_plain_number(digits):
        return Refusal("a blank stands before or after the number", f"Write {digits}")
    if _THOUSANDS_COMMA.fullmatch(digits):
        plain = digits.replace(",", "")
        meant = f", or {digits.replace(',', '.')} if a decimal point is meant" if digits.count(",") == 1 else ""
        return Refusal("not a number, since it has a thousands separator", f"Write {plain}{meant}")
    if _THOUSANDS_POINT.fullmatch(digits):
        plain = digits.replace(".", "").replace(",", ".")
        return Refusal("not a number, since it has a thousands separator", f"Write {plain}")
    if _THOUSANDS_OTHER.fullmatch(digits):
        plain = re.sub(r"['\u2019\s]", "", digits).replace(",", ".")
        return Refusal("not a number, since it has a thousands separator", f"Write {plain}")
    if _DECIMAL_COMMA.fullmatch(digits):
        return Refusal("not a number, since it has a decimal comma", f"Write {digits.replace(',', '.')}")
    return None


def _per_cent(column: Column, text: str) -> Refusal | None:
    found = _PER_CENT.fullmatch(text.strip())
    if not found:
        return None
    number = float(found[1].replace(",", "."))
    repair = f"Write {text.strip()} as {number / 100:g}" if column.fraction else "Write the number without %"
    return Refusal("not a number, since it has a percent sign", repair)


def _dated(text: str) -> Refusal | None:
    if not _DATE.fullmatch(text.strip()):
        return None
    wrong = "a date or time, which spreadsheet programs make of numbers such as 12.5"
    return Refusal(wrong, "Format the column as numbers and type the number again")


def per_cent_fraction(text: str) -> float | None:
    """Return the fraction that a text with a percent sign means, such as 0.08 for ``8 %``; None for any other text."""
    found = _PER_CENT.fullmatch(text.strip())
    if not found or _DOUBTFUL.fullmatch(found[1]):
        return None
    return float(f"{found[1].replace(',', '.')}e-2")


def _worded(column: Column, text: str) -> Refusal | None:
    word = text.strip().casefold()
    if word in _NOT_FINITE:
        repair = f"Write {UNLIMITED}" if column.unlimited else "Write a number such as 1250, or leave the cell blank"
        return Refusal("not a finite number", repair)
    if word == UNLIMITED:
        if column.unlimited:
            return Refusal("not spelt as expected", f"Write {UNLIMITED}")
        return Refusal("only a capacity can be unlimited", "Write a number such as 1250")
    if _CURRENCY.fullmatch(text.strip()):
        return Refusal(
            "not a number, since it has a unit or currency beside it", "Write the number alone, such as 1250"
        )
    if re.fullmatch(r"\+[0-9.]+", text) or re.fullmatch(r"-?\.[0-9]+|-?[0-9]+\.", text):
        return Refusal("not written as a plain number", f"Write {float(text):g}")
    return None
