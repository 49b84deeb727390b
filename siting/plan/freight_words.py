"""What freight rests on, in words: which tariffs price the plan, and what they leave out."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.plan.road_sensitivity import CIRCUITY_STEP
from siting.plan.words import money, percent

if TYPE_CHECKING:
    from siting.plan.plan import Plan
    from siting.plan.road_sensitivity import RoadSensitivity
    from siting.study.tables import Study


def tariff_sentence(study: Study, plan: Plan) -> str:
    """
    Return which tariffs price the plan's flows, and what is approximated by them.

    Parameters
    ----------
    study
        For its tariffs, loads and sizes of deliveries.
    plan
        For its flows.

    Returns
    -------
    sentence
        Empty where the study has no tariffs.
    """
    if not study.tariffs:
        return ""
    load = {row.good: row.load for row in study.all_goods}
    by_tariff: dict[str, float] = dict.fromkeys(sorted({row.tariff for row in study.tariffs}), 0.0)
    for flow in plan.flows:
        by_tariff[flow.tariff] = by_tariff.get(flow.tariff, 0.0) + flow.amount * load[flow.good]
    moved = sum(by_tariff.values()) or 1.0
    shares = ", ".join(f"{name} {percent(held / moved)}" for name, held in by_tariff.items() if name and held)
    rest = f"; {percent(by_tariff[''] / moved)} by lanes or rates" if by_tariff.get("") else ""
    return (
        f"Of all load moved, by tariff: {shares or 'none'}{rest}. Each lane goes by the cheapest tariff that fits, "
        f"every delivery at one size ({_sizes(study)}) or one truck filled as its row says: part loads, shared trucks "
        "and deliveries declared larger to reach a cheaper break are left out."
    )


def circuity_words(study: Study) -> str:
    """
    Return the factors that estimated distances go by.

    Parameters
    ----------
    study
        For its settings and its `circuity` table.

    Returns
    -------
    words
        The one factor, or the range of the table and that of the settings.
    """
    default = f"{study.settings.circuity:g}"
    if not study.circuity:
        return default
    factors = sorted({row.circuity for row in study.circuity})
    shown = f"{factors[0]:g}" if len(factors) == 1 else f"{factors[0]:g} to {factors[-1]:g}"
    return f"{shown} by country, {default} elsewhere"


def sensitivity_sentence(study: Study, sensitivity: RoadSensitivity, cost: float) -> str:
    """
    Return what longer and shorter roads would do to the plan's freight.

    Parameters
    ----------
    study
        For its currency.
    sensitivity
        Of the plan.
    cost
        Of the plan, money a year.

    Returns
    -------
    sentence
        The flows are those of the plan: a plan made anew could be cheaper.
    """
    step = f"{CIRCUITY_STEP * 100:g} %"

    def change(amount: float) -> str:
        shown = money(abs(amount), study.settings.currency, like=cost)
        return f"{shown} a year {'less' if amount < 0 else 'more'} ({percent(abs(amount) / abs(cost)) if cost else ''})"

    return (
        f"If roads were {step} longer than estimated, the same flows would cost {change(sensitivity.longer)} in "
        f"freight; {step} shorter, {change(sensitivity.shorter)}."
    )


def _sizes(study: Study) -> str:
    settings, unit = study.settings, study.settings.unit
    own = [row.drop_size for row in study.customers if row.drop_size is not None]
    said = []
    if settings.drop_size is not None and len(own) < len(study.customers):
        said.append(f"{settings.drop_size:g} {unit} to customers")
    if own:
        said.append(f"{min(own):g} to {max(own):g} {unit} to those with a drop_size of their own")
    if settings.inbound_size is not None:
        said.append(f"{settings.inbound_size:g} {unit} inbound")
    return ", ".join(said) or "where none is set, in proportion to the load"
