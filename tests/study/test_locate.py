"""Places by name: against an independent list, spellings and languages, and names that fit several towns."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from siting.network.distance import geodesic_km
from siting.study.gazetteer import fold, gazetteer
from siting.study.locate import Match, find_place

TZ_TOWNS = Path(__file__).with_name("tz_towns.csv")
"""Towns that name time zones, to the minute or second of arc: IANA tz database, zone.tab, public domain."""

ELSEWHERE = {("AU", "Macquarie"), ("MN", "Hovd")}
"""Time zones named after an island and a province, of whose name there is a town elsewhere in the country."""


def test_well_known_towns_are_where_an_independent_list_has_them() -> None:
    """Of the towns of the tz database that a name leads to, 278 lie within 10 km, all others within 30 km."""
    with TZ_TOWNS.open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if (row["country"], row["town"]) not in ELSEWHERE]
    apart = {}
    for row in rows:
        town = find_place(row["town"], row["country"]).town
        assert town is not None, row
        degrees = float(row["latitude"]), float(row["longitude"])
        apart[row["country"], row["town"]] = float(geodesic_km(*degrees, town.latitude, town.longitude))
    assert sum(km <= 10 for km in apart.values()) >= 278
    assert max(apart.values()) < 30, max(apart, key=apart.__getitem__)
    assert len({country for country, _ in apart}) > 100


AMBIGUOUS = [
    ("Frankfurt", "DE"), ("Neustadt", "DE"), ("Springfield", "US"), ("Portland", "US"), ("Perth", "AU"),
    ("Belem", "BR"), ("Campo Grande", "BR"), ("Boa Vista", "BR"), ("Rio Branco", "BR"), ("Aqtau", "KZ"),
    ("Merida", "MX"), ("Monterrey", "MX"), ("Matamoros", "MX"), ("Chihuahua", "MX"), ("Kirov", "RU"),
    ("Louisville", "US"), ("Denver", "US"), ("Phoenix", "US"), ("Anchorage", "US"), ("Vienna", ""), ("London", ""),
    ("Neunkirchen", "DE"),
]  # fmt: skip


@pytest.mark.parametrize(("place", "country"), AMBIGUOUS)
def test_names_of_several_towns_ask(place: str, country: str) -> None:
    """Nothing is taken; the candidates come the largest first, more than 10 km apart."""
    found = find_place(place, country)
    assert found.match is Match.AMBIGUOUS
    assert found.town is None
    sizes = [town.population for town in found.candidates]
    assert len(sizes) > 1
    assert sizes[0] == max(sizes)


SPELLINGS = [
    ("Graz", "AT", "Graz", Match.EXACT, 1.0),
    ("GRAZ", "Österreich", "Graz", Match.EXACT, 1.0),
    ("Wien", "AT", "Vienna", Match.OTHER_NAME, 1.0),
    ("Vienne", "aut", "Vienna", Match.OTHER_NAME, 1.0),
    ("Muenchen", "Germany", "Munich", Match.OTHER_NAME, 1.0),
    ("Gyor", "HU", "Győr", Match.EXACT, 1.0),
    ("Brünn", "Česko", "Brno", Match.OTHER_NAME, 1.0),
    ("St. Pölten", "AT", "Sankt Pölten", Match.EXACT, 1.0),
    ("SANKT POELTEN", "AT", "Sankt Pölten", Match.OTHER_NAME, 1.0),
    ("Łódź", "PL", "Łódź", Match.EXACT, 1.0),
    ("Lodz", "Poland", "Łódź", Match.EXACT, 1.0),
    ("4020 Linz", "AT", "Linz", Match.EXACT, 1.0),
    ("A-4020 Linz", "AT", "Linz", Match.EXACT, 1.0),
    ("Hauptplatz 1, 4020 Linz", "AT", "Linz", Match.EXACT, 1.0),
    ("Villach (Kärnten)", "AT", "Villach", Match.EXACT, 1.0),
    ("Insbruck", "AT", "Innsbruck", Match.NEAR, 0.941),
    ("Klagenfurth", "AT", "Klagenfurt am Wörthersee", Match.NEAR, 0.952),
]


@pytest.mark.parametrize(("place", "country", "name", "match", "confidence"), SPELLINGS)
def test_spellings_of_one_town(place: str, country: str, name: str, match: Match, confidence: float) -> None:
    """Case, accents, languages, saints, postcodes and addresses do not matter; a slip does, and is said."""
    found = find_place(place, country)
    assert found.town is not None, found
    assert (found.town.name, found.match) == (name, match)
    assert found.confidence == pytest.approx(confidence, abs=1e-3)


@pytest.mark.parametrize(
    ("place", "country"),
    [("Xyzzy", "AT"), ("Insbruck", ""), ("Grz", "AT"), ("Madeira", "PT"), ("", "AT"), ("4020", "AT"), ("Wien", "FR")],
)
def test_what_is_not_known_is_left_unknown(place: str, country: str) -> None:
    """No near-spelling is tried without a country, for very short names, or for what is only somewhat alike."""
    assert find_place(place, country) == find_place(place, country)
    assert find_place(place, country).match is Match.UNKNOWN


def test_near_spellings_of_two_towns_ask() -> None:
    """Between two towns that are equally alike, nothing is decided."""
    found = find_place("Neuhofen an der Kremz", "AT")
    assert found.match is Match.NEAR
    doubtful = find_place("Sankt Veitt", "AT")
    assert doubtful.match is Match.AMBIGUOUS


@pytest.mark.parametrize(
    ("names", "folded"),
    [
        (("Saint-Étienne", "ST. ETIENNE", "st etienne"), "st etienne"),
        (("Weißenburg", "WEISSENBURG", "Weissenburg"), "weissenburg"),
        (("L'Aquila", "L\u2019AQUILA", "LAquila"), "laquila"),
        (("Bielsko-Biała", "Bielsko  Biala"), "bielsko biala"),
    ],
)
def test_spellings_are_folded_alike(names: tuple[str, ...], folded: str) -> None:
    """What all spellings have in common."""
    assert {fold(name) for name in names} == {folded}


def test_the_towns_are_all_there() -> None:
    """170,391 towns of 240 countries and more, in range, the largest of a country first."""
    towns = gazetteer()
    assert len(towns.names) == 170_391
    assert len(towns.of_country) > 240
    assert abs(towns.latitude).max() <= 90
    assert abs(towns.longitude).max() <= 180
    assert towns.town(towns.of_country["AT"][0]).name == "Vienna"
