"""Verdict symbols as small SVG drawings, the same as on the map, for lists and legends."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from siting.sharing.looks import Symbol

LIST_SIZE_PX = 18
"""Side of a symbol in a list."""


def symbol_svg(symbol: Symbol, *, fill: float | None = None, size_px: int = LIST_SIZE_PX) -> str:
    """
    Return the symbol as inline SVG.

    Parameters
    ----------
    symbol
        Shape, outline and fill, from `looks`.
    fill
        Share it is filled to, from 0 to 1; None fills it whole where the symbol fills at all.
    size_px
        Side of the drawing.

    Returns
    -------
    svg
        Holds numbers and colours of ours only, no text of the user's.
    """
    dash = ' stroke-dasharray="3 2.2"' if symbol.dashed else ""
    body = _square(symbol, fill, dash) if symbol.shape == "square" else _triangle(symbol, dash)
    if symbol.barred:
        body += f'<path d="M3 17 L17 3" stroke="{symbol.outline}" stroke-width="2"/>'
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{size_px}" height="{size_px}" viewBox="0 0 20 20" '
        f'aria-hidden="true">{body}</svg>'
    )


def _square(symbol: Symbol, fill: float | None, dash: str) -> str:
    inner = ""
    if symbol.fill:
        share = min(1.0, max(0.0, 1.0 if fill is None else fill))
        height = 12 * share
        inner = f'<rect x="4" y="{16 - height:.2f}" width="12" height="{height:.2f}" fill="{symbol.fill}"/>'
    outlines = "".join(
        f'<rect x="{at}" y="{at}" width="{20 - 2 * at}" height="{20 - 2 * at}" rx="{4 - at / 2}" fill="none" '
        f'stroke="{symbol.outline}" stroke-width="1.4"{dash}/>'
        for at in (2.4, 0.8)[: max(1, symbol.outlines)]
    )
    return inner + outlines


def _triangle(symbol: Symbol, dash: str) -> str:
    fill = symbol.fill or "none"
    body = f'<path d="M10 3.2 L17 16.6 L3 16.6 Z" fill="{fill}" stroke="{symbol.outline}" stroke-width="1.4"{dash}/>'
    if symbol.outlines > 1:
        body += f'<path d="M10 0.6 L19.4 18.4 L0.6 18.4 Z" fill="none" stroke="{symbol.outline}" stroke-width="1.2"/>'
    return body
