"""The audit's checks of what is decided: verdicts, sizes, charges, rulings, rules, counts and one-off money."""

from __future__ import annotations

import math
from collections import Counter
from typing import TYPE_CHECKING

from siting.plan.audit_books import differs, exceeds, shown
from siting.plan.plan import LOAD_TOLERANCE
from siting.study.tables import RuleKind, SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from collections.abc import Collection, Iterable, Iterator

    from siting.plan.audit_books import Books
    from siting.plan.plan import SiteLine, SupplierLine
    from siting.study.settings import Settings
    from siting.study.tables import RuleRow, SizeRow


def check_verdicts(books: Books) -> Iterator[str]:
    """Yield what is wrong with the verdicts themselves."""
    yield from every_one_once("site", (line.site for line in books.plan.sites), books.sites)
    yield from every_one_once("supplier", (line.supplier for line in books.plan.suppliers), books.suppliers)
    for site in books.plan.sites:
        if site.site in books.sites:
            yield from _site(books, site)
    for supplier in books.plan.suppliers:
        if supplier.supplier in books.suppliers:
            yield from _supplier(books, supplier)
    yield from _one_off(books)


def every_one_once(kind: str, listed: Iterable[str], wanted: Collection[str]) -> Iterator[str]:
    """Yield names that are missing, unknown or listed more than once (two sizes of one site would be)."""
    counts = Counter(listed)
    for name in wanted:
        if counts[name] != 1:
            yield f"{kind} {name} has {counts[name] or 'no'} line{'s' if counts[name] else ''} instead of one"
    for name in counts.keys() - set(wanted):
        yield f"{kind} {name} is in no table"


def _site(books: Books, line: SiteLine) -> Iterator[str]:
    """Yield what is wrong with one site's verdict, size, capacity and charges."""
    name, running = line.site, line.site in books.running
    is_open = books.is_open(name)
    fitting = {True: ("keep", "close"), False: ("open", "leave")}[running]
    if line.verdict not in fitting:
        yield f"site {name} is {'running' if running else 'proposed'}, which does not go with verdict {line.verdict}"
    option = books.option(name)
    if is_open and option is None:
        yield f"site {name} is open at size {line.size!r}, which it does not have"
        return
    if not is_open and line.size:
        yield f"site {name} is not open but has size {line.size!r}"
    if books.of_today and running and (not is_open or line.size != books.running[name]):
        yield f"site {name} is running at size {books.running[name]!r} today, not {line.verdict} at size {line.size!r}"
    if books.of_today and not running and is_open:
        yield f"site {name} is proposed, so it is not open today"
    limit = None if option is None or option.capacity == math.inf else option.capacity
    if line.capacity != limit and (line.capacity is None or limit is None or differs(line.capacity, limit, limit)):
        yield f"site {name}: capacity is stated as {line.capacity}, the tables give {limit}"
    yield from _money(books, f"site {name}", line, site_charges(books, line, option))
    if line.note.startswith("empty") and line.throughput > LOAD_TOLERANCE:
        yield f"site {name} is noted as empty but moves {shown(line.throughput)} {books.study.settings.unit}"
    if option is not None and "closing costs more" in line.note:
        closing = spread(books.study.settings, books.sites[name].closing_charge) if running else 0.0
        if closing <= line.charge:
            yield f"site {name} is noted as dearer to close than to run: {shown(closing)} against {shown(line.charge)}"
    if books.of_today:
        return
    ruling = books.sites[name].ruling
    if ruling is SiteRuling.PINNED_OPEN and not is_open:
        yield f"site {name} is pinned open but the verdict is {line.verdict}"
    if ruling is SiteRuling.PINNED_SHUT and is_open:
        yield f"site {name} is pinned shut but the verdict is {line.verdict}"


def _supplier(books: Books, line: SupplierLine) -> Iterator[str]:
    """Yield what is wrong with one supplier's verdict, capacity and charges."""
    name, was = line.supplier, line.supplier in books.signed
    now = books.is_signed(name)
    fitting = {True: ("stay", "drop"), False: ("sign", "leave")}[was]
    if line.verdict not in fitting or (books.of_today and was is not now):
        when = " today" if books.of_today else ""
        standing = "signed" if was else "offered"
        yield f"supplier {name} is {standing}{when}, which does not go with verdict {line.verdict}"
    limit = supplier_capacity(books, name)
    stated = math.inf if line.capacity is None else line.capacity
    if stated != limit and (math.inf in {stated, limit} or differs(stated, limit, limit)):
        yield f"supplier {name}: capacity is stated as {shown(stated)}, the tables give {shown(limit)}"
    yield from _money(books, f"supplier {name}", line, supplier_charges(books, line))
    if books.of_today:
        return
    ruling = books.suppliers[name].ruling
    if ruling is SupplierRuling.PINNED_SIGNED and not now:
        yield f"supplier {name} is pinned signed but the verdict is {line.verdict}"
    if ruling is SupplierRuling.PINNED_UNSIGNED and now:
        yield f"supplier {name} is pinned unsigned but the verdict is {line.verdict}"


