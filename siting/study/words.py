"""What a study is, and what is wrong with it, in one sentence each."""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING

from siting.study.tables import SiteStanding, SupplierStanding

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from siting.errors import Fault
    from siting.study.tables import Study


def study_sentence(study: Study) -> str:
    """Return what the study holds, such as `17 sites (5 running), 9 suppliers (3 signed), 150 customers, 2 goods`."""
    running = sum(row.standing is SiteStanding.RUNNING for row in study.sites)
    signed = sum(row.standing is SupplierStanding.SIGNED for row in study.suppliers)
    parts = [
        f"{counted(len(study.sites), 'site')} ({running} running)" if study.sites else "",
        f"{counted(len(study.suppliers), 'supplier')} ({signed} signed)" if study.suppliers else "",
        counted(len(study.customers), "customer"),
        counted(len(study.all_goods), "good"),
    ]
    listed = ", ".join(part for part in parts if part)
    loads = {good.good: good.load for good in study.all_goods}
    load = sum(row.demand * loads[row.good] for row in study.all_demands)
    needed = f"{load:,.0f} {study.settings.unit} a year"
    return f"{study.settings.title or 'Study'}: {listed}; {needed} to serve"


def faults_sentence(faults: Sequence[Fault], warnings: Sequence[Fault]) -> str:
    """Return how many faults and warnings there are in which tables: `3 faults in customers, 1 warning in lanes`."""
    parts = [*_by_table(faults, "fault"), *_by_table(warnings, "warning")]
    return ", ".join(parts) if parts else "No fault, no warning"


def counted(count: int, name: str) -> str:
    """Return a count with its noun, in the plural unless it is 1."""
    return f"{count:,} {name}" if count == 1 else f"{count:,} {name}s"


def _by_table(found: Iterable[Fault], name: str) -> list[str]:
    counts = Counter(fault.table for fault in found)
    return [f"{counted(count, name)} in {table}" for table, count in counts.items()]
