"""Order lines to demand: against pandas, and everything that is left out or made a year of, counted."""

from __future__ import annotations

import datetime as dt
from typing import TYPE_CHECKING

import pytest

from siting.errors import DataFileError
from siting.study.order_study import study_of_orders
from siting.study.orders import OrderColumns, OrderReading, Rollup, roll_up
from tests.study.order_lines import expected, order_lines

if TYPE_CHECKING:
    from pathlib import Path

    from siting.listener import Progress

COLUMNS = OrderColumns(customer="customer", good="product", quantity="kg", date="shipped")
TONNES = OrderReading(factor=0.001)


@pytest.mark.parametrize(
    ("count", "form"),
    [
        (100_000, "csv"),
        (100_000, "parquet"),
        pytest.param(1_000_000, "csv", marks=pytest.mark.long),
        pytest.param(1_000_000, "parquet", marks=pytest.mark.long),
    ],
)
def test_the_sums_are_those_of_pandas(tmp_path: Path, count: int, form: str) -> None:
    """Every customer and product, every month, lines and reasons."""
    frame = order_lines(count)
    file = tmp_path / f"orders.{form}"
    if form == "csv":
        frame.to_csv(file, index=False)
    else:
        frame.to_parquet(file, index=False)
    found = roll_up(file, COLUMNS, TONNES)
    wanted = expected(frame)
    assert found.demand.keys() == wanted.keys()
    assert list(found.demand.values()) == pytest.approx([wanted[key] for key in found.demand], rel=1e-9, abs=1e-12)
    named = frame.dropna(subset=["customer"])
    by_month = named.groupby(named["shipped"].dt.strftime("%Y-%m"))["kg"].sum() / 1000
    assert dict(found.months) == pytest.approx({str(month): held for month, held in by_month.items()})
    assert (found.lines, found.used.lines, found.skipped) == (count, count - 5, {"without a customer": 5})
    assert found.used.quantity == pytest.approx(named["kg"].sum() / 1000)
    negative = named[named["kg"] < 0]["kg"]
    assert [found.returned.lines, found.far_out.lines] == [len(negative), 3]
    assert [found.returned.quantity, found.far_out.quantity] == pytest.approx([negative.sum() / 1000, 3000.0])
    assert [line.quantity for line in found.largest] == [1000.0] * 3
    assert (found.first, found.last, found.yearly) == (dt.date(2025, 1, 1), dt.date(2025, 12, 31), 1.0)


def rolled(tmp_path: Path, text: str, columns: OrderColumns, reading: OrderReading | None = None) -> Rollup:
    """Return what a small CSV file adds up to."""
    file = tmp_path / "orders.csv"
    file.write_text(text, encoding="utf-8")
    return roll_up(file, columns, reading)


PLAIN = OrderColumns(customer="who", quantity="much", date="day")


def test_returns_are_taken_off_or_left_out(tmp_path: Path) -> None:
    """5 less 2 is 3; A's returns reach its orders, so that nothing is left of it."""
    text = "who,much\nA,2\nA,-2\nB,5\nB,-2\n"
    columns = OrderColumns(customer="who", quantity="much")
    net = rolled(tmp_path, text, columns)
    assert (net.demand, net.emptied, net.returned.lines, net.skipped) == ({("B", ""): 3.0}, 1, 2, {})
    gross = rolled(tmp_path, text, columns, OrderReading(returns=False))
    assert (gross.demand, gross.emptied) == ({("A", ""): 2.0, ("B", ""): 5.0}, 0)
    assert gross.skipped == {"returned": 2}
    assert gross.used.lines == 2


def test_far_out_lines_are_kept_and_told_or_left_out(tmp_path: Path) -> None:
    """Eight times the upper quartile is the least that is far out: of lines of 1, 8 is not and 8.1 is."""
    text = "who,much\n" + "A,1\n" * 40 + "B,8\nC,8.1\n"
    columns = OrderColumns(customer="who", quantity="much")
    kept = rolled(tmp_path, text, columns)
    assert kept.demand["C", ""] == 8.1
    assert [(line.customer, line.quantity) for line in kept.largest] == [("C", 8.1)]
    assert kept.largest[0].limit == pytest.approx(8.0)
    without = rolled(tmp_path, text, columns, OrderReading(far_out=False))
    assert without.demand == {("A", ""): 40.0, ("B", ""): 8.0}
    assert without.skipped == {"far out": 1}