def supplier_capacity(books: Books, supplier: str) -> float:
    """Return what a supplier can deliver over all goods, load a year; inf = unlimited."""
    own = books.suppliers[supplier].capacity
    offered = 0.0
    for (name, good), offer in books.offers.items():
        if name == supplier:
            offered += math.inf if offer.capacity is None else offer.capacity * books.goods[good].load
    return min(math.inf if own is None else own, offered)


def spread(settings: Settings, one_off: float) -> float:
    """Return one-off money as money a year: a level payment over the life whose present worth it is."""
    if one_off == 0.0 or settings.interest_rate is None or settings.life_years is None:
        return 0.0
    if settings.interest_rate == 0.0:
        return one_off / settings.life_years
    growth = math.pow(1.0 + settings.interest_rate, settings.life_years)
    return one_off * settings.interest_rate * growth / (growth - 1.0)


def residual_now(settings: Settings, residual: float) -> float:
    """Return what a residual value after the life is worth now."""
    if residual == 0.0 or settings.interest_rate is None or settings.life_years is None:
        return 0.0
    return residual / math.pow(1.0 + settings.interest_rate, settings.life_years)


def opening_yearly(settings: Settings, option: SizeRow) -> float:
    """Return opening charge less residual value of a proposed size, money a year."""
    return spread(settings, option.opening_charge - residual_now(settings, option.residual_value))


def site_charges(books: Books, line: SiteLine, option: SizeRow | None) -> tuple[float, float]:
    """Return what the tables say a site's verdict costs: a year, and once."""
    settings = books.study.settings
    if option is not None:
        if option.standing == "running":
            return option.yearly_charge, 0.0
        return option.yearly_charge + opening_yearly(settings, option), option.opening_charge
    if line.site in books.running:
        closing = books.sites[line.site].closing_charge
        return spread(settings, closing), closing
    return 0.0, 0.0


def supplier_charges(books: Books, line: SupplierLine) -> tuple[float, float]:
    """Return what the tables say a supplier's verdict costs: a year, and once."""
    settings, row = books.study.settings, books.suppliers[line.supplier]
    was, now = line.supplier in books.signed, books.is_signed(line.supplier)
    if now:
        signing = 0.0 if was else row.signing_charge
        return row.yearly_charge + spread(settings, signing), signing
    dropping = row.dropping_charge if was else 0.0
    return spread(settings, dropping), dropping


def _money(books: Books, who: str, line: SiteLine | SupplierLine, right: tuple[float, float]) -> Iterator[str]:
    """Yield charges (a year, and once) that are not what the tables say."""
    currency, (charge, one_off) = books.study.settings.currency, right
    if differs(line.charge, charge, charge):
        yield f"{who}: charge is stated as {shown(line.charge)} {currency} a year, the tables give {shown(charge)}"
    if differs(line.one_off, one_off, one_off):
        yield f"{who}: one-off money is stated as {shown(line.one_off)} {currency}, the tables give {shown(one_off)}"


def _one_off(books: Books) -> Iterator[str]:
    """Yield a wrong sum of one-off money, and a budget overrun."""
    currency, budget = books.study.settings.currency, books.study.settings.one_off_budget
    parts = [
        site_charges(books, line, books.option(line.site))[1] for line in books.plan.sites if line.site in books.sites
    ] + [supplier_charges(books, line)[1] for line in books.plan.suppliers if line.supplier in books.suppliers]
    total, scale = sum(parts), sum(map(abs, parts))
    if differs(books.plan.one_off, total, scale):
        yield f"one-off money is stated as {shown(books.plan.one_off)} {currency}, the tables give {shown(total)}"
    if not books.of_today and budget is not None and exceeds(total, budget, scale):
        yield f"one-off money is {shown(total)} {currency}, the budget is {shown(budget)}"


def check_rules(books: Books) -> Iterator[str]:
    """Yield broken rules and numbers of sites outside fewest_sites and most_sites; today ignores them all."""
    if books.of_today:
        return
    settings = books.study.settings
    count = sum(books.is_open(site) for site in books.sites)
    if settings.fewest_sites is not None and count < settings.fewest_sites:
        yield f"{count} sites are open, fewest_sites is {settings.fewest_sites}"
    if settings.most_sites is not None and count > settings.most_sites:
        yield f"{count} sites are open, most_sites is {settings.most_sites}"
    for rule in books.study.rules:
        held = [member for member in rule.members if books.is_open(member) or books.is_signed(member)]
        if not _holds(rule, held):
            number = "" if rule.number is None else f" {rule.number}"
            members, chosen = ", ".join(rule.members), ", ".join(held) or "none"
            yield f"rule in row {rule.row} ({rule.rule}{number} of {members}) is broken: taken are {chosen}"


def _holds(rule: RuleRow, held: list[str]) -> bool:
    """Return whether a rule holds when these of its members are open or signed."""
    count, number = len(held), rule.number or 0
    return {
        RuleKind.ONE_OF: count == 1,
        RuleKind.NOT_TOGETHER: count <= 1,
        RuleKind.TOGETHER: count in {0, len(rule.members)},
        RuleKind.NEEDS: rule.members[0] not in held or count == len(rule.members),
        RuleKind.AT_MOST: count <= number,
        RuleKind.AT_LEAST: count >= number,
    }[rule.rule]
