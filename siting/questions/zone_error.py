"""How wrong zones are: plan on them, hold the verdicts, and price the plan on all customers."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.network.decisions import NO_SOURCE, Decisions
from siting.network.network import build_network
from siting.plan.plan import CostLine
from siting.plan.pricing import cost_lines, moves_of
from siting.solving.flows import flows_for
from siting.solving.solve import solve

if TYPE_CHECKING:
    from siting.arrays import Positions
    from siting.listener import Listener, Stop
    from siting.network.network import Network
    from siting.plan.plan import Answer, Plan
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study
    from siting.study.zones import Zoned

DELIVERING = (CostLine.OUTBOUND, CostLine.DIRECT, CostLine.DELIVERY)
"""Cost lines of the way to customers, which zones shorten."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ZoneError:
    """What a plan made on zones costs on zones and on the customers in them."""

    answer: Answer
    """On the zones."""
    cost: float | None
    """Money a year on all customers, verdicts held; None where there is no plan, or it cannot serve them."""
    delivering: float | None
    """Money a year of the way to customers, likewise."""
    reason: str
    """Why there is no cost, in words; empty where there is one."""
    left_out: str = ""
    """Which limit the customers do not meet although the zones do, so that it was left out of the price."""

    @property
    def plan(self) -> Plan | None:
        """The plan on the zones."""
        return self.answer.plan

    @property
    def cost_error(self) -> float | None:
        """(cost on zones - cost on customers) / cost on customers; below 0 where zones understate it."""
        return None if self.plan is None else _share(self.plan.cost, self.cost)

    @property
    def delivering_error(self) -> float | None:
        """The same for the way to customers."""
        if self.plan is None:
            return None
        return _share(sum(self.plan.cost_lines[line] for line in DELIVERING), self.delivering)


def _share(on_zones: float, on_customers: float | None) -> float | None:
    return None if on_customers is None or not on_customers else (on_zones - on_customers) / abs(on_customers)


def zone_error(
    study: Study,
    zoned: Zoned,
    settings: SolveSettings | None = None,
    *,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> ZoneError:
    """
    Plan a study of zones and price that plan on all customers.

    Parameters
    ----------
    study
        Of all customers; checked.
    zoned
        Its zones; the study of zones is checked.
    settings
        Gap, time limit and engine of the plan on the zones; the study's own where None.
    listener
        Told how far the search is.
    stop
        Once requested, the best plan so far is priced.

    Returns
    -------
    error
        Open sites, sizes and signed suppliers are those of the plan on the zones, single-sourced customers get
        everything from the origin of their zone; all flows are found anew. Least volumes and the service share are kept
        where the customers can keep them, and otherwise left out and named.

    Raises
    ------
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If the plan on the zones fails its audit.
    """
    answer = solve(zoned.study, settings, listener=listener, stop=stop)
    if answer.plan is None:
        reason = f"there is no plan on the zones: {answer.proof.outcome}"
        return ZoneError(answer=answer, cost=None, delivering=None, reason=reason)
    network = build_network(study)
    decisions = _held(network, answer.plan, study, zoned)
    for left_out, easier in _easier(network):
        amounts = flows_for(easier, decisions)
        if amounts is not None:
            lines = cost_lines(study, network, decisions, moves_of(study, network, amounts))
            return ZoneError(
                answer=answer,
                cost=sum(lines.values()),
                delivering=sum(lines[line] for line in DELIVERING),
                reason="",
                left_out=left_out,
            )
    reason = (
        "the sites and suppliers chosen on the zones cannot serve every single customer: a reach, a barred lane or a "
        "capacity holds at a customer that does not hold at its zone's centre. Take more zones"
    )
    return ZoneError(answer=answer, cost=None, delivering=None, reason=reason)


def _easier(network: Network) -> list[tuple[str, Network]]:
    """Return the network, then without the service share, then without least volumes too; and what is left out."""
    without_share = replace(network, service_share=0.0)
    without_least = replace(
        without_share,
        option_least=np.zeros_like(network.option_least),
        supplier_least=np.zeros_like(network.supplier_least),
        offer_least=np.zeros_like(network.offer_least),
    )
    return [
        ("", network),
        ("the service share", without_share),
        ("the service share and least volumes", without_least),
    ]


def _held(network: Network, plan: Plan, study: Study, zoned: Zoned) -> Decisions:
    """Return the verdicts of the plan on zones as decisions on all customers."""
    size = {line.site: line.size for line in plan.sites if line.verdict in {"keep", "open"}}
    signed = {line.supplier for line in plan.suppliers if line.verdict in {"stay", "sign"}}
    options = [option.site in size and option.size == size[option.site] for option in study.options]
    return Decisions(
        option_open=np.array(options, dtype=np.bool_),
        supplier_signed=np.array([row.supplier in signed for row in study.suppliers], dtype=np.bool_),
        source=_sources(network, plan, zoned),
    )


def _sources(network: Network, plan: Plan, zoned: Zoned) -> Positions:
    """Return the origin of each single-sourced customer: that of its zone."""
    origins = {name: at for at, name in enumerate((*network.sites, *network.suppliers))}
    of_zone = np.array(
        [origins[line.origins[0]] if line.origins else NO_SOURCE for line in plan.customers] + [NO_SOURCE],
        dtype=np.int32,
    )
    return np.where(network.single_source, of_zone[zoned.zone], NO_SOURCE).astype(np.int32)
