"""A file of order lines in DuckDB: what its numbers and dates look like, and its sums. Used by `orders` alone."""

from __future__ import annotations

import datetime as dt
import re
import threading
import time
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import TYPE_CHECKING, Any

from siting.errors import DataFileError
from siting.listener import Progress, Silent

if TYPE_CHECKING:
    from collections.abc import Mapping
    from types import TracebackType
    from typing import Self

    from siting.listener import Listener
    from siting.study.orders import OrderColumns, OrderReading

MEMORY = "600MB"
"""What DuckDB may hold; beyond that it goes to disk."""

SAMPLE_LINES = 20_000
"""First lines from which the form of numbers and dates is told."""

FAR_OUT = 3.0
"""Interquartile ranges (of logarithms) above the upper quartile from which a line is far out; at least doublings."""

DATE_FORMATS = ("%Y-%m-%d", "%d.%m.%Y", "%d/%m/%Y", "%m/%d/%Y", "%d-%m-%Y", "%Y/%m/%d", "%Y%m%d")
"""Forms of dates that are tried; a time of day after them does not count."""

_LARGEST = 5
"""Far-out lines that are shown."""
_POLL_S = 0.2
_SNIFFED_BYTES = 1_000_000
_POINT = re.compile(r"[+-]?\d+(,\d{3})*(\.\d+)?")
_COMMA = re.compile(r"[+-]?\d+(\.\d{3})*(,\d+)?")
_TYPED_DATES = ("DATE", "TIMESTAMP")

# Text goes into these statements only as quoted names and quoted texts (`_name`, `_text`).
# ruff: noqa: S608


@dataclass(frozen=True, slots=True, kw_only=True)
class Survey:
    """What the first reading tells."""

    lines: int
    first: dt.date | None
    last: dt.date | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Sums:
    """What the second reading tells. Pairs are lines and their quantity."""

    by_customer: Mapping[tuple[str, str], float]
    months: list[tuple[str, float]]
    skipped: Mapping[str, int]
    used: tuple[int, float]
    returned: tuple[int, float]
    far_out: tuple[int, float]
    largest: list[tuple[str, str, float, float]]


