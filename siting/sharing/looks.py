"""
How everything that leaves the program looks and reads: colours, widths, symbols, fonts, numbers.

The only place of these; map, charts, report and pages take them from here. Every colour pair in use is listed in
`PAIRS` with the contrast that WCAG 2.2 asks of it, and a test computes them all.
"""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from babel import Locale
from babel.core import UnknownLocaleError
from babel.numbers import get_currency_precision, parse_pattern

from siting.errors import SettingsError
from siting.plan.plan import SiteVerdict, SupplierVerdict
from siting.study.tables import SiteStanding, SupplierStanding

if TYPE_CHECKING:
    from collections.abc import Mapping

    from babel.numbers import NumberPattern

INK = "#1F2A37"
PAPER = "#FBFAF7"
PANEL = "#F1EFE9"
"""Ground of notices and controls."""
TEAL = "#0F766E"
OCHRE = "#B45309"
SLATE = "#475569"
FAULT = "#BE123C"
SEA = "#E4EAEE"
"""Sea and lakes behind a map; land is paper."""
QUIET = "#55606F"
"""Text of second rank."""
FAINT = "#6F7B8A"
"""Outlines of what the plan leaves alone."""
SHUT = "#525E6D"
"""Outlines of what closes or is dropped."""
RULE = "#D5DADF"
"""Hair-lines between parts of a page; carries no meaning."""
BORDER = "#B4BDC6"
"""Country borders and coasts; carries no meaning that a label does not."""
TOWN = "#65707E"
"""Names of towns on a map."""
BAND_SHADES = ("#7480A8", "#626A9B", "#50558A", "#3D4176", "#2B2E5C", "#181A3D")
"""Customers by road-distance band, near to far: the farther, the darker."""

FONT_STACK = 'system-ui, -apple-system, "Segoe UI", Roboto, "Noto Sans", "Helvetica Neue", Arial, sans-serif'
"""Fonts the reader's machine has; none is fetched."""

TEXT, LARGE_TEXT, GRAPHIC = 4.5, 3.0, 3.0
"""Least contrast of text, large text (18 pt, or 14 pt bold) and graphics: WCAG 2.2, 1.4.3 and 1.4.11, level AA."""

PAIRS: tuple[tuple[str, str, float], ...] = (
    (INK, PAPER, TEXT),
    (INK, SEA, TEXT),
    (QUIET, PAPER, TEXT),
    (INK, PANEL, TEXT),
    (QUIET, PANEL, TEXT),
    (TEAL, PANEL, TEXT),
    (QUIET, SEA, TEXT),
    (PAPER, INK, TEXT),
    (TEAL, PAPER, TEXT),
    (OCHRE, PAPER, TEXT),
    (SLATE, PAPER, TEXT),
    (FAULT, PAPER, TEXT),
    (PAPER, TEAL, TEXT),
    (TOWN, PAPER, TEXT),
    # On the sea a town's name carries a halo of paper, so its contrast there is that of paper.
    *((colour, ground, GRAPHIC) for colour in (TEAL, OCHRE, SLATE, SHUT, FAINT, INK) for ground in (PAPER, SEA)),
    *((shade, ground, GRAPHIC) for shade in BAND_SHADES for ground in (PAPER, SEA)),
)
"""Foreground, background, least contrast of every pair in use."""

