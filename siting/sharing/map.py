"""The map that is shown, mailed and printed: one HTML file that opens anywhere."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.sharing.map_data import plan_json
from siting.sharing.map_differences import differences_json
from siting.sharing.map_given import given_json
from siting.sharing.map_page import page_of

if TYPE_CHECKING:
    from pathlib import Path

    from siting.plan.plan import Plan
    from siting.study.tables import Study


@dataclass(frozen=True, slots=True)
class MapPage:
    """A map as one HTML document without any outside reference."""

    html: str

    def write(self, path: Path) -> None:
        """Write the document as UTF-8."""
        path.write_text(self.html, encoding="utf-8", newline="\n")


def draw_map(study: Study, plan: Plan, *, headline: str, locale: str = "en") -> MapPage:
    """
    Draw the map of a plan.

    Parameters
    ----------
    study
        The study that the plan answers.
    plan
        Its verdicts, flows and numbers are drawn.
    headline
        The answer in one sentence; it stands above the map. Empty for a map inside a page that says it already: then
        the cautions and the tables below the map are left to that page too.
    locale
        Whose separators numbers carry, such as `en` or `de`.

    Returns
    -------
    page
        The map with its verdict list, legend, tables, cautions and sources.

    Raises
    ------
    SettingsError
        If the locale is unknown.
    """
    return MapPage(page_of(plan_json(study, plan, headline=headline, locale=locale)))


def draw_given(study: Study, *, headline: str | None = None, fingerprint: str = "", locale: str = "en") -> MapPage:
    """
    Draw what was given, before any plan: sites and suppliers by standing, customers by demand.

    Parameters
    ----------
    study
        A checked study.
    headline
        As for `draw_map`; None counts what the study holds.
    fingerprint
        Of the study; empty = not shown.
    locale
        Whose separators numbers carry, such as `en` or `de`.

    Returns
    -------
    page
        The map, of the same form as that of a plan.

    Raises
    ------
    SettingsError
        If the locale is unknown.
    """
    return MapPage(page_of(given_json(study, headline=headline, fingerprint=fingerprint, locale=locale)))


def draw_differences(  # noqa: PLR0913 - two plans with their names, and how they are told
    study: Study,
    before: Plan,
    after: Plan,
    *,
    names: tuple[str, str],
    headline: str,
    locale: str = "en",
) -> MapPage:
    """
    Draw only what differs between two plans.

    Parameters
    ----------
    study
        The study of the plan after; places that only the other's study has are not drawn.
    before, after
        The plans.
    names
        What they are called.
    headline
        As for `draw_map`.
    locale
        Whose separators numbers carry, such as `en` or `de`.

    Returns
    -------
    page
        The map: dashed lanes carry less in the second plan, solid ones more; nothing else is on it.

    Raises
    ------
    SettingsError
        If the locale is unknown.
    """
    return MapPage(page_of(differences_json(study, before, after, names=names, headline=headline, locale=locale)))


def write_map(path: Path, study: Study, plan: Plan, *, headline: str, locale: str = "en") -> None:
    """
    Draw the map of a plan and write it to a file.

    Parameters
    ----------
    path
        File to write, overwritten where it exists.
    study, plan, headline, locale
        As for `draw_map`.

    Raises
    ------
    SettingsError
        If the locale is unknown.
    """
    draw_map(study, plan, headline=headline, locale=locale).write(path)
