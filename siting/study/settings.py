"""Every setting of a study, its default and its range, in one place."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True, kw_only=True)
class SolveSettings:
    """How long and how hard to solve: the `[solve]` section of `study.toml`."""

    gap: float = 1e-4
    """Stop once (cost - bound) / |cost| is this small; 0 asks for a full proof. In [0, 1)."""

    time_limit_s: float = 120.0
    """Seconds of solving after which the best plan so far is returned. Above 0."""

    engine: str = "auto"
    """One of `ENGINES`."""


ENGINES = ("auto", "direct", "bounding", "cbc")
"""
`auto` picks by size; `direct` is HiGHS on the whole model, `bounding` our own search for large studies, `cbc` the
cross-check on the same model as `direct`.
"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """The settings of `study.toml`; None means not set."""

    title: str = ""
    """Name of the study, shown in headlines."""

    currency: str = ""
    """ISO 4217 code; compulsory."""

    unit: str = ""
    """Name of the amount unit, such as `t`; compulsory."""

    circuity: float = 1.3
    """Road distance over geodesic distance where `lanes` gives no road_km. In [1, 5]."""

    outbound_rate: float = 0.0
    """Money per unit of load and road km, from a site or supplier to a customer. At least 0."""

    inbound_rate: float = 0.0
    """Money per unit of load and road km, from a supplier to a site. At least 0."""

    drop_charge: float = 0.0
    """Money per delivery to a customer. At least 0; needs drop_size."""

    drop_size: float | None = None
    """Load per delivery, where `customers` says nothing else. Above 0."""

    inbound_size: float | None = None
    """Load per shipment from a supplier to a site; only tariffs use it. Above 0."""

    interest_rate: float | None = None
    """Interest a year as a fraction, 8 % as 0.08, in [0, 1); compulsory while any one-off charge is not 0."""

    life_years: float | None = None
    """Years over which one-off charges are spread. Above 0; compulsory while any one-off charge is not 0."""

    service_km: float | None = None
    """Road km within which a customer counts as served well. Above 0; needs service_share."""

    service_share: float | None = None
    """Least share of all weight delivered within service_km, 90 % as 0.9, in [0, 1); needs service_km."""

    fewest_sites: int | None = None
    """Least number of sites open. At least 0."""

    most_sites: int | None = None
    """Greatest number of sites open. At least 0."""

    one_off_budget: float | None = None
    """Greatest sum of opening, closing, signing and dropping charges, not annualised. At least 0."""

    single_source: bool = False
    """Whether each customer takes all its goods from one origin, where `customers` says nothing else."""

    emission_kg_per_tkm: float | None = None
    """kg CO2e per tonne and road km; None = emissions are not reported. At least 0."""

    carbon_price_per_t: float = 0.0
    """Money per tonne CO2e, added to the cost. At least 0; needs emission_kg_per_tkm."""

    solve: SolveSettings = field(default_factory=SolveSettings)
    """The `[solve]` section."""