class OrderFile:
    """A file of order lines; a context, since DuckDB may put parts of its work on disk meanwhile."""

    def __init__(
        self, path: Path | str, columns: OrderColumns, reading: OrderReading, listener: Listener | None
    ) -> None:
        import duckdb  # noqa: PLC0415  (60 MB that only this needs)

        self._error = duckdb.Error
        self._path, self._columns, self._reading = str(path), columns, reading
        self._listener = listener or Silent()
        self._spill = TemporaryDirectory(prefix="siting-orders-")
        self._db = duckdb.connect(config={"memory_limit": MEMORY, "temp_directory": self._spill.name})
        self._db.execute("SET preserve_insertion_order = false")
        self._began = time.monotonic()

    def __enter__(self) -> Self:
        """Open the file and find out how it is written."""
        self._listener.start(f"adding up {Path(self._path).name}")
        try:
            self._lines = self._source()
            self._quantity, self._date = self._forms()
        except BaseException:
            self._close()
            raise
        return self

    def header(self) -> tuple[str, ...]:
        """Return the columns of the file; for use instead of the context, since the file is let go of."""
        try:
            self._source()
            return tuple(self._types)
        finally:
            self._close()

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Let go of the file and of what is on disk."""
        self._listener.end(Progress(elapsed_s=time.monotonic() - self._began))
        self._close()

    def _close(self) -> None:
        self._db.close()
        self._spill.cleanup()

    def _source(self) -> str:
        """Return the file as something to select from, after making sure that it has the columns."""
        if not self._files():
            msg = f"{self._path}: no such file. Give a CSV or Parquet file of order lines."
            raise DataFileError(msg)
        if self._path.lower().endswith((".parquet", ".pq")):
            source = f"read_parquet({_text(self._path)})"
        else:
            source = f"read_csv({_text(self._path)}, all_varchar = true, header = true, encoding = {self._encoding()})"
        described = self._fetch(f"DESCRIBE SELECT * FROM {source}", "looking at the columns")
        self._types = {name: kind for name, kind, *_ in described}
        for name in (self._columns.customer, self._columns.quantity, self._columns.good, self._columns.date):
            self._check_column(name)
        for name in self._columns.kept.values():
            self._check_column(name)
        return source

    def _files(self) -> list[Path]:
        """Return the files that the path, or the pattern in its last part, stands for."""
        path = Path(self._path)
        if any(sign in path.name for sign in "*?["):
            return sorted(path.parent.glob(path.name))
        return [path] if path.is_file() else []

    def _check_column(self, name: str) -> None:
        if name and name not in self._types:
            msg = f"{self._path}: there is no column {name!r}; the columns are {', '.join(self._types)}."
            raise DataFileError(msg)

    def _encoding(self) -> str:
        """Return the encoding of a CSV file: UTF-16 by its mark, UTF-8 where it fits, else the Western one."""
        with self._files()[0].open("rb") as file:
            start = file.read(_SNIFFED_BYTES)
        if start.startswith((b"\xff\xfe", b"\xfe\xff")):
            return "'utf-16'"
        try:
            start.decode("utf-8")
        except UnicodeDecodeError as error:
            if error.start < len(start) - 4:  # a letter cut off at the end of what was read is none
                return "'latin-1'"
        return "'utf-8'"

    def _forms(self) -> tuple[str, str]:
        """Return the expressions of a line's quantity and date."""
        names = [self._columns.quantity, *([self._columns.date] if self._columns.date else [])]
        sample = self._fetch(
            f"SELECT {', '.join(map(_name, names))} FROM {self._lines} LIMIT {SAMPLE_LINES}", "looking at the lines"
        )
        quantities = [str(line[0]).strip() for line in sample if line[0] is not None]
        quantity = _name(self._columns.quantity)
        if self._types[self._columns.quantity] == "VARCHAR":
            quantity = self._number(quantity, quantities)
        if not self._columns.date:
            return f"TRY_CAST({quantity} AS DOUBLE)", "CAST(NULL AS DATE)"
        date = _name(self._columns.date)
        if self._types[self._columns.date].startswith(_TYPED_DATES):
            return f"TRY_CAST({quantity} AS DOUBLE)", f"CAST({date} AS DATE)"
        texts = [str(line[1]).strip() for line in sample if line[1] is not None]
        form = self._reading.date_format or self._date_form([text for text in texts if text])
        width = len(dt.date(2000, 12, 31).strftime(form))
        text = f"trim(CAST({date} AS VARCHAR))"
        if form in DATE_FORMATS:
            text = f"left({text}, {width})"
        return f"TRY_CAST({quantity} AS DOUBLE)", f"CAST(TRY_STRPTIME({text}, {_text(form)}) AS DATE)"

    def _number(self, quantity: str, texts: list[str]) -> str:
        decimal = self._reading.decimal or self._decimal_mark(texts)
        thousands = "," if decimal == "." else "."
        bare = f"replace(replace(trim({quantity}), '{thousands}', ''), ' ', '')"
        return bare if decimal == "." else f"replace({bare}, ',', '.')"

    def _decimal_mark(self, texts: list[str]) -> str:
        """Return the decimal mark that all numbers of the sample fit, or refuse where both do and it matters."""
        numbers = [text for text in texts if _POINT.fullmatch(text) or _COMMA.fullmatch(text)]
        marked = [text for text in numbers if "." in text or "," in text]
        if not marked:
            return "."
        fits = {
            ".": sum(bool(_POINT.fullmatch(text)) for text in marked),
            ",": sum(bool(_COMMA.fullmatch(text)) for text in marked),
        }
        if fits["."] == fits[","]:
            msg = (
                f"{self._path}: {marked[0]!r} in column {self._columns.quantity} can be read with a decimal point and "
            )
            msg += "with a decimal comma. Say which (on the command line: --decimal . or --decimal ,)"
            raise DataFileError(msg)
        return max(fits, key=fits.__getitem__)

    def _date_form(self, texts: list[str]) -> str:
        """Return the one form that all dates of the sample have, or refuse where none or several do."""
        fitting = [form for form in DATE_FORMATS if texts and all(_is_date(text, form) for text in texts)]
        if len(fitting) == 1:
            return fitting[0]
        if fitting:
            how = f"can be read as {' and as '.join(fitting)}"
        else:
            share = {form: sum(_is_date(text, form) for text in texts) for form in DATE_FORMATS}
            best = max(share, key=share.__getitem__)
            if texts and share[best] >= 0.9 * len(texts) and sum(held == share[best] for held in share.values()) == 1:
                return best  # the few others are counted as unreadable
            how = "is no date in a form that is known"
        shown = texts[0] if texts else ""
        msg = f"{self._path}: {shown!r} in column {self._columns.date} {how}. "
        msg += "Say how (on the command line: --date-format %d.%m.%Y)"
        raise DataFileError(msg)

    def _fetch(self, statement: str, phase: str) -> list[tuple[Any, ...]]:
        """Run a statement, telling the listener how far it is."""
        done = threading.Event()

        def tell() -> None:
            while not done.wait(_POLL_S):
                share = self._db.query_progress()
                text = f"{phase}, {share:.0f} %" if 0 < share <= 100 else phase  # noqa: PLR2004  (per cent)
                self._listener.update(Progress(elapsed_s=time.monotonic() - self._began, phase=text))

        teller = threading.Thread(target=tell, daemon=True)
        teller.start()
        try:
            return self._db.execute(statement).fetchall()
        except self._error as error:
            msg = f"{self._path}: cannot be read as order lines: {str(error).splitlines()[0]}"
            raise DataFileError(msg) from error
        finally:
            done.set()
            teller.join()

    def _parsed(self) -> str:
        """Return the lines as customer, good, quantity in the study's unit and day; NULL is what cannot be read."""
        good = f"nullif(trim(CAST({_name(self._columns.good)} AS VARCHAR)), '')" if self._columns.good else "''"
        return (
            f"SELECT nullif(trim(CAST({_name(self._columns.customer)} AS VARCHAR)), '') AS customer, {good} AS good, "
            f"{self._quantity} * {self._reading.factor!r} AS quantity, {self._date} AS day FROM {self._lines}"
        )

    def survey(self) -> Survey:
        """Return lines and days of the file, and note from which quantity on a line of each good is far out."""
        log = "CASE WHEN quantity > 0 THEN ln(quantity) END"
        self._fetch(
            f"CREATE TEMP TABLE surveyed AS SELECT good, count(*) AS lines, min(day) AS first, max(day) AS last, "
            f"approx_quantile({log}, [0.25, 0.75]) AS quartiles FROM ({self._parsed()}) GROUP BY good",
            "finding out the period",
        )
        self._fetch(
            "CREATE TEMP TABLE fences AS SELECT good, (1 + 1e-9) * "
            f"exp(quartiles[2] + {FAR_OUT} * greatest(quartiles[2] - quartiles[1], ln(2))) AS fence FROM surveyed",
            "finding out what is far out",
        )
        ((lines, first, last),) = self._fetch("SELECT sum(lines), min(first), max(last) FROM surveyed", "")
        return Survey(lines=int(lines or 0), first=first, last=last)

    def _state(self, first: dt.date | None, last: dt.date | None) -> str:
        """Return the expression of what becomes of a line: left out for a reason, `far out`, `returned` or `used`."""
        cases = [
            ("customer IS NULL", "without a customer"),
            ("good IS NULL", "without a good"),
            ("quantity IS NULL OR NOT isfinite(quantity)", "without a quantity that can be read"),
        ]
        if self._columns.date:
            cases += [
                ("day IS NULL", "without a date that can be read"),
                (f"day < DATE '{first}' OR day > DATE '{last}'", "outside the period"),
            ]
        cases += [("quantity > fence", "far out"), ("quantity < 0", "returned")]
        return f"CASE {' '.join(f'WHEN {when} THEN {_text(then)}' for when, then in cases)} ELSE 'used' END"

    def sums(self, first: dt.date | None, last: dt.date | None) -> Sums:
        """Return what the lines of a period add up to."""
        is_counted = {"used": True, "returned": self._reading.returns, "far out": self._reading.far_out}
        counted = f"state IN ({', '.join(_text(state) for state, count in is_counted.items() if count)})"
        month = "strftime(day, '%Y-%m')" if self._columns.date else "CAST(NULL AS VARCHAR)"
        line = "struct_pack(quantity := quantity, customer := customer, good := good, fence := fence)"
        self._fetch(
            f"""
            CREATE TEMP TABLE summed AS
            SELECT
                grouping(customer) AS by_other, grouping(state) AS by_no_state, customer, good, month, state,
                count(*) AS lines, sum(quantity) AS quantity, sum(CASE WHEN {counted} THEN quantity END) AS counted,
                CASE WHEN by_no_state = 0 THEN max({line}, {_LARGEST}) FILTER (state = 'far out') END AS largest
            FROM (
                SELECT *, {month} AS month, {self._state(first, last)} AS state
                FROM (
                    SELECT lines.*, fence
                    FROM ({self._parsed()}) AS lines
                    LEFT JOIN fences ON fences.good IS NOT DISTINCT FROM lines.good
                )
            )
            GROUP BY GROUPING SETS ((customer, good), (month), (state))
            """,
            "adding up",
        )
        by_customer = self._fetch(
            "SELECT customer, good, counted FROM summed WHERE by_other = 0 AND counted IS NOT NULL ORDER BY ALL", ""
        )
        states = {
            state: (int(lines), float(quantity or 0.0))
            for state, lines, quantity in self._fetch(
                "SELECT state, lines, quantity FROM summed WHERE by_no_state = 0 ORDER BY state", ""
            )
        }
        months = self._fetch(
            "SELECT month, counted FROM summed WHERE by_other = 1 AND by_no_state = 1 AND month IS NOT NULL "
            "AND counted IS NOT NULL ORDER BY month",
            "",
        )
        largest = self._fetch("SELECT largest FROM summed WHERE state = 'far out' AND by_no_state = 0", "")
        nothing = (0, 0.0)
        used = [states.get(state, nothing) for state, count in is_counted.items() if count]
        skipped = {state: lines for state, (lines, _) in states.items() if not is_counted.get(state, False)}
        return Sums(
            by_customer={(customer, good): float(quantity) for customer, good, quantity in by_customer},
            months=[(month, float(quantity)) for month, quantity in months],
            skipped=skipped,
            used=(sum(lines for lines, _ in used), sum(quantity for _, quantity in used)),
            returned=states.get("returned", nothing),
            far_out=states.get("far out", nothing),
            largest=[
                (line["customer"], line["good"], line["quantity"], line["fence"])
                for (lines,) in largest
                for line in lines or ()
            ],
        )

    def carried(self) -> tuple[dict[str, tuple[str, ...]], dict[str, int]]:
        """Return what is carried along of each customer, and for how many customers its lines differ."""
        kept = self._columns.kept
        if not kept:
            return {}, {}
        parts = ", ".join(
            f"coalesce(min(nullif(trim(CAST({_name(column)} AS VARCHAR)), '')), ''), "
            f"coalesce(max(nullif(trim(CAST({_name(column)} AS VARCHAR)), '')), '')"
            for column in kept.values()
        )
        customer = f"nullif(trim(CAST({_name(self._columns.customer)} AS VARCHAR)), '')"
        rows = self._fetch(
            f"SELECT {customer} AS customer, {parts} FROM {self._lines} GROUP BY 1", "carrying columns along"
        )
        held = {row[0]: tuple(row[1::2]) for row in rows if row[0] is not None}
        differing = {
            name: sum(row[1 + 2 * at] != row[2 + 2 * at] for row in rows if row[0] is not None)
            for at, name in enumerate(kept)
        }
        return held, {name: count for name, count in differing.items() if count}


def _name(text: str) -> str:
    return '"' + text.replace('"', '""') + '"'


def _text(text: str) -> str:
    return "'" + text.replace("'", "''") + "'"


def _is_date(text: str, form: str) -> bool:
    width = len(dt.date(2000, 12, 31).strftime(form))
    try:
        dt.datetime.strptime(text[:width], form)  # noqa: DTZ007  (a day, no moment)
    except ValueError:
        return False
    return len(text) <= width or text[width] in " T"