def test_lines_that_cannot_be_used_are_counted_by_reason(tmp_path: Path) -> None:
    """Each line once, by the first thing that is wrong with it."""
    text = (
        "who,what,much,day\nA,x,1,2025-03-01\n,x,1,2025-03-01\nA,,1,2025-03-01\nA,x,one,2025-03-01\nA,x,,2025-03-01\n"
        "A,x,1,soon\nA,x,1,2024-12-31\nA,x,1,2026-01-01\n" + "A,x,0,2025-06-01\n" * 40
    )
    columns = OrderColumns(customer="who", good="what", quantity="much", date="day")
    reading = OrderReading(first=dt.date(2025, 1, 1), last=dt.date(2025, 12, 31))
    found = rolled(tmp_path, text, columns, reading)
    assert found.demand == {("A", "x"): 1.0}
    assert found.skipped == {
        "outside the period": 2,
        "without a customer": 1,
        "without a date that can be read": 1,
        "without a good": 1,
        "without a quantity that can be read": 2,
    }
    assert found.lines == found.used.lines + sum(found.skipped.values())


@pytest.mark.parametrize(
    ("days", "first", "last", "yearly"),
    [
        (("2025-01-07", "2025-06-25"), "2025-01-01", "2025-06-30", 365 / 181),
        (("2025-01-08", "2025-06-23"), "2025-01-08", "2025-06-23", 365 / 167),
        (("2024-01-02", "2024-12-30"), "2024-01-01", "2024-12-31", 1.0),
        (("2025-01-02", "2025-12-30"), "2025-01-01", "2025-12-31", 1.0),
        (("2024-01-02", "2025-12-30"), "2024-01-01", "2025-12-31", 365 / 731),
    ],
)
def test_a_period_is_made_a_year(tmp_path: Path, days: tuple[str, str], first: str, last: str, yearly: float) -> None:
    """To whole months where they begin or end within a week of the lines; a leap year is a year."""
    found = rolled(tmp_path, f"who,much,day\nA,5,{days[0]}\nA,5,{days[1]}\n", PLAIN)
    assert (str(found.first), str(found.last)) == (first, last)
    assert found.yearly == pytest.approx(yearly)
    assert found.demand["A", ""] == pytest.approx(10 * yearly)


def test_a_period_may_be_asked_for(tmp_path: Path) -> None:
    """Both days are in it; months without a line are there with nothing."""
    text = "who,much,day\nA,1,2025-01-31\nA,2,2025-02-01\nA,4,2025-04-30\nA,8,2025-05-01\n"
    reading = OrderReading(first=dt.date(2025, 2, 1), last=dt.date(2025, 4, 30))
    found = rolled(tmp_path, text, PLAIN, reading)
    assert found.used.quantity == 6.0
    assert found.months == (("2025-02", 2.0), ("2025-03", 0.0), ("2025-04", 4.0))
    with pytest.raises(DataFileError, match=r"from 2026-01-01 to 2025-05-01 ends before it begins"):
        rolled(tmp_path, text, PLAIN, OrderReading(first=dt.date(2026, 1, 1)))


@pytest.mark.parametrize(
    ("numbers", "decimal", "total"),
    [
        (("1.5", "2"), "", 3.5),
        (("1,5", "2"), "", 3.5),
        (("1.234,5", "1"), "", 1235.5),
        (("1,234.5", "1"), "", 1235.5),
        (("1,234", "0.5"), "", 1234.5),
        (("1,234", "1"), ",", 2.234),
        (("1,234", "1"), ".", 1235.0),
        (("12 000", "1"), "", 12001.0),
    ],
)
def test_numbers_are_read_as_they_are_written(
    tmp_path: Path, numbers: tuple[str, str], decimal: str, total: float
) -> None:
    """Decimal comma or point, with thousands separators or without, told by all numbers together."""
    text = "who;much\n" + "".join(f'A;"{number}"\n' for number in numbers)
    found = rolled(tmp_path, text, OrderColumns(customer="who", quantity="much"), OrderReading(decimal=decimal))
    assert found.demand["A", ""] == pytest.approx(total)


@pytest.mark.parametrize(
    ("texts", "form", "day"),
    [
        (("2025-02-01", "2025-02-03"), "", "2025-02-01"),
        (("01.02.2025", "03.02.2025"), "", "2025-02-01"),
        (("01/02/2025", "13/02/2025"), "", "2025-02-01"),
        (("02/01/2025", "02/13/2025"), "", "2025-02-01"),
        (("01/02/2025", "03/02/2025"), "%d/%m/%Y", "2025-02-01"),
        (("20250201", "20250203"), "", "2025-02-01"),
        (("2025-02-01 10:30:00", "2025-02-03T11:00"), "", "2025-02-01"),
        (("1 Feb 2025", "3 Feb 2025"), "%d %b %Y", "2025-02-01"),
    ],
)
def test_dates_are_read_as_they_are_written(tmp_path: Path, texts: tuple[str, str], form: str, day: str) -> None:
    """The form that fits all, or the one that is said."""
    text = "who;much;day\n" + "".join(f"A;1;{held}\n" for held in texts)
    found = rolled(tmp_path, text, PLAIN, OrderReading(date_format=form))
    assert str(found.first) == day
    assert [month for month, _ in found.months] == ["2025-02"]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("who;much;day\nA;1,234;2025-01-01\n", r"'1,234' in column much can be read with a decimal point and with a"),
        ("who,much,day\nA,1,01/02/2025\n", r"'01/02/2025' in column day can be read as %d/%m/%Y and as %m/%d/%Y"),
        ("who,much,day\nA,1,soon\n", r"'soon' in column day is no date in a form that is known. .*--date-format"),
        ("who,many,day\nA,1,2025-01-01\n", r"there is no column 'much'; the columns are who, many, day"),
        ("who,much,day\nA,x,2025-01-01\n", r"no line can be used \(1 without a quantity that can be read\)"),
        ("who,much,day\n", r"orders.csv: "),
    ],
)
def test_what_is_doubtful_is_refused_with_its_repair(tmp_path: Path, text: str, message: str) -> None:
    """Nothing is guessed where two readings fit."""
    with pytest.raises(DataFileError, match=message):
        rolled(tmp_path, text, PLAIN)


