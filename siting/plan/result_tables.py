"""A plan as plain tables, one header and rows of cells each, for files and pages."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.plan.plan import CostLine

if TYPE_CHECKING:
    from siting.plan.plan import Answer, Plan

Cell = str | float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ResultTable:
    """One table of results. Amounts in the study's unit, money in its currency, one planning year."""

    name: str
    """File name without ending, in snake_case."""
    header: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]
    """None is a blank cell: unlimited, not defined, or not reported."""


TABLE_NAMES = (
    "site_verdicts",
    "supplier_verdicts",
    "flows",
    "customers",
    "marginal_costs",
    "cost_lines",
    "distance_bands",
    "unserved_today",
)
"""Every table that `result_tables` may give."""


def result_tables(answer: Answer) -> tuple[ResultTable, ...]:
    """
    Return the tables of an answer.

    Parameters
    ----------
    answer
        What was found; without a plan only what today leaves unserved is left to show.

    Returns
    -------
    tables
        Those with something in them, in the order of `TABLE_NAMES`.
    """
    plan = answer.plan
    tables = [] if plan is None else [*_verdicts(plan), _flows(plan), *_customers(plan), *_money_and_distance(plan)]
    if answer.today is not None:
        tables.append(
            ResultTable(
                name="unserved_today",
                header=("customer", "good", "amount"),
                rows=tuple((short.customer, short.good, short.amount) for short in answer.today.unserved),
            )
        )
    return tuple(table for table in tables if table.rows)


def _verdicts(plan: Plan) -> tuple[ResultTable, ResultTable]:
    money = ("utilisation", "charge_per_year", "one_off_charge", "note")
    sites = ResultTable(
        name="site_verdicts",
        header=("site", "verdict", "size", "load_per_year", "capacity_per_year", "customers", *money),
        rows=tuple(
            (
                line.site,
                str(line.verdict),
                line.size,
                line.throughput,
                line.capacity,
                line.customers,
                line.utilisation,
                line.charge,
                line.one_off,
                line.note,
            )
            for line in plan.sites
        ),
    )
    suppliers = ResultTable(
        name="supplier_verdicts",
        header=("supplier", "verdict", "load_per_year", "capacity_per_year", *money),
        rows=tuple(
            (
                line.supplier,
                str(line.verdict),
                line.volume,
                line.capacity,
                line.utilisation,
                line.charge,
                line.one_off,
                line.note,
            )
            for line in plan.suppliers
        ),
    )
    return sites, suppliers


def _flows(plan: Plan) -> ResultTable:
    return ResultTable(
        name="flows",
        header=(
            *("leg", "origin", "destination", "good", "amount_per_year", "road_km", "distance", "cost_per_year"),
            "tariff",
        ),
        rows=tuple(
            (
                str(flow.leg),
                flow.origin,
                flow.destination,
                flow.good,
                flow.amount,
                flow.km,
                "" if flow.km is None else "given" if flow.km_given else "estimated",
                flow.cost,
                flow.tariff,
            )
            for flow in plan.flows
        ),
    )


def _customers(plan: Plan) -> tuple[ResultTable, ResultTable]:
    served = ResultTable(
        name="customers",
        header=("customer", "served_from", "origins", "load_per_year", "average_road_km", "cost_to_serve_per_year"),
        rows=tuple(
            (line.customer, "; ".join(line.origins), len(line.origins), line.load, line.km, line.cost_to_serve)
            for line in plan.customers
        ),
    )
    marginal = ResultTable(
        name="marginal_costs",
        header=("customer", "good", "marginal_cost_per_unit_not_for_pricing"),
        rows=tuple((line.customer, good, cost) for line in plan.customers for good, cost in line.marginal_cost.items()),
    )
    return served, marginal


def _money_and_distance(plan: Plan) -> tuple[ResultTable, ResultTable]:
    lines: list[tuple[Cell, ...]] = [(str(line), plan.cost_lines[line]) for line in CostLine]
    money = ResultTable(name="cost_lines", header=("cost_line", "cost_per_year"), rows=(*lines, ("total", plan.cost)))
    bands = ResultTable(
        name="distance_bands",
        header=("above_km", "to_km", "load_per_year", "share_of_load"),
        rows=tuple((band.above_km, band.to_km, band.load, band.share) for band in plan.service.bands),
    )
    return money, bands
