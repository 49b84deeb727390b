"""Colours have the contrast they need; numbers read as they should."""

from __future__ import annotations

from itertools import pairwise

import pytest

from siting.errors import SettingsError
from siting.plan.plan import SiteVerdict, SupplierVerdict
from siting.sharing import looks
from siting.sharing.looks import Formats
from siting.study.tables import SiteStanding, SupplierStanding

WHITE = "#FFFFFF"
EUR = Formats(currency="EUR", unit="t")


@pytest.mark.parametrize(
    ("colour", "ratio"),
    [
        ("#000000", 21.0),
        ("#767676", 4.542),
        ("#777777", 4.478),
        ("#595959", 7.005),
        ("#949494", 3.033),
        ("#959595", 2.995),
        ("#FF0000", 3.998),
        ("#0000FF", 8.592),
    ],
)
def test_contrast_follows_wcag(colour: str, ratio: float) -> None:
    """Values computed with the formula of WCAG 2.2, definition of contrast ratio, for colours on white."""
    assert looks.contrast(colour, WHITE) == pytest.approx(ratio, abs=0.0005)
    assert looks.contrast(WHITE, colour) == looks.contrast(colour, WHITE)


@pytest.mark.parametrize(("foreground", "background", "least"), looks.PAIRS)
def test_every_pair_in_use_has_its_contrast(foreground: str, background: str, least: float) -> None:
    """WCAG 2.2, 1.4.3 (text 4.5:1) and 1.4.11 (graphics 3:1), without rounding up."""
    assert looks.contrast(foreground, background) >= least


def test_every_symbol_colour_is_among_the_pairs() -> None:
    """A symbol, line or shade in a colour that no pair lists would escape the check above."""
    used = {looks.LEG_LINES[leg][0] for leg in looks.LEG_LINES} | set(looks.BAND_SHADES)
    tables = (
        looks.SITE_SYMBOLS,
        looks.SUPPLIER_SYMBOLS,
        looks.SITE_STANDING_SYMBOLS,
        looks.SUPPLIER_STANDING_SYMBOLS,
    )
    for table in tables:
        used |= {symbol.outline for symbol in table.values()} | {
            symbol.fill for symbol in table.values() if symbol.fill
        }
    for ground in (looks.PAPER, looks.SEA):
        checked = {pair[0] for pair in looks.PAIRS if pair[1] == ground and pair[2] >= looks.GRAPHIC}
        assert used <= checked


def test_no_two_symbols_differ_by_colour_alone() -> None:
    """Shape, number of outlines, dashes, fill or bar tell every verdict and standing from every other of its kind."""
    for table, verdicts in (
        (looks.SITE_SYMBOLS, SiteVerdict),
        (looks.SUPPLIER_SYMBOLS, SupplierVerdict),
        (looks.SITE_STANDING_SYMBOLS, SiteStanding),
        (looks.SUPPLIER_STANDING_SYMBOLS, SupplierStanding),
    ):
        assert set(table) == set(verdicts)
        forms = {(s.shape, s.outlines, s.dashed, bool(s.fill), s.barred) for s in table.values()}
        assert len(forms) == len(verdicts)


def test_bands_darken_with_distance() -> None:
    """The farther the customer, the darker its dot, so that the order survives a black-and-white print."""
    light = [looks.relative_luminance(shade) for shade in looks.BAND_SHADES]
    assert light == sorted(light, reverse=True)
    assert min(near / far for near, far in pairwise(light)) > 1.2


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (1.0, "1"),
        (12.5, "12.5"),
        (99.94, "99.9"),
        (100.0, "100"),
        (100.4, "100"),
        (1_234_567.8, "1,234,568"),
        (0.00012345, "0.000123"),
        (-3.14159, "-3.14"),
    ],
)
def test_numbers_keep_three_digits_and_never_read_zero(value: float, text: str) -> None:
    """Whole from 100 up, three digits below, and nothing that is not 0 reads as 0."""
    assert EUR.number(value) == text


@pytest.mark.parametrize(
    ("currency", "value", "text"),
    [
        ("EUR", 12.5, "12.50 EUR"),
        ("EUR", 12.0, "12 EUR"),
        ("EUR", 0.001, "0.001 EUR"),
        ("EUR", 0.0, "0 EUR"),
        ("EUR", 1234.6, "1,235 EUR"),
        ("JPY", 12.5, "12 JPY"),
        ("KWD", 1.2345, "1.234 KWD"),
    ],
)
def test_money_has_the_decimals_of_its_currency(currency: str, value: float, text: str) -> None:
    """ISO 4217: two decimals by default, none for JPY, three for KWD; the code stands behind the number."""
    assert Formats(currency=currency, unit="t").money(value).replace(looks.NO_BREAK, " ") == text


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0 %"),
        (1.0, "100 %"),
        (0.001, "0.1 %"),
        (0.00099, "under 0.1 %"),
        (0.999, "99.9 %"),
        (0.9991, "over 99.9 %"),
        (0.12345, "12.3 %"),
    ],
)
def test_a_share_never_reads_as_none_or_all_by_rounding(value: float, text: str) -> None:
    """0 % and 100 % are said only of exactly none and all."""
    assert EUR.share(value).replace(looks.NO_BREAK, " ") == text


def test_a_locale_sets_the_separators() -> None:
    """German groups with points and writes a decimal comma."""
    german = Formats(currency="EUR", unit="t", locale="de")
    assert german.amount(1234567.0) == f"1.234.567{looks.NO_BREAK}t"
    assert german.distance(12.5) == f"12,5{looks.NO_BREAK}km"


def test_an_unknown_locale_is_refused() -> None:
    """The message names the locale and shows good ones."""
    with pytest.raises(SettingsError, match="locale 'klingonish' is unknown; write one such as en, de or pl"):
        Formats(currency="EUR", unit="t", locale="klingonish")


def test_long_texts_are_shortened_visibly() -> None:
    """At the limit nothing changes; one character more is cut and the full length is named."""
    assert looks.shortened("a" * 20, 20) == "a" * 20
    assert looks.shortened("a" * 21, 20) == f"{'a' * 20}… (21 characters)"
    assert looks.label("b" * 26) == "b" * 26
    assert looks.label("b" * 27) == "b" * 25 + "…"


def test_css_has_every_colour_once() -> None:
    """Pages and maps take their colours from these custom properties."""
    css = looks.css_colours()
    assert css.startswith(":root{--ink:#1F2A37;")
    assert css.count("--teal:") == 1
