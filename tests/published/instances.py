"""
Small location and transport problems whose optimum was published or is known, as studies.

Each function names its source. Sources marked "from memory" were not seen while this was written; their values agree
with an enumeration of every set of open sites (`tests/whole/enumeration.py`).
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from siting.study.tables import (
    CustomerRow,
    Leg,
    SiteRow,
    SiteRuling,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
)
from tests.building import (
    MISSING,
    LaneRow,
    cost_rows,
    customers_of,
    lane_table,
    one_echelon,
    settings_of,
    suppliers_alone,
)

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.settings import Settings


def _sites(charges: Mapping[str, tuple[float, float]], standing: SiteStanding = SiteStanding.PROPOSED) -> list[SiteRow]:
    """Return sites from name: (yearly charge, capacity)."""
    return [
        SiteRow(site=name, standing=standing, yearly_charge=float(charge), capacity=float(capacity))
        for name, (charge, capacity) in charges.items()
    ]


def with_sites(study: Study, ruling: SiteRuling, *names: str) -> Study:
    """Return the study with one ruling on the named sites."""
    unknown = set(names) - {row.site for row in study.sites}
    if unknown:
        raise KeyError(*unknown)
    sites = tuple(replace(row, ruling=ruling) if row.site in names else row for row in study.sites)
    return replace(study, sites=sites)


def with_exactly(study: Study, *names: str) -> Study:
    """Return the study with the named sites pinned open and all others pinned shut."""
    others = [row.site for row in study.sites if row.site not in names]
    return with_sites(with_sites(study, SiteRuling.PINNED_OPEN, *names), SiteRuling.PINNED_SHUT, *others)


def single_sourced(study: Study) -> Study:
    """Return the study with each customer served from one origin."""
    return replace(study, settings=replace(study.settings, single_source=True))


def stores() -> Study:
    """
    Ten stores, five warehouses that each hold a number of whole stores.

    CSPLib problem 034, https://www.csplib.org/Problems/prob034/ (data from Van Hentenryck's book on modelling).
    """
    sites = {"Bonn": (30, 1), "Bordeaux": (30, 4), "London": (30, 2), "Paris": (30, 1), "Rome": (30, 3)}
    by_store = [
        [20, 24, 11, 25, 30],
        [28, 27, 82, 83, 74],
        [74, 97, 71, 96, 70],
        [2, 55, 73, 69, 61],
        [46, 96, 59, 83, 4],
        [42, 22, 29, 67, 59],
        [1, 5, 73, 59, 56],
        [10, 73, 13, 43, 96],
        [93, 35, 63, 85, 46],
        [47, 65, 55, 71, 95],
    ]
    demand = {f"store {number}": 1 for number in range(10)}
    costs = [list(column) for column in zip(*by_store, strict=True)]
    return one_echelon("stores", _sites(sites), demand, costs, single_source=True)


def three_depots() -> Study:
    """Pedroso & Kubo, Mathematical Optimization: Solving Problems using Python, chapter on facility location."""
    demand = {"1": 80, "2": 270, "3": 250, "4": 160, "5": 180}
    costs = [[4, 5, 6, 8, 10], [6, 4, 3, 5, 8], [9, 7, 4, 3, 4]]
    sites = {f"site {number}": (1000, 500) for number in (1, 2, 3)}
    return one_echelon("three depots", _sites(sites), {f"customer {name}": d for name, d in demand.items()}, costs)


def three_plants() -> Study:
    """Schrage, Optimization Modeling, capacitated plant location (value from memory)."""
    sites = {"P1": (91, 39), "P2": (70, 35), "P3": (24, 31)}
    demand = {"C1": 15, "C2": 17, "C3": 22, "C4": 12}
    return one_echelon("three plants", _sites(sites), demand, [[6, 2, 6, 7], [4, 9, 5, 3], [8, 8, 1, 5]])


def distribution_centres() -> Study:
    """
    St. Louis runs today; four plants are proposed ($000).

    Anderson, Sweeney & Williams, An Introduction to Management Science, integer programming chapter: Martin-Beck
    (capacities, demands and value from memory).
    """
    proposed = {"Detroit": (175, 10), "Toledo": (300, 20), "Denver": (375, 30), "Kansas City": (500, 40)}
    running = {"St. Louis": (0, 30)}
    costs = [[5, 2, 3], [4, 3, 4], [9, 7, 5], [10, 4, 2], [8, 4, 3]]
    return one_echelon(
        "distribution centres",
        [*_sites(proposed), *_sites(running, SiteStanding.RUNNING)],
        {"Boston": 30, "Atlanta": 20, "Houston": 20},
        costs,
    )


def regional_plants() -> Study:
    """
    Five regions, each with a small or a large plant ($000).

    Chopra & Meindl, Supply Chain Management, chapter 5: SunOil (last cost column and large charges from memory).
    """
    regions = ("N. America", "S. America", "Europe", "Asia", "Africa")
    small, large = (6000, 4500, 6500, 4100, 4000), (9000, 6750, 9750, 6150, 6000)
    costs = [
        [81, 92, 101, 130, 115],
        [117, 77, 108, 98, 100],
        [102, 105, 95, 119, 111],
        [115, 125, 90, 59, 74],
        [142, 100, 103, 105, 71],
    ]
    plants = [SiteRow(site=f"{region} plant") for region in regions]
    demand = dict(zip((f"{region} market" for region in regions), (12, 8, 14, 16, 7), strict=True))
    sizes = tuple(
        SizeRow(site=row.site, size=size, yearly_charge=float(charge), capacity=capacity)
        for row, low, high in zip(plants, small, large, strict=True)
        for size, charge, capacity in (("small", low, 10.0), ("large", high, 20.0))
    )
    return replace(one_echelon("regional plants", plants, demand, costs), sizes=sizes)


_MERGER_CITIES = ("Atlanta", "Boston", "Chicago", "Denver", "Omaha", "Portland")
_MERGER_DEMAND = (10, 8, 14, 6, 7, 11)
_MERGER_SITES = {
    "Baltimore": (7650, 18),
    "Cheyenne": (3500, 24),
    "Salt Lake": (5000, 27),
    "Memphis": (4100, 22),
    "Wichita": (2200, 31),
}
_MERGER_COSTS = {
    "Baltimore": (1675, 400, 685, 1630, 1160, 2800),
    "Cheyenne": (1460, 1940, 970, 100, 495, 1200),
    "Salt Lake": (1925, 2400, 1425, 500, 950, 800),
    "Memphis": (380, 1355, 543, 1045, 665, 2321),
    "Wichita": (922, 1646, 700, 508, 311, 1797),
}


def merger(
    sites: tuple[str, ...] = tuple(_MERGER_SITES), cities: tuple[str, ...] = _MERGER_CITIES, *, edition: int = 1
) -> Study:
    """
    Plants of two firms that merge, all of them running today ($000).

    Chopra & Meindl, Supply Chain Management, chapter 5: TelecomOne and HighOptic. Another edition (2) prints 985 and
    1450 for Chicago from Baltimore and from Salt Lake.
    """
    costs = dict(_MERGER_COSTS)
    if edition == 2:
        costs["Baltimore"] = (1675, 400, 985, 1630, 1160, 2800)
        costs["Salt Lake"] = (1925, 2400, 1450, 500, 950, 800)
    columns = [_MERGER_CITIES.index(city) for city in cities]
    return one_echelon(
        "merger",
        _sites({name: _MERGER_SITES[name] for name in sites}, SiteStanding.RUNNING),
        {city: _MERGER_DEMAND[column] for city, column in zip(cities, columns, strict=True)},
        [[costs[name][column] for column in columns] for name in sites],
    )


def twelve_depots() -> Study:
    """
    Twelve depots, twelve customers, each cost for a customer's whole demand, split pro rata (k$).

    Gueret, Prins & Sevaux, Applications of Optimization with Xpress-MP, ground transport chapter: depot location
    (value from memory). Depots 7 to 12 repeat the costs of 1 to 6.
    """
    demand = [120, 80, 75, 100, 110, 100, 90, 60, 30, 150, 95, 120]
    charges = [3500, 9000, 10000, 4000, 3000, 9000, 9000, 3000, 4000, 10000, 9000, 3500]
    capacities = [300, 250, 100, 180, 275, 300, 200, 220, 270, 250, 230, 180]
    whole: list[list[float]] = [
        [100, 80, 50, 50, 60, 100, 120, 90, 60, 70, 65, 110],
        [120, 90, 60, 70, 65, 110, 140, 110, 80, 80, 75, 130],
        [140, 110, 80, 80, 75, 130, 160, 125, 100, 100, 80, 150],
        [160, 125, 100, 100, 80, 150, 190, 150, 130, MISSING, MISSING, MISSING],
        [190, 150, 130, MISSING, MISSING, MISSING, 200, 180, 150, MISSING, MISSING, MISSING],
        [200, 180, 150, MISSING, MISSING, MISSING, 100, 80, 50, 50, 60, 100],
    ]
    return one_echelon(
        "twelve depots",
        _sites({f"depot {n + 1}": (charges[n], capacities[n]) for n in range(12)}),
        {f"customer {n + 1}": amount for n, amount in enumerate(demand)},
        [[cost / amount for cost, amount in zip(row, demand, strict=True)] for row in whole * 2],
    )


_SHIPPING = """
    inbound Liverpool: Newcastle .5, Birmingham .5, London 1, Exeter .2, Bristol .6, Northampton .4
    inbound Brighton: Birmingham .3, London .5, Exeter .2, Bristol .4, Northampton .3
    direct Liverpool: C1 1, C3 1.5, C4 2, C6 1
    direct Brighton: C1 2
    outbound Newcastle: C2 1.5, C3 .5, C5 1.5, C6 1
    outbound Birmingham: C1 1, C2 .5, C3 .5, C4 1, C5 .5
    outbound London: C2 1.5, C3 2, C5 .5, C6 1.5
    outbound Exeter: C3 .2, C4 1.5, C5 .5, C6 1.5
    outbound Bristol: C1 1.2, C2 .6, C3 .5, C5 .3, C6 .8
    outbound Northampton: C2 .4, C4 .5, C5 .6, C6 .9
