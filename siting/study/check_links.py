"""Check that tables agree with one another: which are there, what they refer to, sizes, demands and offers."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.study.columns import SIZED_COLUMNS
from siting.study.tables import SiteStanding

if TYPE_CHECKING:
    from siting.study.draft import Draft


def check_links(draft: Draft) -> None:
    """Note every fault between tables, rules and lanes aside."""
    _check_presence(draft)
    _check_sizes(draft)
    _check_running_sizes(draft)
    _check_demand_place(draft)
    _check_demands(draft)
    _check_offers(draft)
    _check_offered(draft)


def _check_presence(draft: Draft) -> None:
    fault = draft.gathering.fault
    if not draft.has("customers"):
        fault("customers", None, "", "", "the table is missing or has no rows", "Add it, with a row for each customer")
    if not draft.has("sites") and not draft.has("suppliers"):
        wrong = "neither sites nor suppliers are there, so that there is nothing to decide"
        fault("sites", None, "", "", wrong, "Add the table sites or the table suppliers, with a row for each")
    for table, needs in (("sizes", "sites"), ("offers", "suppliers"), ("demands", "customers")):
        if draft.tables[table].there and not draft.has(needs) and needs != "customers":
            fault(table, None, "", "", f"the table is there without {needs}", f"Add {needs}, or delete {table}")


def _check_sizes(draft: Draft) -> None:
    if not draft.has("sites"):
        return
    for size in draft.sizes.rows:
        draft.check_known("sizes", size.row, "site", size.site, "sites")
    for index, site in enumerate(draft.sites.rows):
        if site.site not in draft.size_count:
            continue
        for column in SIZED_COLUMNS:
            typed = draft.sites.typed(index, column)
            if typed:
                draft.gathering.fault(
                    "sites", site.row, column, typed,
                    f"site {site.site!r} has sizes, so that {column} is said by sizes",
                    "Clear the cell here, or delete the rows of the site in sizes",
                )  # fmt: skip


def _check_running_sizes(draft: Draft) -> None:
    """Note running sites without exactly one running size, and proposed sites with one."""
    gathering = draft.gathering
    running: dict[str, list[int]] = {}
    for size in draft.sizes.rows:
        if size.standing is SiteStanding.RUNNING:
            running.setdefault(size.site, []).append(size.row)
    doubtful = {size.site for size in draft.sizes.rows if gathering.hurt("sizes", size.row, "standing")}
    for site in draft.sites.rows:
        if site.site not in draft.size_count or site.site in doubtful or gathering.hurt("sites", site.row, "standing"):
            continue
        rows = running.get(site.site, [])
        if site.standing is SiteStanding.RUNNING and not rows:
            gathering.fault(
                "sizes", None, "standing", "", f"site {site.site!r} is running, but none of its sizes is",
                "Write running in the row of the size in place",
            )  # fmt: skip
        elif site.standing is SiteStanding.RUNNING:
            for row in rows[1:]:
                gathering.fault(
                    "sizes", row, "standing", "running", f"row {rows[0]} is already the running size of the site",
                    "Write running in one row only, proposed in the others",
                )  # fmt: skip
        else:
            for row in rows:
                gathering.fault(
                    "sizes", row, "standing", "running", f"site {site.site!r} is not running in sites",
                    "Write proposed here, or running in sites",
                )  # fmt: skip


def _check_demand_place(draft: Draft) -> None:
    """Note demand that is said twice or nowhere."""
    gathering, customers = draft.gathering, draft.customers
    if not customers.there or "demands" in draft.unreadable:
        return
    if draft.demands.there:
        typed = [row.row for index, row in enumerate(customers.rows) if customers.typed(index, "demand")]
        if typed:
            wrong = f"demand is said here (first in row {typed[0]}) and in the table demands"
            gathering.fault(
                "customers", None, "demand", "", wrong, "Clear the column here, or delete the table demands"
            )
        return
    if "demand" not in customers.texts:
        if not gathering.hurt("customers", None, "demand"):
            wrong = "the column is missing, and there is no table demands"
            gathering.fault("customers", None, "demand", "", wrong, "Add the column, or the table demands")
        return
    for index, row in enumerate(customers.rows):
        if not customers.typed(index, "demand"):
            wrong = "blank, and there is no table demands"
            gathering.fault("customers", row.row, "demand", "", wrong, "Write a number, 0 if that is meant")
    if len(draft.goods.rows) > 1:
        wrong = "there are several goods, so that the demand of a customer does not say of which"
        gathering.fault("customers", None, "demand", "", wrong, "Say the demand by good in the table demands")


def _check_demands(draft: Draft) -> None:
    gathering = draft.gathering
    total: dict[str, float] = {}
    for row in draft.demands.rows:
        if draft.has("customers"):
            draft.check_known("demands", row.row, "customer", row.customer, "customers")
        draft.check_known("demands", row.row, "good", row.good, "goods")
        total[row.customer] = total.get(row.customer, 0.0) + row.demand
    if "demands" in draft.unreadable or not draft.customers.there or not draft.is_sound("customers"):
        return
    by_good = draft.demands.there
    doubtful = any(gathering.hurt("demands", row.row, "customer", "good", "demand") for row in draft.demands.rows)
    doubtful |= any(gathering.hurt("customers", row.row, "demand") for row in draft.customers.rows)
    doubtful |= gathering.hurt("customers", None, "demand") or gathering.hurt("demands", None, "demand")
    if doubtful:
        return
    needed = [total.get(row.customer, 0.0) if by_good else row.demand or 0.0 for row in draft.customers.rows]
    if not any(needed):
        gathering.fault("customers", None, "demand", "", "no customer needs anything", "Write a demand above 0")
        return
    for customer, demand in zip(draft.customers.rows, needed, strict=True):
        if not demand:
            wrong = f"customer {customer.customer!r} needs nothing"
            gathering.warn("customers", customer.row, "demand", "", wrong, "Write its demand, or delete the row")


def _check_offers(draft: Draft) -> None:
    if not draft.has("suppliers"):
        return
    for row in draft.offers.rows:
        draft.check_known("offers", row.row, "supplier", row.supplier, "suppliers")
        draft.check_known("offers", row.row, "good", row.good, "goods")
    if not draft.offers.there:
        return
    offering = {row.supplier for row in draft.offers.rows}
    for index, supplier in enumerate(draft.suppliers.rows):
        if supplier.supplier and supplier.supplier not in offering:
            wrong = f"supplier {supplier.supplier!r} offers nothing, since offers has no row for it"
            draft.gathering.warn("suppliers", supplier.row, "supplier", "", wrong, "Add its goods to offers")
        if supplier.unit_price:
            draft.gathering.fault(
                "suppliers", supplier.row, "unit_price", draft.suppliers.typed(index, "unit_price"),
                "prices are said by the table offers, this one would not count", "Clear the cell, or delete offers",
            )  # fmt: skip


def _check_offered(draft: Draft) -> None:
    """Note demanded goods that nobody offers."""
    gathering = draft.gathering
    if not draft.offers.there or not draft.suppliers.there:
        return
    if any(gathering.hurt("offers", row.row, "good", "supplier") for row in draft.offers.rows):
        return
    offered = {row.good for row in draft.offers.rows}
    if draft.demands.there:
        demanded = {row.good: row.row for row in reversed(draft.demands.rows) if row.demand > 0}
    else:
        goods = list(draft.names["goods"])
        demanded = {goods[0]: 0} if len(goods) == 1 else {}
    for good in demanded:
        known = good in draft.names["goods"]
        if good and known and good not in offered:
            wrong = f"customers need good {good!r}, but no supplier offers it"
            gathering.fault("offers", None, "good", good, wrong, "Add a row for a supplier that offers it")
