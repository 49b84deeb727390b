"""Write the exact model of a network to a file that other solvers read."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.solving.model import build_model

if TYPE_CHECKING:
    from pathlib import Path

    from siting.network.network import Network


def write_models(network: Network, *, mps: Path | None = None, lp: Path | None = None) -> None:
    """
    Write the model that the engines solve, its objective in money a year.

    Parameters
    ----------
    network
        What to state.
    mps
        Where to write free MPS; None = not.
    lp
        Where to write an LP file; None = not.

    Raises
    ------
    OSError
        If a file cannot be written.
    """
    model = build_model(network)
    model.problem.setObjective(model.problem.objective * model.money)
    if mps is not None:
        model.problem.writeMPS(str(mps))
    if lp is not None:
        model.problem.writeLP(str(lp))
