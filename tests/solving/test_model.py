"""Every requirement of the model, one number at a time, on networks whose optimum is worked out by hand."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
import pulp
import pytest

from siting.network.network import NetworkRule
from siting.solving.cbc import cbc
from siting.solving.direct import direct
from siting.solving.model import build_model, money_unit
from siting.study.tables import RuleKind
from tests.solving.solved import best

if TYPE_CHECKING:
    from siting.network.network import Network
    from siting.solving.engine import Engine
    from siting.solving.model import Links
    from tests.solving.conftest import NetworkMaker

ENGINES = pytest.mark.parametrize("engine", [direct, cbc], ids=["direct", "cbc"])


def change(network: Network, **changes: object) -> Network:
    """Return the network with fields replaced by arrays of the same kind."""

    def like(name: str, value: object) -> Any:  # noqa: ANN401 - any field
        now = getattr(network, name)
        return np.array(value, dtype=now.dtype) if isinstance(now, np.ndarray) else value

    return replace(network, **{name: like(name, value) for name, value in changes.items()})


def rule(kind: RuleKind, *sites: int, number: int | None = None) -> tuple[NetworkRule, ...]:
    """Return one rule about sites."""
    return (NetworkRule(kind=kind, members=tuple(("site", site) for site in sites), number=number),)


@pytest.fixture
def chain(make_network: NetworkMaker) -> Network:
    """
    Return two suppliers, one site (100 a year) and one customer needing 60, outbound at 1.

    Supplier 0 costs 50 and 1 a unit: 50 + 60 + 100 + 60 = 270. Supplier 1 costs 5 and 2 a unit: 285. A unit moved from
    supplier 0 to supplier 1 costs 1 more, and 5 once.
    """
    return make_network(
        demand=[[60]],
        charges=[100],
        supplier_charges=[50, 5],
        inbound=[(0, 0, 1), (1, 0, 2)],
        outbound=[(0, 0, 1)],
    )


SITES = [
    ("nothing more is asked", {}, 290, [1]),
    ("site 0 costs 89: both undercut site 1 alone by 1", {"option_charge": [89, 120]}, 289, [0, 1]),
    ("site 0 costs 91: both are dearer by 1", {"option_charge": [91, 120]}, 290, [1]),
    ("site 1 just holds everything", {"option_capacity": [np.inf, 60]}, 290, [1]),
    ("site 1 is short of 1", {"option_capacity": [np.inf, 59]}, 300, [0, 1]),
    ("site 0 is pinned open", {"site_pinned_open": [True, False]}, 300, [0, 1]),
    ("site 1 is pinned shut", {"site_pinned_shut": [False, True]}, 420, [0]),
    ("two sites at least", {"fewest_sites": 2}, 300, [0, 1]),
    ("one site at most, site 0 free of charge", {"option_charge": [0, 120], "most_sites": 1}, 290, [1]),
    ("two sites at most, site 0 free of charge", {"option_charge": [0, 120], "most_sites": 2}, 200, [0, 1]),
    ("the budget just pays for site 1", {"option_one_off": [0, 50], "one_off_budget": 50}, 290, [1]),
    ("the budget is short of 1", {"option_one_off": [0, 50], "one_off_budget": 49}, 420, [0]),
    ("site 1 just reaches its least throughput", {"option_least": [0, 60]}, 290, [1]),
    ("site 1 cannot reach its least throughput", {"option_least": [0, 61]}, 420, [0]),
    ("site 0 runs, closing costs 9", {"site_running": [True, False], "site_closing": [9, 0]}, 299, [1]),
    ("site 0 runs, closing costs 11", {"site_running": [True, False], "site_closing": [11, 0]}, 300, [0, 1]),
    ("site 0 runs, closing brings 5", {"site_running": [True, False], "site_closing": [-5, 0]}, 285, [1]),
    ("exactly one", {"rules": rule(RuleKind.ONE_OF, 0, 1), "option_charge": [0, 120]}, 290, [1]),
    ("not together", {"rules": rule(RuleKind.NOT_TOGETHER, 0, 1), "option_charge": [0, 120]}, 290, [1]),
    ("at most one", {"rules": rule(RuleKind.AT_MOST, 0, 1, number=1), "option_charge": [0, 120]}, 290, [1]),
    ("at most two", {"rules": rule(RuleKind.AT_MOST, 0, 1, number=2), "option_charge": [0, 120]}, 200, [0, 1]),
    ("at least two", {"rules": rule(RuleKind.AT_LEAST, 0, 1, number=2)}, 300, [0, 1]),
    ("together", {"rules": rule(RuleKind.TOGETHER, 0, 1)}, 300, [0, 1]),
    ("site 1 needs site 0", {"rules": rule(RuleKind.NEEDS, 1, 0)}, 300, [0, 1]),
    ("site 0 needs site 1", {"rules": rule(RuleKind.NEEDS, 0, 1)}, 290, [1]),
]


@ENGINES
@pytest.mark.parametrize(("changes", "cost", "options"), [row[1:] for row in SITES], ids=[row[0] for row in SITES])
def test_sites(two_sites: Network, engine: Engine, changes: dict[str, object], cost: float, options: list[int]) -> None:
    """Each requirement of sites turns the optimum exactly where hand calculation says, with either engine."""
    found = best(change(two_sites, **changes), engine)
    assert found is not None
    assert found.cost == pytest.approx(cost, rel=1e-9)
    assert found.bound == pytest.approx(cost, rel=1e-7)
    assert found.options == options


BUDGETS = [(20.0, 290, [1]), (19.0, 300, [0, 1])]


@pytest.mark.parametrize(("budget", "cost", "options"), BUDGETS)
def test_closing_spends_the_budget(two_sites: Network, budget: float, cost: float, options: list[int]) -> None:
    """Closing a running site takes 20 of the budget: with 19 it has to stay."""
    changes = {"site_running": [True, False], "site_closing_one_off": [20, 0], "one_off_budget": budget}
    found = best(change(two_sites, **changes))
    assert found is not None
    assert found.cost == pytest.approx(cost)
    assert found.options == options


@pytest.mark.parametrize(("share", "cost", "options"), [(0.5, 290, [1]), (0.501, 300, [0, 1]), (1.0, 300, [0, 1])])
def test_service_share(two_sites: Network, share: float, cost: float, options: list[int]) -> None:
    """Site 1 alone delivers 30 of 60 within the service distance; any more needs site 0."""
    km = np.array([90.0, 100.0, 101.0, 101.0, 101.0, 100.0])
    lanes = replace(two_sites.outbound, km=km)
    found = best(replace(two_sites, outbound=lanes, service_km=100.0, service_share=share))
    assert found is not None
    assert found.cost == pytest.approx(cost)
    assert found.options == options


def test_service_share_goes_by_weight(make_network: NetworkMaker) -> None:
    """A good of 9 t a unit outweighs one of 1 t: 0.9 of all weight is near with the heavy good alone near."""
    network = make_network(
        demand=[[10, 10]],
        charges=[0, 50],
        outbound=[(0, 0, 1, 0, 10.0), (0, 0, 1, 1, 500.0), (1, 0, 1, 1, 10.0)],
        weight_t=[9, 1],
        service_km=100.0,
    )
    enough, more = best(replace(network, service_share=0.9)), best(replace(network, service_share=0.901))
    assert enough is not None
    assert more is not None
    assert enough.cost == pytest.approx(20)
    assert more.cost == pytest.approx(70)


@pytest.mark.parametrize(("demand", "cost", "option"), [(50.0, 60.0, 0), (51.0, 81.0, 1), (60.0, 90.0, 1)])
def test_the_cheapest_size_that_holds_is_taken(
    make_network: NetworkMaker, demand: float, cost: float, option: int
) -> None:
    """Size 0 holds 50 for 10 a year, size 1 holds 60 for 30."""
    network = make_network(demand=[[demand]], charges=[10, 30], capacities=[50, 60], sites=[0, 0], outbound=[(0, 0, 1)])
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(cost)
    assert found.options == [option]


def test_two_sizes_never_open_together(make_network: NetworkMaker) -> None:
    """Two sizes of 30 cannot serve 60 at one site; at two sites they can."""
    one = make_network(demand=[[60]], charges=[1, 1], capacities=[30, 30], sites=[0, 0], outbound=[(0, 0, 1)])
    two = make_network(demand=[[60]], charges=[1, 1], capacities=[30, 30], outbound=[(0, 0, 1), (1, 0, 1)])
    assert best(one) is None
    found = best(two)
    assert found is not None
    assert found.cost == pytest.approx(62)


def test_a_pinned_site_takes_its_cheapest_size(make_network: NetworkMaker) -> None:
    """A site with sizes that is pinned open opens one size even where nothing moves through it."""
    network = make_network(
        demand=[[10]],
        charges=[7, 5, 20],
        sites=[0, 0, 1],
        outbound=[(1, 0, 1)],
        site_pinned_open=[True, False],
    )
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(35)
    assert found.options == [1, 2]


SUPPLIERS = [
    ("nothing more is asked", {}, 270, [0]),
    ("supplier 0 just has it all", {"supplier_capacity": [60, np.inf]}, 270, [0]),
    ("supplier 0 is short of 1", {"supplier_capacity": [59, np.inf]}, 276, [0, 1]),
    ("supplier 0 offers 59", {"offer_capacity": [[59], [np.inf]]}, 276, [0, 1]),
    ("a unit is 2 load: 118 load are 59 units", {"load": [2], "supplier_capacity": [118, np.inf]}, 276, [0, 1]),
    ("a unit is 2 load: offers stay units", {"load": [2], "offer_capacity": [[60], [np.inf]]}, 270, [0]),
    ("supplier 0 is pinned unsigned", {"supplier_pinned_unsigned": [True, False]}, 285, [1]),
    ("supplier 1 is pinned signed", {"supplier_pinned_signed": [False, True]}, 275, [0, 1]),
    (
        "supplier 1 pinned, at least 10 load",
        {"supplier_pinned_signed": [False, True], "supplier_least": [0, 10]},
        285,
        [0, 1],
    ),
    (
        "supplier 1 pinned, at least 10 load at 2 load a unit",
        {"supplier_pinned_signed": [False, True], "supplier_least": [0, 10], "load": [2]},
        280,
        [0, 1],
    ),
    (
        "supplier 1 pinned, at least 9 units offered",
        {"supplier_pinned_signed": [False, True], "offer_least": [[0], [9]]},
        284,
        [0, 1],
    ),
    ("supplier 0 must sell 61 or nothing", {"supplier_least": [61, 0]}, 285, [1]),
    ("dropping supplier 1 costs 4", {"supplier_signed": [False, True], "supplier_dropping": [0, 4]}, 274, [0]),
    ("dropping supplier 1 costs 6", {"supplier_signed": [False, True], "supplier_dropping": [0, 6]}, 275, [0, 1]),
    ("signing supplier 0 is within budget", {"supplier_one_off": [10, 0], "one_off_budget": 10}, 270, [0]),
    ("signing supplier 0 is above budget", {"supplier_one_off": [10, 0], "one_off_budget": 9}, 285, [1]),
    (
        "dropping supplier 1 is above budget",
        {"supplier_signed": [False, True], "supplier_dropping_one_off": [0, 8], "one_off_budget": 7},
        275,
        [0, 1],
    ),
    (
        "one supplier needs the other",
        {"rules": (NetworkRule(kind=RuleKind.NEEDS, members=(("supplier", 0), ("supplier", 1)), number=None),)},
        275,
        [0, 1],
    ),
    (
        "a site needs a supplier",
        {"rules": (NetworkRule(kind=RuleKind.NEEDS, members=(("site", 0), ("supplier", 1)), number=None),)},
        275,
        [0, 1],
    ),
]


@ENGINES
@pytest.mark.parametrize(
    ("changes", "cost", "suppliers"), [row[1:] for row in SUPPLIERS], ids=[row[0] for row in SUPPLIERS]
)
def test_suppliers(
    chain: Network, engine: Engine, changes: dict[str, object], cost: float, suppliers: list[int]
) -> None:
    """Each requirement of suppliers turns the optimum exactly where hand calculation says, with either engine."""
    found = best(change(chain, **changes), engine)
    assert found is not None
    assert found.cost == pytest.approx(cost, rel=1e-9)
    assert found.bound == pytest.approx(cost, rel=1e-7)
    assert found.suppliers == suppliers


def test_inflow_equals_outflow(chain: Network) -> None:
    """What the suppliers send is what the site delivers, and a site that no lane feeds serves nobody."""
    found = best(change(chain, supplier_capacity=[59, np.inf]))
    assert found is not None
    assert found.amounts.inbound == pytest.approx([59, 1])
    assert found.amounts.outbound == pytest.approx([60])
    unfed = replace(chain.inbound, good=np.array([0, 0], dtype=np.int32), destination=np.array([0, 0], dtype=np.int32))
    assert best(replace(chain, inbound=unfed, offer_capacity=np.zeros((2, 1)))) is None


@pytest.mark.parametrize(("direct_cost", "cost", "moved"), [(1.9, 324.0, 60.0), (3.6, 426.0, 60.0), (4.6, 480.0, 0.0)])
def test_drop_shipment_touches_no_site(
    make_network: NetworkMaker, direct_cost: float, cost: float, moved: float
) -> None:
    """
    Straight from the supplier when that undercuts site and both legs.

    By the site: 210 + 100 + 60 x (1 + 1.833...) = 480; straight: 210 + 60 x cost.
    """
    network = make_network(
        demand=[[60]],
        charges=[100],
        supplier_charges=[210],
        inbound=[(0, 0, 1)],
        outbound=[(0, 0, 11 / 6)],
        direct=[(0, 0, direct_cost)],
    )
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(cost)
    assert found.amounts.direct == pytest.approx([moved])
    assert found.options == ([] if moved else [0])


@pytest.mark.parametrize("engine", [direct, cbc], ids=["direct", "cbc"])
@pytest.mark.parametrize(
    ("capacities", "single", "cost"),
    [([30, 30], 0, 60), ([30, 30], 3, None), ([40, 20], 3, 60), ([40, 19.999], 3, None)],
)
def test_single_sourced_customers_are_never_split(
    make_network: NetworkMaker, engine: Engine, capacities: list[float], single: int, cost: float | None
) -> None:
    """Three customers of 20 fill two sites of 30 only when one is split; 40 and 20 take them whole."""
    network = make_network(
        demand=[[20], [20], [20]],
        charges=[0, 0],
        capacities=capacities,
        outbound=[(site, customer, 1) for site in range(2) for customer in range(3)],
        single_source=[customer < single for customer in range(3)],
    )
    found = best(network, engine)
    assert (None if found is None else pytest.approx(found.cost)) == cost


def test_all_goods_of_a_single_sourced_customer_come_from_one_origin(make_network: NetworkMaker) -> None:
    """Each site is cheap for one good: split 20, from one site 10 + 30 = 40; a site without one of the goods is out."""
    lanes = [(0, 0, 1, 0), (0, 0, 3, 1), (1, 0, 3, 0), (1, 0, 1, 1), (2, 0, 0.5, 0)]
    network = make_network(demand=[[10, 10]], charges=[0, 0, 0], outbound=lanes)
    split, whole = best(network), best(change(network, single_source=[True]))
    assert split is not None
    assert whole is not None
    assert split.cost == pytest.approx(15)
    assert whole.cost == pytest.approx(40)
    assert whole.decisions.source[0] in {0, 1}


@pytest.mark.parametrize(("capacity", "source"), [(20.0, 2), (19.0, 0)])
def test_a_single_sourced_customer_may_be_drop_shipped_whole(
    make_network: NetworkMaker, capacity: float, source: int
) -> None:
    """The supplier (origin S + k = 2) serves the customer straight only if it can hold it whole."""
    network = make_network(
        demand=[[20]],
        charges=[5, 50],
        supplier_charges=[0, 0],
        inbound=[(1, 0, 1), (1, 1, 1)],
        outbound=[(0, 0, 1), (1, 0, 1)],
        direct=[(0, 0, 1)],
        single_source=[True],
        supplier_capacity=[capacity, np.inf],
    )
    found = best(network)
    assert found is not None
    assert found.decisions.source.tolist() == [source]


def test_a_single_sourced_customer_needs_a_size_that_holds_it_whole(make_network: NetworkMaker) -> None:
    """The small size is cheaper, but 20 do not fit into 19."""
    network = make_network(
        demand=[[20]], charges=[1, 9], capacities=[19, 20], sites=[0, 0], outbound=[(0, 0, 1)], single_source=[True]
    )
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(29)
    assert found.options == [1]


def relaxation(network: Network, links: Links) -> float:
    """Return the optimum with every binary a share."""
    model = build_model(network, links=links, relaxed=True)
    model.problem.solve(pulp.HiGHS(msg=False))
    return float(pulp.value(model.problem.objective)) * model.money


def test_tight_links_bound_better_than_capacity_links(two_sites: Network) -> None:
    """
    Tight links reach the optimum 290; capacity links spread each charge over all 60 units: 190.

    By hand: a unit costs 100 / 60 more at site 0 and 120 / 60 more at site 1, so 10 x 2.667 + 20 x 3.667 + 30 x 3.
    """
    assert relaxation(two_sites, "tight") == pytest.approx(290)
    assert relaxation(two_sites, "capacity") == pytest.approx(190)


def test_half_integral_cycle(make_network: NetworkMaker) -> None:
    """
    Three sites on a cycle, each serving two customers: optimum 2, relaxation 1.5.

    From memory, of the kind in Cornuejols, Nemhauser & Wolsey (1990), chapter 3 of Discrete Location Theory.
    """
    lanes = [(site, (site + step) % 3, 0.0) for site in range(3) for step in range(2)]
    network = make_network(demand=[[1], [1], [1]], charges=[1, 1, 1], outbound=lanes)
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(2)
    assert relaxation(network, "tight") == pytest.approx(1.5)


def test_both_forms_have_one_optimum(chain: Network) -> None:
    """The weaker links lose the bound, never the answer: closed sites and unsigned suppliers move nothing."""
    model = build_model(change(chain, load=[0], supplier_capacity=[59, np.inf]), links="capacity")
    model.problem.solve(pulp.HiGHS(msg=False, gapRel=0.0))
    assert pulp.value(model.problem.objective) * model.money == pytest.approx(270)


@pytest.mark.parametrize("money", [1e-6, 1e-3, 1.0, 1e3, 1e9])
@pytest.mark.parametrize("amount", [1e-3, 1.0, 1e6])
def test_units_do_not_matter(two_sites: Network, money: float, amount: float) -> None:
    """Cents or billions, grams or kilotonnes: the same sites, the cost in proportion."""
    network = replace(
        two_sites,
        demand=two_sites.demand * amount,
        option_charge=two_sites.option_charge * money,
        option_capacity=np.array([np.inf, 59.0]) * amount,
        outbound=replace(two_sites.outbound, cost=two_sites.outbound.cost * money / amount),
    )
    found = best(network)
    assert found is not None
    assert found.cost == pytest.approx(300 * money, rel=1e-8)
    assert found.options == [0, 1]


@pytest.mark.parametrize(("largest", "unit"), [(0.0, 1.0), (1.0, 1.0), (1e6, 1.0), (4e6, 8.0), (0.25, 0.5)])
def test_money_is_divided_only_where_it_is_extreme(largest: float, unit: float) -> None:
    """Within the comfortable range money stays as it is; outside a power of 2 brings it there."""
    assert money_unit(largest) == unit


def test_names_are_positions(two_sites: Network) -> None:
    """No name of a study reaches the solver, so none can collide."""
    model = build_model(change(two_sites, site_closing=[1, 0]))
    names = [variable.name for variable in model.problem.variables()]
    assert len(names) == len(set(names))
    assert {"y_0", "y_1", "x_0", "x_5", "one_0"} <= set(names)


def test_starting_decisions_are_those_read_back(make_network: NetworkMaker) -> None:
    """Decisions turned into binaries and back are the same decisions."""
    network = make_network(
        demand=[[20], [5]],
        charges=[1, 9],
        outbound=[(0, 0, 1), (0, 1, 1), (1, 0, 2), (1, 1, 1)],
        single_source=[True, False],
    )
    found = best(network)
    assert found is not None
    model = build_model(network)
    positions, binaries = model.binaries(found.decisions)
    values = np.zeros(len(model.columns.all))
    values[positions] = binaries
    back = model.decisions(values)
    assert back.option_open.tolist() == found.decisions.option_open.tolist()
    assert back.source.tolist() == found.decisions.source.tolist() == [0, -1]