"""


def distribution(*depots: SiteRow, sizes: tuple[SizeRow, ...] = (), settings: Settings | None = None) -> Study:
    """
    Two plants, depots and direct shipping (000 pounds); without `depots`, the four that exist, all in use.

    Williams, Model Building in Mathematical Programming, 5th ed., problem 19 (pp. 273-275, 330-332): "Distribution".
    """
    standing = {"Newcastle": 70, "Birmingham": 50, "London": 100, "Exeter": 40}
    sites = depots or tuple(
        SiteRow(site=name, standing=SiteStanding.RUNNING, ruling=SiteRuling.PINNED_OPEN, capacity=float(capacity))
        for name, capacity in standing.items()
    )
    plants = tuple(
        SupplierRow(supplier=name, capacity=capacity) for name, capacity in (("Liverpool", 150.0), ("Brighton", 200.0))
    )
    known = {row.site for row in sites} | {row.supplier for row in plants}
    rows = []
    for line in _SHIPPING.strip().splitlines():
        head, entries = line.strip().split(": ")
        leg, origin = head.split(" ")
        for entry in entries.split(", "):
            destination, cost = entry.rsplit(" ", 1)
            if origin in known and (leg != "inbound" or destination in known):
                rows.append(LaneRow(leg=Leg(leg), origin=origin, destination=destination, unit_cost=float(cost)))
    return Study(
        settings=settings or settings_of("distribution"),
        sites=tuple(sites),
        suppliers=plants,
        sizes=sizes,
        customers=customers_of({"C1": 50, "C2": 10, "C3": 40, "C4": 35, "C5": 60, "C6": 20}),
        lanes=lane_table(rows),
    )


def depot_location(*, savings: bool) -> Study:
    """
    Close Newcastle or Exeter, build Bristol or Northampton, expand Birmingham; at most four depots.

    Williams, same book, problem 20 (pp. 275-276, 332-333): "Depot location". The book counts what closing saves (10
    for Newcastle, 5 for Exeter): with `savings` as negative closing charges, else as yearly charges while open. The
    second is 15 dearer, whatever is decided. Charges are a year's, so one-off money is spread over one year at 0 %.
    """
    running = {"standing": SiteStanding.RUNNING}
    newcastle = {"closing_charge": -10.0} if savings else {"yearly_charge": 10.0}
    exeter = {"closing_charge": -5.0} if savings else {"yearly_charge": 5.0}
    pinned = {**running, "ruling": SiteRuling.PINNED_OPEN}
    return distribution(
        SiteRow(site="Newcastle", capacity=70.0, **running, **newcastle),  # type: ignore[arg-type]  # mixed columns
        SiteRow(site="Birmingham", **pinned),  # type: ignore[arg-type]  # mixed columns
        SiteRow(site="London", capacity=100.0, **pinned),  # type: ignore[arg-type]  # mixed columns
        SiteRow(site="Exeter", capacity=40.0, **running, **exeter),  # type: ignore[arg-type]  # mixed columns
        SiteRow(site="Bristol", capacity=30.0, opening_charge=12.0),
        SiteRow(site="Northampton", capacity=25.0, opening_charge=4.0),
        sizes=(
            SizeRow(site="Birmingham", size="as it is", standing=SiteStanding.RUNNING, capacity=50.0),
            SizeRow(site="Birmingham", size="expanded", capacity=70.0, opening_charge=3.0),
        ),
        settings=settings_of("depot location", most_sites=4, interest_rate=0.0, life_years=1.0),
    )


_FARMS = {1: (405, 11.2), 2: (390, 10.5), 3: (450, 12.8), 4: (368, 9.3), 5: (520, 10.8), 6: (465, 9.6)}
_FARM_COSTS = [[18, 15, 12], [13, 10, 17], [16, 14, 18], [19, 15, 16], [17, 19, 12], [14, 16, 12]]
_FARM_DEMAND = {"plant A": 12.0, "plant B": 10.0, "plant C": 14.0}


def farms_as_suppliers() -> Study:
    """
    Which farms to sign for three plants, with nothing in between ($000).

    Taylor, Introduction to Management Science, chapter 5: Frijo-Lane potato farms (printed optimum not seen).
    """
    suppliers = [
        SupplierRow(supplier=f"farm {number}", yearly_charge=float(charge), capacity=capacity)
        for number, (charge, capacity) in _FARMS.items()
    ]
    return suppliers_alone("farms", suppliers, _FARM_DEMAND, _FARM_COSTS)


def farms_as_sites() -> Study:
    """Return the same farms as sites to buy."""
    sites = _sites({f"farm {number}": charge for number, charge in _FARMS.items()})
    return one_echelon("farms", sites, _FARM_DEMAND, _FARM_COSTS)


def refrigerators() -> Study:
    """Render, Stair & Hanna, Quantitative Analysis for Management: Sitka Manufacturing, at least 38,000 units."""
    sites = {"Baytown": (340_000, 21_000), "Lake Charles": (270_000, 20_000), "Mobile": (290_000, 19_000)}
    return one_echelon("refrigerators", _sites(sites), {"everyone": 38_000}, [[32], [33], [30]])


def two_warehouses(*barred: tuple[str, str]) -> Study:
    """
    Two plants, two warehouses without charges, three markets (000); `barred` leaves out (warehouse, market).

    Simchi-Levi, Kaminsky & Simchi-Levi, Designing and Managing the Supply Chain, network planning (from memory).
    """
    warehouses, markets = ("w1", "w2"), ("c1", "c2", "c3")
    outbound = [
        replace(row, barred=(row.origin, row.destination) in barred)
        for row in cost_rows(Leg.OUTBOUND, warehouses, markets, [[3, 4, 5], [2, 1, 2]])
    ]
    return Study(
        settings=settings_of("two warehouses"),
        sites=tuple(SiteRow(site=name) for name in warehouses),
        suppliers=(SupplierRow(supplier="p1", capacity=200.0), SupplierRow(supplier="p2", capacity=60.0)),
        customers=customers_of({"c1": 50, "c2": 100, "c3": 50}),
        lanes=lane_table([*cost_rows(Leg.INBOUND, ("p1", "p2"), warehouses, [[0, 5], [4, 2]]), *outbound]),
    )


def half_integral() -> Study:
    """
    Three sites in a ring, each serving two of three customers free of charge.

    The half-integral set of Cornuejols, Nemhauser & Wolsey (1990), "The uncapacitated facility location problem"
    (from memory): the linear relaxation opens half of each.
    """
    costs = [[0.0, 0.0, MISSING], [MISSING, 0.0, 0.0], [0.0, MISSING, 0.0]]
    sites = [SiteRow(site=f"S{number}", yearly_charge=1.0) for number in (1, 2, 3)]
    return one_echelon("half-integral", sites, {"C1": 1.0, "C2": 1.0, "C3": 1.0}, costs)


_FIRE_MINUTES = [
    [0, 10, 20, 30, 30, 20],
    [10, 0, 25, 35, 20, 10],
    [20, 25, 0, 15, 30, 20],
    [30, 35, 15, 0, 15, 25],
    [30, 20, 30, 15, 0, 14],
    [20, 10, 20, 25, 14, 0],
]


def fire_stations(within: float) -> Study:
    """
    Fewest stations with each of six cities within so many minutes, which stand in for road km.

    Winston, Operations Research, integer programming chapter: Kilroy County.
    """
    return Study(
        settings=settings_of("fire stations"),
        sites=tuple(SiteRow(site=f"station {n + 1}", yearly_charge=1.0) for n in range(6)),
        customers=tuple(CustomerRow(customer=f"city {n + 1}", demand=1.0, reach_km=within) for n in range(6)),
        lanes=lane_table(
            LaneRow(leg=Leg.OUTBOUND, origin=f"station {a + 1}", destination=f"city {b + 1}", road_km=float(minutes))
            for a, row in enumerate(_FIRE_MINUTES)
            for b, minutes in enumerate(row)
        ),
    )


def medians(stations: int) -> Study:
    """Least total minutes from a given number of stations, on the matrix of the fire stations (no print source)."""
    return one_echelon(
        "medians",
        [SiteRow(site=f"station {n + 1}") for n in range(6)],
        {f"city {n + 1}": 1.0 for n in range(6)},
        [[float(minutes) for minutes in row] for row in _FIRE_MINUTES],
        most_sites=stations,
    )


_HUBS = """
    ATL: ATL CHI HOU NO NY PIT; BOS: BOS NY PIT; CHI: ATL CHI NY NO PIT; DEN: DEN SL; HOU: ATL HOU NO; LA: LA SL SF;
    NO: ATL CHI HOU NO; NY: ATL BOS CHI NY PIT; PIT: ATL BOS CHI NY PIT; SL: DEN LA SL SF SEA; SF: LA SL SF SEA;
    SEA: SL SF SEA
