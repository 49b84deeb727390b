"""
A plan: the solved answer of a study, in the study's own names.

Money is yearly unless a name says one-off; amounts are units of a good a year; load = amount x the good's load.
Everything here is identifiers and numbers, so that a plan outlives the arrays it came from.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.plan.proof import Proof
    from siting.study.tables import Leg

LOAD_TOLERANCE = 1e-6
"""Load treated as nothing: a site or supplier is *used* where more than this moves through it."""


class SiteVerdict(StrEnum):
    """What the plan does with a site."""

    KEEP = "keep"
    """Running, stays open."""
    OPEN = "open"
    """Proposed, opens."""
    CLOSE = "close"
    """Running, closes."""
    LEAVE = "leave"
    """Proposed, is left alone."""


class SupplierVerdict(StrEnum):
    """What the plan does with a supplier."""

    STAY = "stay"
    """Signed, stays."""
    SIGN = "sign"
    """Offered, is signed."""
    DROP = "drop"
    """Signed, is dropped."""
    LEAVE = "leave"
    """Offered, is left alone."""


class CostLine(StrEnum):
    """The parts a plan's cost adds up from, each in money a year."""

    OPENING = "opening"
    """Annualised opening charges, less annualised residual values."""
    SITES = "sites"
    """Yearly charges of open sites."""
    CLOSING = "closing"
    """Annualised closing charges."""
    SIGNING = "signing"
    """Annualised signing charges."""
    SUPPLIERS = "suppliers"
    """Yearly charges of signed suppliers."""
    DROPPING = "dropping"
    """Annualised dropping charges."""
    GOODS = "goods"
    """Prices of goods bought."""
    INBOUND = "inbound"
    """Freight from suppliers to sites."""
    HANDLING = "handling"
    """Handling at sites."""
    OUTBOUND = "outbound"
    """Freight from sites to customers, without delivery charges."""
    DIRECT = "direct"
    """Freight from suppliers straight to customers, without delivery charges."""
    DELIVERY = "delivery"
    """Delivery charges at customers."""
    CARBON = "carbon"
    """Carbon price times emissions."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteLine:
    """A site in the plan."""

    site: str
    verdict: SiteVerdict
    size: str
    """Size open; "" where closed or the site has no sizes."""
    throughput: float
    """Load a year."""
    capacity: float | None
    """Load a year of the open option; None = unlimited, or closed."""
    customers: int
    """Number of customers it serves."""
    charge: float
    """What the verdict costs a year: yearly and annualised opening, or annualised closing."""
    one_off: float
    """What the verdict costs once: opening or closing."""
    note: str = ""
    """Such as `empty: closing costs more than running`."""

    @property
    def utilisation(self) -> float | None:
        """Throughput over capacity; None where unlimited or closed."""
        return self.throughput / self.capacity if self.capacity else None


@dataclass(frozen=True, slots=True, kw_only=True)
class SupplierLine:
    """A supplier in the plan."""

    supplier: str
    verdict: SupplierVerdict
    volume: float
    """Load a year."""
    capacity: float | None
    """Load a year it can deliver over all goods; None = unlimited. Offers' capacities counted in load."""
    charge: float
    """What the verdict costs a year: yearly and annualised signing, or annualised dropping."""
    one_off: float
    """What the verdict costs once."""
    note: str = ""

    @property
    def utilisation(self) -> float | None:
        """Volume over capacity; None where unlimited."""
        return self.volume / self.capacity if self.capacity else None