def test_files_that_are_not_there_or_no_tables_are_refused(tmp_path: Path) -> None:
    """One sentence each, no traceback of another library."""
    with pytest.raises(DataFileError, match=r"no such file\. Give a CSV or Parquet file of order lines"):
        roll_up(tmp_path / "none.csv", PLAIN)
    (tmp_path / "bad.parquet").write_bytes(b"no parquet at all")
    with pytest.raises(DataFileError, match=r"bad\.parquet: cannot be read as order lines: "):
        roll_up(tmp_path / "bad.parquet", PLAIN)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
def test_names_survive_their_encoding(tmp_path: Path, encoding: str) -> None:
    """UTF-8 with and without a mark, UTF-16, and the Western one of old exports."""
    (tmp_path / "orders.csv").write_text("who;much\nGyőr\n".replace("Győr\n", "Krün;1,5\n"), encoding=encoding)
    found = roll_up(tmp_path / "orders.csv", OrderColumns(customer="who", quantity="much"))
    assert found.demand == {("Krün", ""): 1.5}


def test_several_files_are_one(tmp_path: Path) -> None:
    """A pattern stands for all files that fit it."""
    for month in ("01", "02"):
        (tmp_path / f"orders-{month}.csv").write_text(f"who,much,day\nA,1,2025-{month}-03\n", encoding="utf-8")
    found = roll_up(str(tmp_path / "orders-*.csv"), PLAIN)
    assert (found.lines, found.used.quantity) == (2, 2.0)


def test_hostile_names_of_columns_and_customers_are_only_names(tmp_path: Path) -> None:
    """Quotes and statements in them change nothing."""
    text = 'who"; drop table x,much\n"A\'; select 1",2\n'
    columns = OrderColumns(customer='who"; drop table x', quantity="much")
    (tmp_path / "it's.csv").write_text(text.replace('who"; drop table x', '"who""; drop table x"'), encoding="utf-8")
    assert roll_up(tmp_path / "it's.csv", columns).demand == {("A'; select 1", ""): 2.0}


def test_what_is_carried_along_becomes_columns_of_customers(tmp_path: Path) -> None:
    """The first in order where lines differ, with how many customers that is; coordinates become numbers."""
    text = 'who,much,town,land,lat,lon,zip\nA,1,Linz,AT,48.3,"14,28",4020\nA,2,Leonding,AT,48.3,x,4020\nB,5,,,,,\n'
    kept = {"place": "town", "country": "land", "latitude": "lat", "longitude": "lon", "postcode": "zip"}
    columns = OrderColumns(customer="who", quantity="much", kept=kept)
    found = rolled(tmp_path, text, columns)
    assert found.differing == {"place": 1, "longitude": 1}
    study = study_of_orders(found, columns, currency="EUR", unit="t")
    first, second = study.customers
    assert (first.place, first.country, first.latitude, first.longitude) == ("Leonding", "AT", 48.3, 14.28)
    assert (first.demand, first.attributes) == (3.0, {"postcode": "4020"})
    assert (second.place, second.latitude, second.demand, second.attributes) == ("", None, 5.0, {})
    assert (len(study.demands), len(study.goods)) == (0, 0)


def test_progress_is_told(tmp_path: Path) -> None:
    """Start and end once each, whatever happens between."""
    heard: list[str] = []

    class Ear:
        def start(self, task: str) -> None:
            heard.append(task)

        def update(self, progress: Progress) -> None:
            assert progress.elapsed_s >= 0

        def end(self, progress: Progress) -> None:
            assert progress.elapsed_s > 0
            heard.append("end")

    (tmp_path / "orders.csv").write_text("who,much\nA,1\n", encoding="utf-8")
    roll_up(tmp_path / "orders.csv", OrderColumns(customer="who", quantity="much"), listener=Ear())
    assert heard == ["adding up orders.csv", "end"]
