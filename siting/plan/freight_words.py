"""What freight rests on, in words: which tariffs price the plan, and what they leave out."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.plan.words import percent

if TYPE_CHECKING:
    from siting.plan.plan import Plan
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
