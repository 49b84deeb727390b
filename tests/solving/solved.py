"""Solve a small network to the proof with one engine, for tests that force behaviour by changing one number."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.listener import Silent, Stop
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.study.settings import SolveSettings

if TYPE_CHECKING:
    from siting.network.decisions import Amounts, Decisions
    from siting.network.network import Network
    from siting.solving.engine import Engine

EXACT = SolveSettings(gap=0.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Solved:
    """A proved optimum: its cost, which options are open, which suppliers are signed, what moves."""

    cost: float
    bound: float
    options: list[int]
    suppliers: list[int]
    decisions: Decisions
    amounts: Amounts


def best(network: Network, engine: Engine = direct) -> Solved | None:
    """Return the optimum, or None where the engine proves that there is none."""
    result = engine(network, EXACT, listener=Silent(), stop=Stop())
    if result.impossible:
        assert result.decisions is None
        return None
    assert result.decisions is not None
    assert result.bound is not None
    amounts = flows_for(network, result.decisions)
    assert amounts is not None
    return Solved(
        cost=price(network, result.decisions, amounts),
        bound=result.bound,
        options=np.flatnonzero(result.decisions.option_open).tolist(),
        suppliers=np.flatnonzero(result.decisions.supplier_signed).tolist(),
        decisions=result.decisions,
        amounts=amounts,
    )
