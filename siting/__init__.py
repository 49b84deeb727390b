"""
Decide which sites to open, keep or close and which suppliers to sign.

Every public name is fetched when it is first used, so that importing the package costs nothing.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from siting.errors import (
        AuditError,
        DataFileError,
        EngineError,
        Fault,
        PlanFileError,
        SettingsError,
        SitingError,
        StudyError,
    )
    from siting.listener import Listener, Progress, Silent, Stop
    from siting.network.network import Network, build_network
    from siting.plan.audit import audit
    from siting.plan.folder import read_plan_folder, write_plan_folder
    from siting.plan.plan import Answer, Plan, Today
    from siting.plan.proof import Outcome, Proof
    from siting.questions.closing import closing
    from siting.questions.closing_result import ClosingTest
    from siting.questions.compare import Named, compare, read_named
    from siting.questions.compare_result import Comparison
    from siting.questions.counts import counts
    from siting.questions.counts_result import Counts
    from siting.questions.headroom import headroom
    from siting.questions.headroom_result import Headroom
    from siting.questions.runners_up import runners_up
    from siting.questions.runners_up_result import RunnersUp
    from siting.questions.shortlist import Shortlist, shortlist
    from siting.questions.store import MemoryStore, Store
    from siting.questions.zone_error import ZoneError, zone_error
    from siting.sharing.map import MapPage, draw_differences, draw_map, write_map
    from siting.solving.solve import solve
    from siting.study.demo import demo_folder
    from siting.study.fingerprint import fingerprint
    from siting.study.locate import Found, find_place
    from siting.study.orders import OrderColumns, OrderReading, Rollup, roll_up
    from siting.study.read import read_study
    from siting.study.settings import Settings, SolveSettings
    from siting.study.tables import Study
    from siting.study.variant import Variant, read_variant, write_variant
    from siting.study.varying import Varied, vary
    from siting.study.write import write_study, write_workbook
    from siting.study.zones import Zoned, zone_study

    __version__: str

__all__ = [
    "Answer",
    "AuditError",
    "ClosingTest",
    "Comparison",
    "Counts",
    "DataFileError",
    "EngineError",
    "Fault",
    "Found",
    "Headroom",
    "Listener",
    "MapPage",
    "MemoryStore",
    "Named",
    "Network",
    "OrderColumns",
    "OrderReading",
    "Outcome",
    "Plan",
    "PlanFileError",
    "Progress",
    "Proof",
    "Rollup",
    "RunnersUp",
    "Settings",
    "SettingsError",
    "Shortlist",
    "Silent",
    "SitingError",
    "SolveSettings",
    "Stop",
    "Store",
    "Study",
    "StudyError",
    "Today",
    "Variant",
    "Varied",
    "ZoneError",
    "Zoned",
    "__version__",
    "audit",
    "build_network",
    "closing",
    "compare",
    "counts",
    "demo_folder",
    "draw_differences",
    "draw_map",
    "find_place",
    "fingerprint",
    "headroom",
    "read_named",
    "read_plan_folder",
    "read_study",
    "read_variant",
    "roll_up",
    "runners_up",
    "shortlist",
    "solve",
    "vary",
    "write_map",
    "write_plan_folder",
    "write_study",
    "write_variant",
    "write_workbook",
    "zone_error",
    "zone_study",
]

_HOMES = {
    "siting.study.zones": ("Zoned", "zone_study"),
    "siting.study.orders": ("OrderColumns", "OrderReading", "Rollup", "roll_up"),
    "siting.study.locate": ("Found", "find_place"),
    "siting.questions.zone_error": ("ZoneError", "zone_error"),
    "siting.errors": (
        "AuditError",
        "DataFileError",
        "EngineError",
        "Fault",
        "PlanFileError",
        "SettingsError",
        "SitingError",
        "StudyError",
    ),
    "siting.listener": ("Listener", "Progress", "Silent", "Stop"),
    "siting.network.network": ("Network", "build_network"),
    "siting.plan.audit": ("audit",),
    "siting.plan.folder": ("read_plan_folder", "write_plan_folder"),
    "siting.plan.plan": ("Answer", "Plan", "Today"),
    "siting.plan.proof": ("Outcome", "Proof"),
    "siting.sharing.map": ("MapPage", "draw_differences", "draw_map", "write_map"),
    "siting.questions.closing": ("closing",),
    "siting.questions.closing_result": ("ClosingTest",),
    "siting.questions.compare": ("Named", "compare", "read_named"),
    "siting.questions.compare_result": ("Comparison",),
    "siting.questions.counts": ("counts",),
    "siting.questions.counts_result": ("Counts",),
    "siting.questions.headroom": ("headroom",),
    "siting.questions.headroom_result": ("Headroom",),
    "siting.questions.runners_up": ("runners_up",),
    "siting.questions.runners_up_result": ("RunnersUp",),
    "siting.questions.shortlist": ("Shortlist", "shortlist"),
    "siting.questions.store": ("MemoryStore", "Store"),
    "siting.solving.solve": ("solve",),
    "siting.study.demo": ("demo_folder",),
    "siting.study.fingerprint": ("fingerprint",),
    "siting.study.read": ("read_study",),
    "siting.study.settings": ("Settings", "SolveSettings"),
    "siting.study.tables": ("Study",),
    "siting.study.variant": ("Variant", "read_variant", "write_variant"),
    "siting.study.varying": ("Varied", "vary"),
    "siting.study.write": ("write_study", "write_workbook"),
}


def __getattr__(name: str) -> object:
    """
    Fetch a public name when it is first used.

    Raises
    ------
    AttributeError
        If the package has no such public name.
    """
    if name == "__version__":
        return importlib.import_module("importlib.metadata").version("siting")
    for home, names in _HOMES.items():
        if name in names:
            value: object = getattr(importlib.import_module(home), name)
            globals()[name] = value
            return value
    msg = f"module {__name__!r} has no attribute {name!r}"
    raise AttributeError(msg)


def __dir__() -> list[str]:
    """List the public names."""
    return __all__
