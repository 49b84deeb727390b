"""Order lines to demand on the Inputs page: added up, shown with what was left out, put into the tables."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.browse.drafts import Draft, keep_draft
from siting.browse.filling import missing_customers, put_demand
from siting.browse.serve import STUDY_VARIABLE
from siting.study.order_study import study_of_orders
from siting.study.orders import OrderColumns, columns_of, roll_up
from siting.study.read import read_raw
from tests.browse.studies import HOSTILE, tiny_folder
from tests.browse.test_pages import checked, draft_of, opened, press, said
from tests.builders import TINY, TINY_SETTINGS, write_folder

if TYPE_CHECKING:
    from pathlib import Path

    from streamlit.testing.v1 import AppTest

LINES = """\
Kunde;Menge;Datum;Artikel;Ort
Vienna;1.000,5;02.01.2025;pots;Wien
Vienna;-100;15.06.2025;pots;Wien
Graz;500;30.12.2025;soil;Graz
Maribor;250;10.10.2025;soil;Maribor
;70;10.10.2025;soil;
"""


def by_customer(draft: Draft, table: str = "customers") -> dict[str, str]:
    """Return demand as typed by customer, and by good where the table has goods."""
    rows = draft.table(table).to_dict("records")
    return {"/".join(str(row[key]) for key in ("customer", "good") if key in row): row["demand"] for row in rows}


@pytest.fixture
def app(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> AppTest:
    """Open the pages on the tiny study."""
    monkeypatch.setenv(STUDY_VARIABLE, str(tiny_folder(tmp_path / "tiny")))
    return opened()


def uploaded(app: AppTest, text: str, name: str = "orders 2025.csv") -> AppTest:
    """Give the page a file of order lines."""
    [uploader] = [part for part in app.file_uploader if part.label == "File of order lines"]
    return checked(uploader.set_value((name, text.encode(), "text/csv")).run())


def select(app: AppTest, label: str, value: object) -> AppTest:
    """Choose in a list of the form."""
    [box] = [box for box in app.selectbox if box.label == label]
    box.set_value(value)
    return app


def test_order_lines_become_demand(app: AppTest) -> None:
    """Columns are recognised by name; returns, lines left out and months are told; the button fills the tables."""
    app = uploaded(app, LINES)
    chosen = {box.label: box.value for box in app.selectbox}
    assert (chosen["Customer"], chosen["Quantity"]) == ("Kunde", "Menge")
    [factor] = [field for field in app.text_input if field.label.startswith("Units of the study")]
    factor.set_value("0,001")
    app = press(select(app, "Good", 0), "Add up")
    text = said(app)
    assert "5 lines, 4 of them added up: 1.6505 t a year for 3 customers." in text
    assert "Left out: 1 line without a customer." in text
    assert "Returns: 1 negative line, 0.1 t, taken off." in text
    assert "3 customers in the lines, 1 of them not in the table yet." in text
    [season] = [table.value for table in app.dataframe if "of an average month" in table.value]
    assert len(season) == 12
    assert season["quantity"].sum() == pytest.approx(1.6505)
    app = press(app, "Put this demand into the tables")
    demand = by_customer(draft_of(app))
    assert demand == {"Vienna": "0.9005", "Munich": "20", "Prague": "30", "Graz": "0.5", "Maribor": "0.25"}
    assert draft_of(app).table("customers")["place"].tolist() == ["Wien", "", "", "Graz", "Maribor"]
    assert not [button for button in app.button if button.label == "Put this demand into the tables"]


def test_goods_fill_demands_and_customers_without_lines_can_go(app: AppTest) -> None:
    """With a good chosen, demand is by good, and the customers that no line names are taken out when that is ticked."""
    app = press(uploaded(app, LINES), "Add up")
    [box] = [box for box in app.checkbox if box.label == "Take out 2 customers of the table that no line names"]
    app = press(checked(box.check().run()), "Put this demand into the tables")
    draft = draft_of(app)
    assert by_customer(draft) == {"Vienna": "", "Graz": "", "Maribor": ""}
    assert by_customer(draft, "demands") == {"Graz/soil": "500", "Maribor/soil": "250", "Vienna/pots": "900.5"}
    assert draft.table("goods")["good"].tolist() == ["pots", "soil"]


@pytest.mark.parametrize(
    ("label", "value", "told"),
    [("Units of the study in one of the file", "0", "not a factor above 0"), ("", "", "can be read with a decimal")],
)
def test_what_is_not_clear_is_refused_in_place(app: AppTest, label: str, value: str, told: str) -> None:
    """A factor that is none, and numbers that can be read in two ways, are told under the name of the file."""
    app = uploaded(app, "who;Menge;customer\nA;1,234;A\n")
    for field in app.text_input:
        if field.label == label:
            field.set_value(value)
    app = press(app, "Add up")
    assert told in said(app)
    assert "siting-upload-" not in said(app)
    assert not [button for button in app.button if button.label == "Put this demand into the tables"]


def test_a_file_that_is_none_is_told(app: AppTest) -> None:
    """Bytes that are no Parquet are refused in a sentence."""
    app = uploaded(app, "PAR0", "orders.parquet")
    assert "orders.parquet: cannot be read as order lines" in said(app)
    assert not [button for button in app.button if button.label == "Add up"]


def test_names_in_order_lines_are_text(app: AppTest) -> None:
    """Hostile names of columns and customers are no markup, before and after they are added up."""
    lines = "\n".join(f"'{name}',5,x" for name in HOSTILE if "," not in name and '"' not in name)
    app = press(uploaded(app, f"customer,quantity,{HOSTILE[0]}\n{lines}\n"), "Add up")
    app = press(app, "Put this demand into the tables")
    assert "<script" not in said(app)
    assert "onerror=" not in said(app).replace("onerror=&quot;", "")


def test_demand_is_written_as_its_column_is(tmp_path: Path) -> None:
    """In a table of decimal commas the demand of some customers is read like that of the others."""
    customers = "\n".join(line.replace(",", ";").replace(".", ",") for line in TINY["customers"].splitlines())
    customers = customers.replace(";30;", ";30,75;")
    folder = write_folder(tmp_path / "comma", {**TINY, "customers": customers}, TINY_SETTINGS)
    draft = keep_draft(read_raw(folder), "comma")
    (tmp_path / "orders.csv").write_text("customer,quantity\nVienna,12.345\nGraz,1500.25\n")
    columns = OrderColumns(customer="customer", quantity="quantity")
    made = study_of_orders(roll_up(tmp_path / "orders.csv", columns), columns)
    assert missing_customers(draft, made) == (0, 2)
    assert put_demand(draft, made, alone=False)
    assert [row.demand for row in draft.checked.sound().customers] == [12.345, 20.0, 30.75, 1500.25]
    assert not put_demand(draft, made, alone=False)


def test_columns_of_a_file(tmp_path: Path) -> None:
    """The columns are told before anything is added up."""
    (tmp_path / "orders.csv").write_text(LINES)
    assert columns_of(tmp_path / "orders.csv") == ("Kunde", "Menge", "Datum", "Artikel", "Ort")
