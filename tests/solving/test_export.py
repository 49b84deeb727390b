"""The model written to files has the same optimum in other solvers' readers."""

from __future__ import annotations

import re
import subprocess
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pulp
import pytest

from siting.network.network import NetworkRule
from siting.solving.export import write_models
from siting.solving.highs import QuietHighs
from siting.study.tables import RuleKind
from tests.solving.solved import best

if TYPE_CHECKING:
    from pathlib import Path

    from siting.network.network import Network
    from tests.solving.conftest import NetworkMaker


def rich(make_network: NetworkMaker) -> Network:
    """Return a network with every kind of row, a constant in its objective and money large enough to be scaled."""
    network = make_network(
        demand=[[10, 4], [20, 0], [30, 7]],
        charges=[1e6, 1.3e6, 1.2e6],
        capacities=[40, 90, 60],
        sites=[0, 0, 1],
        supplier_charges=[5e5, 1e5],
        inbound=[(0, 0, 1e4), (0, 1, 2e4), (1, 1, 1.1e4), (1, 0, 3e4), (0, 0, 1e4, 1), (1, 1, 1.7e4, 1)],
        outbound=[
            *[
                (site, customer, 1e4 * (1 + abs(site - customer)), 0, 40.0 + 50 * customer)
                for site in range(2)
                for customer in range(3)
            ],
            *[(site, customer, 2e4, 1, 40.0) for site in range(2) for customer in (0, 2)],
        ],
        direct=[(1, 1, 2.5e4, 0, 10.0)],
    )
    return replace(
        network,
        load=np.array([1.0, 0.5]),
        weight_t=np.array([1.0, 3.0]),
        single_source=np.array([True, False, False]),
        site_closing=np.array([0.0, 777.25]),
        site_closing_one_off=np.array([0.0, 3000.0]),
        supplier_dropping=np.array([333.5, 0.0]),
        option_one_off=np.array([1000.0, 2000.0, 0.0]),
        one_off_budget=5000.0,
        option_least=np.array([5.0, 10.0, 2.0]),
        supplier_least=np.array([3.0, 0.0]),
        offer_least=np.array([[0.0, 1.0], [0.0, 0.0]]),
        supplier_capacity=np.array([70.0, 40.0]),
        service_km=100.0,
        service_share=0.5,
        fewest_sites=1,
        most_sites=1,
        rules=(NetworkRule(kind=RuleKind.AT_LEAST, members=(("site", 0), ("supplier", 0)), number=1),),
    )


def cbc_optimum(file: Path) -> float:
    """Return the optimum the CBC that PuLP brings along finds for a file."""
    command = [str(pulp.PULP_CBC_CMD.pulp_cbc_path), str(file), "-ratio", "0", "-solve", "-quit"]
    done = subprocess.run(command, capture_output=True, text=True, check=True)  # noqa: S603 - PuLP's own program
    found = re.search(r"^Objective value:\s+(\S+)", done.stdout, re.MULTILINE)
    assert found is not None, done.stdout
    return float(found.group(1))


def highs_optimum(file: Path) -> float:
    """Return the optimum HiGHS finds for a file."""
    highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
    highs.readModel(str(file))
    highs.setOptionValue("mip_rel_gap", 0.0)
    highs.run()
    return float(highs.getInfo().objective_function_value)


@pytest.mark.parametrize("kind", ["mps", "lp"])
def test_a_written_model_has_the_same_optimum(make_network: NetworkMaker, tmp_path: Path, kind: str) -> None:
    """HiGHS and CBC read the file and find the whole cost in money a year, its constant part included."""
    network = rich(make_network)
    file = tmp_path / f"model.{kind}"
    write_models(network, **{kind: file})
    found = best(network)
    assert found is not None
    assert len(found.options) == 1
    assert highs_optimum(file) == pytest.approx(found.cost, rel=1e-9)
    assert cbc_optimum(file) == pytest.approx(found.cost, rel=1e-9)


def test_every_variable_has_its_bounds_written(two_sites: Network, tmp_path: Path) -> None:
    """No reader is left to guess: each column of the file stands in its bounds."""
    file = tmp_path / "model.mps"
    write_models(two_sites, mps=file)
    text = file.read_text()
    columns = set(re.findall(r"^ {4}([a-z]+_\d+) ", text[text.index("COLUMNS") : text.index("RHS")], re.MULTILINE))
    bounded = set(re.findall(r"^ [A-Z]{2} BND +([a-z]+_\d+)", text[text.index("BOUNDS") :], re.MULTILINE))
    assert columns == bounded == {"y_0", "y_1", *(f"x_{lane}" for lane in range(6))}
