"""
The links of the model: a charge is paid before anything moves.

Tight links stand lane by lane, each with the smallest constant that is valid. With the capacity row alone (one constant
a site, as large as the site) the relaxation is far weaker; that form is kept for comparing the two.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.tightest import holds

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Flags, Floats, Positions
    from siting.network.network import Network
    from siting.solving.columns import Columns
    from siting.solving.rows import Rows
    from siting.solving.tightest import Tightest


def add_links(rows: Rows, network: Network, columns: Columns, most: Tightest, *, every_lane: bool) -> None:
    """
    Link every flow to what must be open or signed for it.

    Parameters
    ----------
    rows
        Where the links are added.
    network, columns, most
        The network, its variables and its smallest constants.
    every_lane
        True for tight links on every lane; False leaves the linking to the capacity rows, but for goods that use no
        capacity, which those rows do not see.
    """
    linker = _Linker(
        rows=rows,
        network=network,
        columns=columns,
        most=most,
        linked=np.full(len(network.goods), every_lane) | (network.load <= 0),
        options=_options(network),
    )
    linker.outbound()
    linker.inbound()
    linker.direct()
    if every_lane or bool((network.load <= 0).any()):
        linker.pairs()


def _options(network: Network) -> list[list[int]]:
    """Return the options of each site."""
    options: list[list[int]] = [[] for _ in network.sites]
    for option, site in enumerate(network.option_site.tolist()):
        options[site].append(option)
    return options


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Linker:
    """What the links of every leg need."""

    rows: Rows
    network: Network
    columns: Columns
    most: Tightest
    linked: Flags
    """(G,) goods whose lanes are linked one by one."""
    options: list[list[int]]

    def outbound(self) -> None:
        """Let goods leave a site only through an open option."""
        lanes, most = self.network.outbound, self.most
        chosen = self.linked[lanes.good] & most.outbound_usable & (most.pairs.of_outbound < 0)
        self._to_options(
            "open_for_x",
            lane=np.flatnonzero(chosen),
            share=self.columns.outbound[chosen],
            site=lanes.origin[chosen],
            unit_load=self.network.load[lanes.good[chosen]],
            units=most.outbound_demand[chosen],
            ceiling=most.outbound_demand[chosen],
        )

    def inbound(self) -> None:
        """Let goods enter a site only through an open option, and leave a supplier only when it is signed."""
        lanes, most = self.network.inbound, self.most
        chosen = self.linked[lanes.good] & (most.inbound_most > 0)
        number = np.flatnonzero(chosen)
        share = self.columns.inbound[chosen]
        self._to_options(
            "open_for_u",
            lane=number,
            share=share,
            site=lanes.destination[chosen],
            unit_load=self.network.load[lanes.good[chosen]],
            units=most.inbound_most[chosen],
            ceiling=most.supplier_most[chosen],
        )
        signed = self.columns.supplier[lanes.origin[chosen]]
        for lane, column, supplier in zip(number.tolist(), share.tolist(), signed.tolist(), strict=True):
            self.rows.link(f"signed_for_u_{lane}", [(column, 1.0), (supplier, -1.0)])

    def direct(self) -> None:
        """Let goods leave a supplier for a customer only when it is signed."""
        lanes, most = self.network.direct, self.most
        chosen = self.linked[lanes.good] & most.direct_usable & (most.pairs.of_direct < 0)
        for lane in np.flatnonzero(chosen).tolist():
            signed = int(self.columns.supplier[lanes.origin[lane]])
            fits = float(most.direct_most[lane] / most.direct_demand[lane])
            self.rows.link(f"signed_for_w_{lane}", [(int(self.columns.direct[lane]), 1.0), (signed, -fits)])

    def pairs(self) -> None:
        """Let a customer be taken whole only by an open option that can hold it whole, or by a signed supplier."""
        sites = len(self.network.sites)
        option = self.columns.option.tolist()
        pairs = self.most.pairs
        for pair, (origin, load) in enumerate(zip(pairs.origin.tolist(), pairs.load.tolist(), strict=True)):
            terms = [(int(self.columns.pair[pair]), 1.0)]
            if origin < sites:
                fits = holds(self.network.option_capacity, load)
                terms += [(option[size], -1.0) for size in self.options[origin] if fits[size]]
            else:
                terms.append((int(self.columns.supplier[origin - sites]), -1.0))
            self.rows.link(f"holds_a_{pair}", terms)

    def _to_options(  # noqa: PLR0913 - parallel arrays, each named
        self,
        name: str,
        *,
        lane: NDArray[np.intp],
        share: Positions,
        site: Positions,
        unit_load: Floats,
        units: Floats,
        ceiling: Floats,
    ) -> None:
        """Add, for each lane: share x units <= sum over the site's options of min(ceiling, capacity / load) y."""
        option = self.columns.option.tolist()
        capacity = self.network.option_capacity.tolist()
        columns = (lane, share, site, unit_load, units, ceiling)
        for number, column, place, load, scale, top in zip(*(values.tolist() for values in columns), strict=True):
            terms = [(column, 1.0)]
            for size in self.options[place]:
                fits = min(top, capacity[size] / load) if load > 0 else top
                terms.append((option[size], -fits / scale))
            self.rows.link(f"{name}_{number}", terms)
