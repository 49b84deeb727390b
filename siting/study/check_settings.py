"""Turn loose settings into checked ones."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from siting.cells import is_plain_number, number_text
from siting.study.check_rows import refuse
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, Column, Kind
from siting.study.currency import check_currency
from siting.study.gathering import did_you_mean
from siting.study.parse import Refusal, in_range, parse_choice, parse_text, parse_yes_no
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
    _check_pairs(place, settings, gathering)
    return settings


def setting_value(column: Column, text: str) -> object:
    """
    Return the value that a setting typed as text has, as a TOML file would hold it.

    Parameters
    ----------
    column
        The setting.
    text
        As typed in a sheet or on a page.

    Returns
    -------
    value
        A number for a setting that is one; the text itself where it cannot be read so, for `check_settings` to refuse.
    """
    if column.kind is Kind.NUMBER and is_plain_number(text):
        return float(text)
    if column.kind is Kind.WHOLE and is_plain_number(text):
        value = float(text)
        return int(value) if value.is_integer() else value
    return text


def _checked(
    place: str, prefix: str, columns: Sequence[Column], given: Mapping[str, object], gathering: Gathering
) -> dict[str, Any]:
    known = {column.name: column for column in columns}
    values = {}
    for name, value in given.items():
        column = known.get(name)
        if column is None:
            elsewhere = [
                f"[solve] {c.name}" if not prefix else c.name for c in (SETTINGS if prefix else SOLVE_SETTINGS)
            ]
            repair = did_you_mean(name, [*known, *elsewhere], "Delete it")
            gathering.fault(place, None, f"{prefix}{name}", _shown(value), "unknown setting", repair)
            continue
        checked = _value(column, value)
        if isinstance(checked, Refusal):
            refuse(gathering, place, None, f"{prefix}{name}", _shown(value), checked)
        else:
            values[name] = checked
    for column in columns:
        if column.required and column.name not in given:
            gathering.fault(place, None, column.name, "", "the setting is missing", f"Add it: {_example(column)}")
    return values


def _example(column: Column) -> str:
    examples = {"currency": 'currency = "EUR"', "unit": 'unit = "t"'}
    return f"{column.meaning[0].lower()}{column.meaning[1:]}, as in {examples[column.name]}"


def _value(column: Column, value: object) -> object:
    if column.kind in {Kind.NUMBER, Kind.WHOLE}:
        return _number(column, value)
    if column.kind is Kind.YES_NO:
        if isinstance(value, bool):
            return value
        return (
            parse_yes_no(value) if isinstance(value, str) else Refusal("neither true nor false", "Write true or false")
        )
    if not isinstance(value, str):
        return Refusal("not a text", f'Write it in quotes, as in {column.name} = "..."')
    if column.kind is Kind.CHOICE:
        return parse_choice(column, value)
    if column.kind is Kind.NAME and not value.strip():
        return Refusal("blank", f"Fill it in: {_example(column)}")
    return parse_text(column, value)


def _number(column: Column, value: object) -> object:
    if isinstance(value, str) and is_plain_number(value):
        return Refusal("a text, not a number", f"Write {value} without quotes")
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


def _check_pairs(place: str, settings: Settings, gathering: Gathering) -> None:
    """Note settings that mean nothing without one another."""

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