@dataclass(frozen=True, slots=True, kw_only=True)
class Flow:
    """Units of one good on one lane."""

    leg: Leg
    origin: str
    destination: str
    good: str
    amount: float
    """Units of the good a year, above 0."""
    km: float | None
    """Road km; None where nothing gives it."""
    km_given: bool
    """True where `lanes` gives the distance, False where estimated."""
    cost: float
    """Money a year of this flow: freight, delivery, carbon and handling (outbound) or price (inbound, direct)."""
    tariff: str = ""
    """The tariff that sets its freight; "" = `lanes` or the rates of the settings."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerLine:
    """A customer in the plan."""

    customer: str
    origins: tuple[str, ...]
    """Sites (or suppliers, by drop shipment) that serve it, most load first."""
    load: float
    """Load a year."""
    km: float | None
    """Average road km by load; None where a lane has none."""
    cost_to_serve: float
    """Money a year: own freight, delivery, handling, carbon and price, inbound at its site's average. No charges."""
    marginal_cost: Mapping[str, float]
    """Money per unit of each good: dual of the demand row, verdicts held; not for pricing. Empty if single-sourced."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Band:
    """Share of load delivered within a band of road km."""

    above_km: float
    to_km: float | None
    """None = without limit."""
    load: float
    share: float
    """Of all load delivered, in [0, 1]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Service:
    """How far customers are from what serves them."""

    average_km: float | None
    """By load; None where any used lane has no distance."""
    bands: tuple[Band, ...]
    """Empty where any used lane has no distance."""
    share_within: float | None
    """Share of weight delivered within service_km; None where it is not set."""
    estimated_share: float | None
    """Share of load delivered over lanes whose distance is estimated; None where no lane has one."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Unserved:
    """Demand that cannot be served."""

    customer: str
    good: str
    amount: float


class TodayOutcome(StrEnum):
    """Whether today's sites and suppliers can serve the demand."""

    SERVED = "served"
    SHORT = "short"
    """Some demand is unserved; no saving is stated."""
    ABSENT = "absent"
    """Nothing running, or nothing signed where suppliers exist: there is no today."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Today:
    """The running sites and signed suppliers as they are, flows re-planned."""

    outcome: TodayOutcome
    reason: str
    """One sentence: why there is no today, or how much is unserved; empty when served."""
    plan: Plan | None
    """The plan of today when served (its own `today` is None)."""
    unserved: tuple[Unserved, ...] = ()
    """The least load that cannot be served, when short."""

    @property
    def cost(self) -> float | None:
        """Money a year; None unless served."""
        return self.plan.proof.cost if self.plan else None


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """A solved answer: verdicts, flows, cost lines, proof."""

    title: str
    currency: str
    unit: str
    fingerprint: str
    """Of the study it answers."""
    proof: Proof
    sites: tuple[SiteLine, ...]
    """In the order of the table, all of them."""
    suppliers: tuple[SupplierLine, ...]
    """In the order of the table, all of them."""
    flows: tuple[Flow, ...]
    customers: tuple[CustomerLine, ...]
    """In the order of the table, all of them."""
    cost_lines: Mapping[CostLine, float]
    """Every line; they add up to `proof.cost`."""
    service: Service
    tonnes_co2e: float | None
    """Tonnes CO2e a year; None where no factor is set (not reported, never 0)."""
    one_off: float
    """One-off money: opening + closing + signing + dropping."""
    today: Today | None
    """None only in the plan of today itself."""
    warnings: tuple[str, ...] = ()

    @property
    def cost(self) -> float:
        """Money a year."""
        return sum(self.cost_lines.values())

    @property
    def saving(self) -> float | None:
        """Today's cost less this plan's; None where today cannot serve everything or does not exist."""
        cost = self.today.cost if self.today else None
        return None if cost is None else cost - self.cost


@dataclass(frozen=True, slots=True, kw_only=True)
class Reason:
    """One family of requirements that, relaxed alone (or with the others listed), makes the study possible."""

    family: str
    """Which requirements: capacity, reach, budget, counts, rules, ... (see `solving/impossible.py`)."""
    sentence: str
    """In words, with the smallest repair in its own unit."""
    amount: float | None
    """The smallest repair as a number; None where it has no number."""
    unit: str
    """Unit of `amount`."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """What `solve` returns: a plan with its proof, or why there is none."""

    proof: Proof
    plan: Plan | None
    """None when stopped before any plan, or impossible."""
    today: Today | None
    reasons: tuple[Reason, ...] = ()
    """When impossible: each alone repairs the study; or, `together`, only all of them do."""
    together: bool = False
    """True when only all the reasons taken together repair the study."""
