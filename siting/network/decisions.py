"""What is decided on a network: which options open, which suppliers are signed, and what moves, by position."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats, Positions

NO_SOURCE = -1
"""In `Decisions.source`: the customer is not single-sourced (or needs nothing)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Decisions:
    """The yes-or-no part of a plan. Shapes: O options, K suppliers, C customers, S sites."""

    option_open: Flags
    """(O,) at most one True per site."""
    supplier_signed: Flags
    """(K,)"""
    source: Positions
    """(C,) origin of each single-sourced customer: site i is i, supplier k is S + k; `NO_SOURCE` elsewhere."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Amounts:
    """Units of the good a year on each lane of a network, in the order of its lanes."""

    inbound: Floats
    outbound: Floats
    direct: Floats
    marginal_cost: Floats
    """(C, G) dual of each demand row with the decisions held; NaN where none is defined."""
