"""Coordinates and demand that were found or added up, written into a draft's tables; every other cell as it was."""

from __future__ import annotations

import re
from collections.abc import Hashable
from typing import TYPE_CHECKING, Any

import pandas as pd

from siting.browse.drafts import ROW
from siting.cells import number_text

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.browse.drafts import Draft
    from siting.study.gazetteer import Town
    from siting.study.tables import CustomerRow, Study

Record = dict[Hashable, Any]
"""A row of a table to edit, by column."""

COORDINATES = ("latitude", "longitude")
DIGITS = 12
"""Digits of a quantity that are written: sums are no more exact than that."""

_DOUBTFUL = re.compile(r"-?[1-9]\d{0,2}\.\d{3}")
_COMMA, _POINT = re.compile(r".*,\d+"), re.compile(r".*\.\d+")


class _Marks:
    """The decimal mark that each column of a table has, so that what is written into it is read like the rest."""

    def __init__(self, draft: Draft, table: str) -> None:
        self._raw = draft.raw.tables.get(table)
        self._marks: dict[str, str] = {}

    def text(self, value: float, column: str, row: object) -> str:
        """Return a number as the column has them; one that might be read in two ways gets another decimal."""
        plain = number_text(float(f"{value:.{DIGITS}g}"))
        plain += "0" if _DOUBTFUL.fullmatch(plain) else ""
        return plain.replace(".", self._mark(column, row))

    def _mark(self, column: str, row: object) -> str:
        raw = self._raw
        if raw is None or (not raw.form.separator and row not in raw.form.text_cells.get(column, ())):
            return "."  # in a sheet, only texts need a decimal mark to be read
        if column not in self._marks:
            cells = raw.column(column)
            texts = [] if cells is None else cells.to_pylist()
            commas, points = (sum(1 for text in texts if form.fullmatch(text)) for form in (_COMMA, _POINT))
            self._marks[column] = "," if commas > points else "."
        return self._marks[column]


def put_coordinates(draft: Draft, towns: Mapping[tuple[str, int], Town]) -> bool:
    """
    Write the coordinates of towns into rows that have none; returns whether anything changed.

    Parameters
    ----------
    draft
        Its tables.
    towns
        By table and row number. Rows with a coordinate are left as they are.
    """
    changed = False
    for table in dict.fromkeys(table for table, _ in towns):
        marks, frame = _Marks(draft, table), draft.table(table)
        records: list[Record] = frame.to_dict("records")
        for record in records:
            town = towns.get((table, int(record[ROW])))
            if town is not None and not any(str(record[column]).strip() for column in COORDINATES):
                record |= {column: marks.text(getattr(town, column), column, record[ROW]) for column in COORDINATES}
        changed = draft.put_table(table, _frame(records, frame)) or changed
    return changed


def put_demand(draft: Draft, made: Study, *, alone: bool) -> bool:
    """
    Write demand that order lines add up to into a draft's customers, and demands by good where there are goods.

    Parameters
    ----------
    draft
        Its tables.
    made
        As `siting.study.order_study.study_of_orders` returns it. Its customers get its demand, and what the lines carry
        along where a cell is blank; those that are not in the table are added to it.
    alone
        Whether all other customers, and their demands, are taken out.

    Returns
    -------
    changed
        Whether anything is different now.
    """
    changed = _put_customers(draft, made, alone=alone)
    changed = _put_demands(draft, made, alone=alone) or changed
    return _add_goods(draft, made) or changed


def missing_customers(draft: Draft, made: Study) -> tuple[int, int]:
    """
    Return how many customers of order lines are not in a draft's table, and how many of the table have no line.

    Parameters
    ----------
    draft, made
        As for `put_demand`.
    """
    cells = draft.raw.tables["customers"].column("customer") if "customers" in draft.raw.tables else None
    there = {text.strip() for text in (cells.to_pylist() if cells is not None else ())} - {""}
    named = {row.customer for row in made.customers}
    return len(named - there), len(there - named)


def _put_customers(draft: Draft, made: Study, *, alone: bool) -> bool:
    marks, frame = _Marks(draft, "customers"), draft.table("customers")
    named = {row.customer for row in made.customers}
    records: list[Record] = frame.to_dict("records")
    kept = [record for record in records if not alone or str(record["customer"]).strip() in named]
    by_name = {str(record["customer"]).strip(): record for record in kept}
    for row in made.customers:
        record = by_name.get(row.customer)
        if record is None:
            record = {ROW: pd.NA, "customer": row.customer}
            kept.append(record)
        record |= {column: text for column, text in _carried(row, marks).items() if not _filled(record, column)}
        record["demand"] = "" if row.demand is None else marks.text(row.demand, "demand", record[ROW])
    return draft.put_table("customers", _frame(kept, frame))


def _carried(row: CustomerRow, marks: _Marks) -> dict[str, str]:
    """Return what order lines say of a customer besides its demand."""
    degrees = {
        column: marks.text(value, column, None) for column in COORDINATES if (value := getattr(row, column)) is not None
    }
    texts = {"place": row.place, "country": row.country, **row.attributes}
    return degrees | {column: text for column, text in texts.items() if text}


def _filled(record: Record, column: str) -> bool:
    return bool(str(record.get(column, "")).strip())


def _put_demands(draft: Draft, made: Study, *, alone: bool) -> bool:
    """Put demand by good in the place of that of the same customers; without goods, there is none by good."""
    if not made.demands and "demands" not in draft.raw.tables:
        return False
    marks, frame = _Marks(draft, "demands"), draft.table("demands")
    named = {row.customer for row in made.customers}
    records: list[Record] = frame.to_dict("records")
    kept = [record for record in records if not alone and str(record["customer"]).strip() not in named]
    kept += [
        {ROW: pd.NA, "customer": row.customer, "good": row.good, "demand": marks.text(row.demand, "demand", None)}
        for row in made.demands
    ]
    return draft.put_table("demands", _frame(kept, frame))


def _add_goods(draft: Draft, made: Study) -> bool:
    frame = draft.table("goods")
    records: list[Record] = frame.to_dict("records")
    there = {str(record["good"]).strip() for record in records}
    new: list[Record] = [{ROW: pd.NA, "good": row.good} for row in made.goods if row.good not in there]
    return bool(new) and draft.put_table("goods", _frame(records + new, frame))


def _frame(records: list[Record], like: pd.DataFrame) -> pd.DataFrame:
    """Return rows as a table to edit, with the columns of another and those that came with the rows."""
    columns = dict.fromkeys([*like.columns, *(column for record in records for column in record)])
    frame = pd.DataFrame(records, columns=list(columns))
    return frame.astype({column: "Int64" if column == ROW else "string" for column in columns}).fillna(
        {column: "" for column in columns if column != ROW}
    )