"""


def hubs() -> Study:
    """Winston, Operations Research, integer programming chapter: Western Airlines, hubs within 1,000 miles (memory)."""
    near = {head.strip(): cities.split() for head, cities in (entry.split(": ") for entry in _HUBS.strip().split(";"))}
    return one_echelon(
        "hubs",
        [SiteRow(site=f"hub {name}", yearly_charge=1.0) for name in near],
        dict.fromkeys(near, 1.0),
        [[0.0 if city in cities else MISSING for city in near] for cities in near.values()],
    )


TRANSPORT: dict[str, tuple[list[float], list[float], list[list[float]], float]] = {
    # Dantzig, Linear Programming and Extensions (1963), 3.3 (from memory): 90 $ per case and thousand miles, 000 $.
    "canneries": (
        [350, 600],
        [325, 300, 275],
        [[0.09 * miles for miles in row] for row in ([2.5, 1.7, 1.8], [2.5, 1.8, 1.4])],
        153.675,
    ),
    # Winston, Operations Research, chapter 7 (from memory): Powerco.
    "electricity": ([35, 50, 40], [45, 20, 30, 30], [[8, 6, 10, 9], [9, 12, 13, 7], [14, 9, 16, 5]], 1020),
    # Hillier & Lieberman, Introduction to Operations Research, chapter 9 (from memory): P & T Company.
    "peas": (
        [75, 125, 100],
        [80, 65, 70, 85],
        [[464, 513, 654, 867], [352, 416, 690, 791], [995, 682, 388, 685]],
        152_535,
    ),
    # University of Auckland, teaching case on distribution of beer: supply 5,000 exceeds demand 4,100.
    "beer": ([1000, 4000], [500, 900, 1800, 200, 700], [[2, 4, 5, 2, 1], [3, 1, 3, 2, 3]], 8600),
}


def transport(name: str, *, as_sites: bool) -> Study:
    """Return a transport problem without charges: its origins as sites, or as suppliers that deliver directly."""
    supply, need, costs, _ = TRANSPORT[name]
    demand = {f"to {n + 1}": float(amount) for n, amount in enumerate(need)}
    if as_sites:
        sites = [SiteRow(site=f"from {n + 1}", capacity=float(amount)) for n, amount in enumerate(supply)]
        return one_echelon(name, sites, demand, costs)
    suppliers = [SupplierRow(supplier=f"from {n + 1}", capacity=float(amount)) for n, amount in enumerate(supply)]
    return suppliers_alone(name, suppliers, demand, costs)
