"""
The variables of the model and where each stands in its list of columns.

Every flow is a share between 0 and 1: outbound and direct of what the customer needs of the good, inbound of the most
the lane can carry. So no coefficient of a link exceeds 1, whatever unit the tables use, and a share of a
single-sourced customer is simply a binary that all its goods have in common.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    import pulp

    from siting.arrays import Flags, Floats, Positions
    from siting.network.network import Network
    from siting.solving.tightest import Tightest

NONE = -1
"""In `Columns`: no such column."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Columns:
    """
    Position of each variable in `all`; flows are `share x units`.

    Names are a letter and a position, so that no name of a study can collide with another or upset a file format.
    """

    all: tuple[pulp.LpVariable, ...]
    option: Positions
    """(O,) y: the option is open."""
    supplier: Positions
    """(K,) z: the supplier is signed."""
    pair: Positions
    """(P,) a: the single-sourced customer takes everything from the origin."""
    inbound: Positions
    """(inbound lanes,) u."""
    outbound: Positions
    """(outbound lanes,) x, or the pair's a."""
    direct: Positions
    """(direct lanes,) w, or the pair's a."""
    inbound_units: Floats
    """(inbound lanes,) units a year at a share of 1."""
    outbound_units: Floats
    """(outbound lanes,) units a year at a share of 1."""
    direct_units: Floats
    """(direct lanes,) units a year at a share of 1."""
    unserved: Positions
    """(C, G) n: share of the demand that is not served; `NONE` where all must be, or nothing is needed."""
    fixed: int
    """Position of the column fixed at 1 that carries the constant of the objective; `NONE` where there is none."""


class Maker:
    """Adds variables to a problem and numbers them."""

    def __init__(self, problem: pulp.LpProblem) -> None:
        self._problem = problem
        self.made: list[pulp.LpVariable] = []

    def add(self, letter: str, most: Floats, *, least: Floats | None = None, whole: bool = False) -> Positions:
        """
        Add one variable for each element of `most`.

        Parameters
        ----------
        letter
            Start of the name; the position follows.
        most
            Upper bounds, any length.
        least
            Lower bounds of the same length; 0 where None.
        whole
            True for whole numbers only.

        Returns
        -------
        positions
            Where each stands in the list of columns.
        """
        first = len(self.made)
        lows = [0.0] * most.size if least is None else least.tolist()
        kind = "Integer" if whole else "Continuous"
        add = self._problem.add_variable
        self.made.extend(
            add(f"{letter}_{place}", low, high, kind)
            for place, (low, high) in enumerate(zip(lows, most.tolist(), strict=True))
        )
        return np.arange(first, len(self.made), dtype=np.int32)


def make_columns(  # noqa: PLR0913 - the parts of one statement, each named
    problem: pulp.LpProblem,
    network: Network,
    most: Tightest,
    *,
    relaxed: bool,
    serve_all: bool,
    constant: float,
) -> Columns:
    """
    Add every variable of the model to `problem`.

    Parameters
    ----------
    problem
        The problem the variables belong to.
    network, most
        The network and its smallest constants.
    relaxed
        True makes every binary a share between 0 and 1.
    serve_all
        False adds a share left unserved for each demand.
    constant
        Constant of the objective, carried by a column fixed at 1 unless it is 0.

    Returns
    -------
    columns
        All variables and their positions.
    """
    maker = Maker(problem)
    options_at = np.bincount(network.option_site, minlength=len(network.sites))
    alone = options_at[network.option_site] == 1
    shut = network.site_pinned_shut[network.option_site]
    option = maker.add(
        "y",
        np.where(shut, 0.0, 1.0),
        least=np.where(network.site_pinned_open[network.option_site] & alone, 1.0, 0.0),
        whole=not relaxed,
    )
    supplier = maker.add(
        "z",
        np.where(network.supplier_pinned_unsigned, 0.0, 1.0),
        least=np.where(network.supplier_pinned_signed, 1.0, 0.0),
        whole=not relaxed,
    )
    pair = maker.add("a", np.ones(most.pairs.origin.size), whole=not relaxed)
    inbound = maker.add("u", np.where(most.inbound_most > 0, 1.0, 0.0))
    outbound = _shares(maker, "x", most.outbound_usable, most.pairs.of_outbound, pair)
    direct = _shares(maker, "w", most.direct_usable, most.pairs.of_direct, pair)
    unserved = np.full(network.demand.shape, NONE, dtype=np.int32)
    if not serve_all:
        unserved = _unserved(maker, network, relaxed=relaxed)
    fixed = int(maker.add("one", np.ones(1), least=np.ones(1))[0]) if constant else NONE
    return Columns(
        all=tuple(maker.made),
        option=option,
        supplier=supplier,
        pair=pair,
        inbound=inbound,
        outbound=outbound,
        direct=direct,
        inbound_units=most.inbound_most,
        outbound_units=most.outbound_demand,
        direct_units=most.direct_demand,
        unserved=unserved,
        fixed=fixed,
    )


def _shares(maker: Maker, letter: str, usable: Flags, pair_of: Positions, pair: Positions) -> Positions:
    """Return the column of each lane: its pair's where it has one, else a share of its own."""
    own = pair_of < 0
    column = np.empty(usable.size, dtype=np.int32)
    column[own] = maker.add(letter, np.where(usable[own], 1.0, 0.0))
    column[~own] = pair[pair_of[~own]]
    return column


def _unserved(maker: Maker, network: Network, *, relaxed: bool) -> Positions:
    """Return (C, G) columns of the shares left unserved: one a customer where it is single-sourced."""
    needed = network.demand > 0
    unserved = np.full(network.demand.shape, NONE, dtype=np.int32)
    split = needed & ~network.single_source[:, None]
    unserved[split] = maker.add("n", np.ones(int(split.sum())))
    whole = np.flatnonzero(network.single_source & needed.any(axis=1))
    both = maker.add("m", np.ones(whole.size), whole=not relaxed)
    for customer, column in zip(whole.tolist(), both.tolist(), strict=True):
        unserved[customer, needed[customer]] = column
    return unserved
