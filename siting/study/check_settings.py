"""Turn loose settings into checked ones."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from siting.cells import is_plain_number, number_text, read_cell
from siting.study.check_rows import refuse
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, Column, Kind
from siting.study.currency import check_currency
from siting.study.gathering import did_you_mean
from siting.study.parse import Refusal, in_range, parse_cell, parse_number, per_cent_fraction
from siting.study.raw import cell_text
from siting.study.settings import Settings, SolveSettings

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.study.gathering import Gathering
    from siting.study.raw import RawStudy


def check_settings(raw: RawStudy, gathering: Gathering) -> Settings:
    """
    Return the settings of a study; those that are refused keep their default and become faults.

    Parameters
    ----------
    raw
        The study as read.
    gathering
        Takes faults: unknown settings, wrong types, values out of range, settings that need one another.

    Returns
    -------
    settings
        Checked one by one and against each other, not against the tables.
    """
    place = raw.settings_name
    if place in raw.unreadable:
        return Settings()
    given = dict(raw.settings)
    solve_given = given.pop("solve", {})
    values = _checked(place, "", SETTINGS, given, gathering)
    solve: dict[str, Any] = {}
    if isinstance(solve_given, dict):
        solve = _checked(place, "solve.", SOLVE_SETTINGS, solve_given, gathering)
    else:
        gathering.fault(place, None, "solve", str(solve_given), "not a section", "Write [solve] on a line of its own")
    if "currency" in values:
        refusal = check_currency(values["currency"])
        if refusal:
            refuse(gathering, place, None, "currency", values["currency"], refusal)
    settings = Settings(**values, solve=SolveSettings(**solve))
    _check_pairs(place, settings, gathering, has_tariffs="tariffs" in raw.tables)
    return settings


def settings_from_cells(cells: Mapping[str, object]) -> dict[str, object]:
    """
    Return settings as a TOML file would hold them, from cells of a sheet or fields of a page.

    Parameters
    ----------
    cells
        Values by name, those of `[solve]` as ``solve.gap``. Numbers may be typed as text; blank ones are left out.

    Returns
    -------
    settings
        For `RawStudy.settings`; what cannot be read is kept as it is, for `check_settings` to refuse.
    """
    columns = {column.name: column for column in SETTINGS}
    columns |= {f"solve.{column.name}": column for column in SOLVE_SETTINGS}
    settings: dict[str, object] = {}
    solve: dict[str, object] = {}
    for name, cell in cells.items():
        column = columns.get(name)
        value = _typed(column, cell) if column else cell
        if value is None or value == "":
            continue
        if name.startswith("solve."):
            solve[name.removeprefix("solve.")] = value
        else:
            settings[name] = value
    return {**settings, "solve": solve} if solve else settings


def _typed(column: Column, cell: object) -> object:
    if column.kind in {Kind.NUMBER, Kind.WHOLE}:
        if isinstance(cell, str) and is_plain_number(cell):
            value = float(cell)
            return int(value) if column.kind is Kind.WHOLE and value.is_integer() else value
        return cell
    if column.kind is Kind.YES_NO and isinstance(cell, bool):
        return cell
    return read_cell(cell_text(cell))


def _checked(
    place: str, prefix: str, columns: Sequence[Column], given: Mapping[str, object], gathering: Gathering
) -> dict[str, Any]:
    known = {column.name: column for column in columns}
    values = {}
    for name, value in given.items():
        column = known.get(name)
        if column is None:
            elsewhere = {other.name for other in (SETTINGS if prefix else SOLVE_SETTINGS)}
            repair = "Write it before the line [solve]" if prefix else "Write it below the line [solve]"
            if name not in elsewhere:
                repair = did_you_mean(name, known, "Delete it")
            gathering.fault(place, None, f"{prefix}{name}", _shown(value), "unknown setting", repair)
            continue
        fraction = per_cent_fraction(value) if column.fraction and isinstance(value, str) else None
        checked = _value(column, value if fraction is None else fraction)
        if isinstance(checked, Refusal):
            refuse(gathering, place, None, f"{prefix}{name}", _shown(value), checked)
        else:
            values[name] = checked
            if fraction is not None:
                wrong = f"read as {number_text(fraction)}, since it has a percent sign"
                gathering.warn(place, None, f"{prefix}{name}", str(value), wrong, f"Write {number_text(fraction)}")
    for column in columns:
        if column.required and column.name not in given:
            gathering.fault(place, None, column.name, "", "the setting is missing", f"Add it: {_example(column)}")
    return values


def _example(column: Column) -> str:
    examples = {"currency": 'currency = "EUR"', "unit": 'unit = "t"'}
    meaning = column.meaning if column.meaning[:2].isupper() else f"{column.meaning[0].lower()}{column.meaning[1:]}"
    return f"{meaning}, as in {examples[column.name]}"


def _value(column: Column, value: object) -> object:
    if column.kind in {Kind.NUMBER, Kind.WHOLE}:
        return _number(column, value)
    if column.kind is Kind.YES_NO and isinstance(value, bool):
        return value
    if not isinstance(value, str):
        if column.kind is Kind.YES_NO:
            return Refusal("neither true nor false", "Write true or false")
        return Refusal("not a text", f'Write it in quotes, as in {column.name} = "..."')
    if column.kind is Kind.NAME and not value.strip():
        return Refusal("blank", f"Fill it in: {_example(column)}")
    return parse_cell(column, value)


def _number(column: Column, value: object) -> object:
    if isinstance(value, str) and is_plain_number(value):
        return Refusal("a text, not a number", f"Write {value} without quotes")
    if isinstance(value, str) and value.strip():
        return parse_number(column, value)
    if isinstance(value, bool) or not isinstance(value, int | float):
        return Refusal("not a number", f"Write a number {_suggestion(column)}")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        return Refusal("not a finite number", f"Write a number {_suggestion(column)}, or leave the setting out")
    checked = in_range(column, number)
    if isinstance(checked, Refusal):
        return checked
    return int(checked) if column.kind is Kind.WHOLE else checked


def _suggestion(column: Column) -> str:
    if column.fraction:
        return "such as 0.08 for 8 %"
    return "such as 12" if column.kind is Kind.WHOLE else "such as 1.25"


def _shown(value: object) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, float):
        return number_text(value) if math.isfinite(value) else repr(value)
    return str(value)


def _check_pairs(place: str, settings: Settings, gathering: Gathering, *, has_tariffs: bool) -> None:
    """Note settings that mean nothing without one another; tariffs go by drop_size too."""

    def fault(name: str, value: object, wrong: str, repair: str) -> None:
        if not gathering.hurt(place, None, name):
            gathering.fault(place, None, name, _shown(value), wrong, repair)

    def both(first: str, second: str) -> None:
        if gathering.hurt(place, None, first, second):
            return
        is_set = {name: getattr(settings, name) != getattr(Settings(), name) for name in (first, second)}
        for name, other in ((first, second), (second, first)):
            if is_set[name] and not is_set[other]:
                wrong = f"{name} is set without {other}"
                fault(name, getattr(settings, name), wrong, f"Set {other} too, or delete {name}")

    if not has_tariffs or settings.drop_size is None:
        both("drop_charge", "drop_size")
    both("service_km", "service_share")
    if settings.carbon_price_per_t and settings.emission_kg_per_tkm is None:
        fault(
            "carbon_price_per_t", settings.carbon_price_per_t,
            "carbon_price_per_t is set without emission_kg_per_tkm", "Set emission_kg_per_tkm too",
        )  # fmt: skip
    fewest, most = settings.fewest_sites, settings.most_sites
    if fewest is not None and most is not None and fewest > most:
        fault(
            "fewest_sites", fewest, f"fewest_sites is above most_sites ({most})",
            f"Write at most {most}, or raise most_sites",
        )  # fmt: skip
