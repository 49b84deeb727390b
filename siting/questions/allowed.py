"""Whether decisions are ones that pins, sizes, counts, the budget and the rules of a network allow."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.study.tables import RuleKind

if TYPE_CHECKING:
    from siting.network.decisions import Decisions
    from siting.network.network import Network, NetworkRule

ROUNDING = 1e-9
"""Relative difference of sums of money that is rounding."""


def allowed(network: Network, decisions: Decisions) -> bool:
    """
    Return whether decisions are allowed, whatever moves.

    Parameters
    ----------
    network
        Its pins, counts, budget and rules.
    decisions
        Of that network.

    Returns
    -------
    allowed
        True where every limit on the decisions alone is kept; flows are another matter.
    """
    sizes = np.bincount(network.option_site[decisions.option_open], minlength=len(network.sites))
    is_open, signed = sizes > 0, decisions.supplier_signed
    count = int(is_open.sum())
    return bool(
        np.all(sizes <= 1)
        and not np.any(network.site_pinned_open & ~is_open)
        and not np.any(network.site_pinned_shut & is_open)
        and not np.any(network.supplier_pinned_signed & ~signed)
        and not np.any(network.supplier_pinned_unsigned & signed)
        and network.fewest_sites <= count <= network.most_sites
        and one_off(network, decisions) <= network.one_off_budget + ROUNDING * abs(network.one_off_budget)
        and all(_keeps(rule, _held(rule, is_open.tolist(), signed.tolist())) for rule in network.rules)
    )


def one_off(network: Network, decisions: Decisions) -> float:
    """Return the one-off money of decisions: opening, closing, signing and dropping."""
    shut = np.ones(len(network.sites), dtype=np.bool_)
    shut[network.option_site[decisions.option_open]] = False
    sites = network.option_one_off[decisions.option_open].sum() + network.site_closing_one_off[shut].sum()
    suppliers = network.supplier_one_off[decisions.supplier_signed].sum()
    return float(sites + suppliers + network.supplier_dropping_one_off[~decisions.supplier_signed].sum())


def _held(rule: NetworkRule, is_open: list[bool], signed: list[bool]) -> list[bool]:
    return [is_open[place] if kind == "site" else signed[place] for kind, place in rule.members]


def _keeps(rule: NetworkRule, held: list[bool]) -> bool:
    count, number = sum(held), rule.number or 0
    keeps = {
        RuleKind.ONE_OF: count == 1,
        RuleKind.NOT_TOGETHER: count <= 1,
        RuleKind.TOGETHER: count in {0, len(held)},
        RuleKind.NEEDS: not held[0] or all(held),
        RuleKind.AT_MOST: count <= number,
        RuleKind.AT_LEAST: count >= number,
    }
    return keeps[rule.kind]
