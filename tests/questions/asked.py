"""What tests of the questions share: rulings changed by name, charges raised, stores that count."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from siting.plan.proof import PROVED_GAP
from siting.questions.store import MemoryStore
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from siting.questions.resolved import Resolved
    from siting.questions.store import Key
    from siting.study.tables import Study

EXACT = SolveSettings(gap=PROVED_GAP, engine="direct")


class CountingStore(MemoryStore):
    """A store that counts what is put into it."""

    def __init__(self) -> None:
        super().__init__()
        self.keys: list[Key] = []

    def put(self, key: Key, answer: Resolved) -> None:
        """Count and keep."""
        self.keys.append(key)
        super().put(key, answer)


def ruled(study: Study, name: str, site: SiteRuling, supplier: SupplierRuling) -> Study:
    """Return the study with another ruling on one site or supplier."""
    return replace(
        study,
        sites=tuple(replace(row, ruling=site) if row.site == name else row for row in study.sites),
        suppliers=tuple(replace(row, ruling=supplier) if row.supplier == name else row for row in study.suppliers),
    )


def freed(study: Study, name: str) -> Study:
    """Return the study without the ruling of one site or supplier."""
    return ruled(study, name, SiteRuling.FREE, SupplierRuling.FREE)


def held_out(study: Study, name: str) -> Study:
    """Return the study with one site shut or one supplier unsigned."""
    return ruled(study, name, SiteRuling.PINNED_SHUT, SupplierRuling.PINNED_UNSIGNED)


def held_in(study: Study, name: str) -> Study:
    """Return the study with one site open or one supplier signed."""
    return ruled(study, name, SiteRuling.PINNED_OPEN, SupplierRuling.PINNED_SIGNED)


def using(study: Study, name: str, load: float) -> Study:
    """Return the study in which at least this load moves through one site or supplier, pinned open or signed."""
    study = held_in(study, name)
    return replace(
        study,
        sites=tuple(
            replace(row, least_throughput=max(row.least_throughput, load)) if _sized(study, row.site, name) else row
            for row in study.sites
        ),
        sizes=tuple(
            replace(row, least_throughput=max(row.least_throughput, load)) if row.site == name else row
            for row in study.sizes
        ),
        suppliers=tuple(
            replace(row, least_yearly=max(row.least_yearly, load)) if row.supplier == name else row
            for row in study.suppliers
        ),
    )


def _sized(study: Study, site: str, name: str) -> bool:
    return site == name and all(row.site != name for row in study.sizes)


def dearer(study: Study, name: str, amount: float) -> Study:
    """Return the study with a higher yearly charge of one site (every size of it) or supplier."""
    return replace(
        study,
        sites=tuple(
            replace(row, yearly_charge=row.yearly_charge + amount) if _sized(study, row.site, name) else row
            for row in study.sites
        ),
        sizes=tuple(
            replace(row, yearly_charge=row.yearly_charge + amount) if row.site == name else row for row in study.sizes
        ),
        suppliers=tuple(
            replace(row, yearly_charge=row.yearly_charge + amount) if row.supplier == name else row
            for row in study.suppliers
        ),
    )