WIDEST_LINE_PX = 8.0
"""Width of the largest flow of a leg; others in proportion to their volume."""
HAIR_LINE_PX = 0.8
"""Width of every flow too small for its share of `WIDEST_LINE_PX`; the legend says up to what volume."""
LARGEST_DOT_PX, SMALLEST_DOT_PX = 9.0, 2.2
"""Radius of the largest customer, its area in proportion to demand, and the least radius of any."""
LEG_LINES: Mapping[str, tuple[str, str]] = {
    "outbound": (SLATE, ""),
    "inbound": (OCHRE, "9 6"),
    "direct": (SLATE, "7 4 2 4"),
}
"""Colour and dashes (empty = solid) of each leg."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Symbol:
    """How one verdict or standing is drawn; a legend entry."""

    shape: str
    """`square` for sites, `triangle` for suppliers."""
    outline: str
    """Colour of the outline."""
    outlines: int = 1
    """Two for what is new."""
    dashed: bool = False
    fill: str = ""
    """Colour it fills with: a square up to its utilisation, a triangle whole; empty = stays hollow."""
    barred: bool = False
    """A bar across: what stops."""
    size_px: int
    meaning: str
    """What it says, for legends."""

    def as_json(self) -> dict[str, object]:
        """Return the symbol as plain values."""
        return asdict(self)


SITE_SYMBOLS: Mapping[SiteVerdict, Symbol] = {
    SiteVerdict.KEEP: Symbol(shape="square", outline=TEAL, fill=TEAL, size_px=24, meaning="running, stays open"),
    SiteVerdict.OPEN: Symbol(shape="square", outline=TEAL, outlines=2, fill=TEAL, size_px=28, meaning="new, opens"),
    SiteVerdict.CLOSE: Symbol(
        shape="square", outline=SHUT, dashed=True, barred=True, size_px=20, meaning="running, closes"
    ),
    SiteVerdict.LEAVE: Symbol(shape="square", outline=FAINT, dashed=True, size_px=14, meaning="proposed, left alone"),
}
SUPPLIER_SYMBOLS: Mapping[SupplierVerdict, Symbol] = {
    SupplierVerdict.STAY: Symbol(shape="triangle", outline=OCHRE, fill=OCHRE, size_px=18, meaning="signed, stays"),
    SupplierVerdict.SIGN: Symbol(
        shape="triangle", outline=OCHRE, outlines=2, fill=OCHRE, size_px=24, meaning="new, is signed"
    ),
    SupplierVerdict.DROP: Symbol(
        shape="triangle", outline=OCHRE, dashed=True, barred=True, size_px=18, meaning="signed, is dropped"
    ),
    SupplierVerdict.LEAVE: Symbol(shape="triangle", outline=FAINT, size_px=13, meaning="offered, left alone"),
}
SITE_STANDING_SYMBOLS: Mapping[SiteStanding, Symbol] = {
    SiteStanding.RUNNING: Symbol(shape="square", outline=TEAL, size_px=22, meaning="there today"),
    SiteStanding.PROPOSED: Symbol(shape="square", outline=SHUT, dashed=True, size_px=18, meaning="could be opened"),
}
SUPPLIER_STANDING_SYMBOLS: Mapping[SupplierStanding, Symbol] = {
    SupplierStanding.SIGNED: Symbol(
        shape="triangle", outline=OCHRE, fill=OCHRE, size_px=18, meaning="under contract today"
    ),
    SupplierStanding.OFFERED: Symbol(shape="triangle", outline=OCHRE, size_px=16, meaning="could be signed"),
}


def relative_luminance(colour: str) -> float:
    """
    Return the relative luminance of `#RRGGBB`, from 0 (black) to 1 (white).

    References
    ----------
    W3C, WCAG 2.2, definition of relative luminance, https://www.w3.org/TR/WCAG22/#dfn-relative-luminance
    """
    channels = [int(colour[start : start + 2], 16) / 255 for start in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels)  # noqa: PLR2004
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(one: str, other: str) -> float:
    """Return the contrast ratio of two colours, from 1 (equal) to 21 (black on white), as WCAG 2.2 defines it."""
    darker, lighter = sorted((relative_luminance(one), relative_luminance(other)))
    return (lighter + 0.05) / (darker + 0.05)


def css_colours() -> str:
    """Return the colours and fonts as CSS custom properties on `:root`."""
    named = {
        "ink": INK,
        "paper": PAPER,
        "panel": PANEL,
        "teal": TEAL,
        "ochre": OCHRE,
        "slate": SLATE,
        "fault": FAULT,
        "sea": SEA,
        "quiet": QUIET,
        "faint": FAINT,
        "shut": SHUT,
        "rule": RULE,
        "border": BORDER,
        "town": TOWN,
        "font": FONT_STACK,
    }
    return ":root{" + "".join(f"--{name}:{value};" for name, value in named.items()) + "}"


NO_BREAK = "\N{NO-BREAK SPACE}"
WHOLE_FROM = 100.0
"""Numbers from here up are shown without decimals."""
SMALLEST_SHARE, LARGEST_SHARE = 0.001, 0.999
"""Shares between these are rounded to 0.1 %; beyond, rounding might print 0 % or 100 %."""


@lru_cache(maxsize=32)
def _pattern(decimals: int, least_decimals: int = 0) -> NumberPattern:
    tail = "0" * least_decimals + "#" * (decimals - least_decimals)
    return parse_pattern(f"#,##0.{tail}" if tail else "#,##0")


@dataclass(frozen=True, slots=True, kw_only=True)
class Formats:
    """How numbers of a study read: its currency and unit, in a locale."""

    currency: str
    """ISO 4217 code."""
    unit: str
    """The study's amount unit, such as `t`."""
    locale: str = "en"
    """Whose separators are used."""

    def __post_init__(self) -> None:
        """Refuse a locale nobody knows."""
        try:
            Locale.parse(self.locale)
        except (UnknownLocaleError, ValueError) as unknown:
            msg = f"locale {self.locale!r} is unknown; write one such as en, de or pl"
            raise SettingsError(msg) from unknown

    def number(self, value: float) -> str:
        """Return the number: whole from 100 up, else three digits; never 0 by rounding."""
        size = abs(value)
        decimals = 0 if size >= WHOLE_FROM or size == 0 else max(0, 2 - math.floor(math.log10(size)))
        return str(_pattern(min(decimals, 12)).apply(value, self.locale))

    def money(self, value: float) -> str:
        """Return money with its currency: whole from 100 up, else with the currency's decimals."""
        places = get_currency_precision(self.currency)
        if abs(value) >= WHOLE_FROM:
            text = str(_pattern(0).apply(value, self.locale))
        elif value == 0 or round(abs(value), places) > 0:
            text = str(_pattern(places, places if value % 1 else 0).apply(value, self.locale))
        else:
            text = self.number(value)
        return f"{text}{NO_BREAK}{self.currency}"

    def money_a_year(self, value: float) -> str:
        """Return money a year."""
        return f"{self.money(value)} a{NO_BREAK}year"

    def amount(self, value: float) -> str:
        """Return an amount in the study's unit."""
        return f"{self.number(value)}{NO_BREAK}{self.unit}"

    def distance(self, km: float) -> str:
        """Return road kilometres."""
        return f"{self.number(km)}{NO_BREAK}km"

    def share(self, value: float) -> str:
        """Return a share as per cent to 0.1; a share that is not 0 or 1 never reads as if it were."""
        sign = f"{NO_BREAK}%"
        if value not in (0.0, 1.0):
            if abs(value) < SMALLEST_SHARE:
                return f"under {_pattern(1).apply(0.1, self.locale)}{sign}"
            if LARGEST_SHARE < value < 1.0:
                return f"over {_pattern(1).apply(99.9, self.locale)}{sign}"
        return f"{_pattern(1).apply(100 * value, self.locale)}{sign}"


def shortened(text: str, most: int) -> str:
    """Return the text, or its beginning followed by a mark and its full length where it is longer than `most`."""
    if len(text) <= most:
        return text
    return f"{text[:most].rstrip()}\N{HORIZONTAL ELLIPSIS} ({len(text):,} characters)"


def label(text: str, most: int = 26) -> str:
    """Return the text for a label on a map, cut with an ellipsis where it is longer than `most`."""
    return text if len(text) <= most else f"{text[: most - 1].rstrip()}\N{HORIZONTAL ELLIPSIS}"
