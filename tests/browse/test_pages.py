"""The logic of each page, run without a browser: what is said, kept, refused and offered in each state."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from siting.browse import jobs, shell
from siting.browse.drafts import Draft, keep_draft
from siting.browse.jobs import JobState, start_job, stop_job
from siting.browse.serve import STUDY_VARIABLE
from siting.study.read import read_raw
from tests.browse.conftest import ended, view_of, wait_until
from tests.browse.studies import HOSTILE, hostile_folder, tiny_folder

if TYPE_CHECKING:
    from streamlit.testing.v1 import AppTest

    from siting.study.raw import RawStudy
    from siting.study.tables import Study

APP = Path(shell.__file__).parent / "app.py"
TIMEOUT_S = 60


@pytest.fixture
def app(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> AppTest:
    """Open the pages on the tiny study."""
    monkeypatch.setenv(STUDY_VARIABLE, str(tiny_folder(tmp_path / "tiny")))
    return opened()


def opened(draft: Draft | None = None) -> AppTest:
    """Open the pages, at the address of a draft where there is one."""
    from streamlit.testing.v1 import AppTest  # noqa: PLC0415 - costs a second

    app = AppTest.from_file(str(APP), default_timeout=TIMEOUT_S)
    if draft is not None:
        app.query_params[shell.DRAFT] = draft.token
    return checked(app.run())


def checked(app: AppTest) -> AppTest:
    """Return the pages, which must not have failed."""
    assert not app.exception, app.exception
    return app


def on(app: AppTest, page: str) -> AppTest:
    """Go to a page."""
    return checked(app.switch_page(str(shell.pages_folder() / f"{page}.py")).run())


def said(app: AppTest) -> str:
    """Return all that the page says in our own words: headlines, sections, notices, tables."""
    return "\n".join(str(part.proto.body) for part in app.get("html"))


def draft_of(app: AppTest) -> Draft:
    """Return the draft of a session."""
    draft: Draft = app.session_state[shell.DRAFT]
    return draft


def edit(app: AppTest, cells: dict[int, dict[str, str]], *, added: list[dict[str, str]] | None = None) -> AppTest:
    """Change cells of the table in view, by position and column, and add rows."""
    key = f"edit-{app.session_state['edit_number']}"
    app.session_state[key] = {"edited_rows": cells, "added_rows": added or [], "deleted_rows": []}
    return checked(app.run())


def press(app: AppTest, label: str) -> AppTest:
    """Press a button."""
    [button] = [button for button in app.button if button.label == label]
    return checked(button.click().run())


def choose(app: AppTest, table: str) -> AppTest:
    """Bring a table into view."""
    return checked(app.button_group(key="chosen_table").set_value(table).run())


def test_inputs_open_with_what_the_study_holds(app: AppTest) -> None:
    """The headline counts, the second line says where it comes from and that nothing is wrong."""
    assert "Tiny: 2 sites (1 running), 2 suppliers (1 signed), 4 customers, 1 good; 100 t a year to serve" in said(app)
    assert "tiny. No fault, no warning." in said(app)


def test_a_fault_is_named_beside_its_table_and_mended(app: AppTest) -> None:
    """Row, column, value and repair are there after the edit, the chooser counts; mended, they are gone."""
    app = edit(choose(app, "customers"), {1: {"demand": "abc"}})
    assert "row 3, demand &#x27;abc&#x27;: not a number" in said(app)
    assert "To mend before a plan can be made: 1 fault in customers" in said(app)
    assert "customers: 1 fault" in [option.content for option in app.button_group(key="chosen_table").proto.options]
    app = edit(app, {1: {"demand": "20"}})
    assert "No fault in customers." in said(app)


def test_edits_outlive_tables_pages_and_reloads(app: AppTest) -> None:
    """What was typed is there after another table, another page and a reload, fault or not."""
    app = edit(choose(app, "customers"), {1: {"demand": "abc"}})
    app = on(on(choose(app, "sites"), "plan"), "inputs")
    again = opened(draft_of(app))
    for session in (app, again):
        frame = choose(session, "customers").dataframe[0].value
        assert frame.loc[1, "demand"] == "abc"


def test_an_added_row_counts(app: AppTest) -> None:
    """A row added in the editor is a customer."""
    edit(
        choose(app, "customers"),
        {},
        added=[{"customer": "Linz", "latitude": "48.3", "longitude": "14.3", "demand": "5"}],
    )
    study = draft_of(app).checked.study
    assert study is not None
    assert [row.customer for row in study.customers][-1] == "Linz"


def test_another_tab_loses_nothing(app: AppTest) -> None:
    """Two tabs on one address: an edit in one is not undone by the other, which shows it when it is next used."""
    app = choose(app, "customers")
    other = choose(opened(draft_of(app)), "customers")
    edit(app, {0: {"demand": "41"}})
    checked(other.run())
    assert draft_of(app).table("customers").loc[0, "demand"] == "41"
    assert other.dataframe[0].value.loc[0, "demand"] == "41"
    edit(other, {1: {"demand": "21"}})
    assert draft_of(app).table("customers")["demand"].tolist()[:2] == ["41", "21"]


def test_an_edit_on_an_outdated_table_is_refused_aloud(app: AppTest) -> None:
    """Where both edit before either is shown the other's, the second is told to type again; the first one holds."""
    app = choose(app, "customers")
    other = choose(opened(draft_of(app)), "customers")
    edit(app, {0: {"demand": "41"}})
    edit(other, {1: {"demand": "21"}})
    assert "what you just typed was not taken. Type it again." in said(other)
    assert draft_of(app).table("customers")["demand"].tolist()[:2] == ["41", "20"]


def test_two_sessions_never_see_each_other(app: AppTest) -> None:
    """A second session at the bare address has tables of its own, whatever the first types."""
    edit(app, {0: {"site": "Only mine"}})
    other = opened()
    assert draft_of(other) is not draft_of(app)
    assert "Only mine" not in str([table.value for table in other.dataframe])
    assert "Only mine" not in said(on(other, "plan"))


def test_an_address_whose_draft_is_gone_says_so(app: AppTest) -> None:
    """An old address opens the study afresh and says that what was typed there is gone."""
    from streamlit.testing.v1 import AppTest  # noqa: PLC0415 - costs a second

    late = AppTest.from_file(str(APP), default_timeout=TIMEOUT_S)
    late.query_params[shell.DRAFT] = "gone"
    assert "The study was opened afresh" in said(checked(late.run()))
    assert "The study was opened afresh" not in said(app)


def test_empty_tables_say_what_to_do(app: AppTest) -> None:
    """A new study says what to fill in, and the study before can be gone back to."""
    before = draft_of(app)
    app = press(app, "Start with empty tables")
    assert "Empty tables: fill in sites or suppliers, then customers and settings" in said(app)
    assert draft_of(app).setting_text("currency") == "EUR"
    app = press(app, "Back to the study before")
    assert draft_of(app) is before


def test_settings_are_edited_like_tables(app: AppTest) -> None:
    """A setting typed in the list is taken; one that is wrong is a fault beside it."""
    app = choose(app, "settings")
    names = app.dataframe[0].value["setting"].tolist()
    app = edit(app, {names.index("life_years"): {"value": "no"}, names.index("title"): {"value": "Renamed"}})
    assert draft_of(app).setting_text("title") == "Renamed"
    assert "1 fault in settings" in said(app)


def test_no_plan_with_faults(app: AppTest) -> None:
    """The Plan page sends the reader to Inputs."""
    app = on(edit(app, {0: {"capacity": "x"}}), "plan")
    assert "No plan while the tables have faults" in said(app)
    assert not [button for button in app.button if button.label == "Run"]


def test_before_the_first_run(app: AppTest) -> None:
    """The Plan page says to press Run, the Share page offers the tables alone."""
    app = on(app, "plan")
    assert "No plan yet: press Run" in said(app)
    app = on(app, "share")
    assert "Nothing to share yet: there is no plan" in said(app)
    assert [button.label for button in app.download_button] == [
        "The study as a workbook",
        "The tables as typed, zipped",
    ]


def solved(app: AppTest) -> AppTest:
    """Run the search to its end and show its answer."""
    app = press(on(app, "plan"), "Run")
    ended(draft_of(app).asked)
    return checked(app.run())


def test_the_answer_comes_first(app: AppTest) -> None:
    """After Run the headline says verdicts, cost and proof; every section is there; all can be taken along."""
    app = solved(app)
    text = said(app)
    assert text.index("EUR a year") < text.index("Verdicts one by one")
    for title in (
        "What it costs",
        "How far customers are",
        "Customer by customer",
        "How sure is this?",
        "Before anyone",
    ):
        assert title in text
    labels = [button.label for button in on(app, "share").download_button]
    assert labels[:4] == ["The map", "The plan, whole", "plan.json", "The study as a workbook"]
    assert {"site_verdicts.csv", "flows.csv", "customers.csv", "cost_lines.csv"} <= set(labels)


def test_a_plan_gone_stale_says_so(app: AppTest) -> None:
    """After an edit the old answer stays in sight, marked out of date on both pages; the edit undone, it is current."""
    app = solved(app)
    app = on(edit(on(app, "inputs"), {0: {"yearly_charge": "1001"}}), "plan")
    assert "Changed since the plan below: press Run" in said(app)
    assert "Out of date: this answers the tables" in said(app)
    assert "Out of date: the tables have changed since" in said(on(app, "share"))
    app = on(edit(on(app, "inputs"), {0: {"yearly_charge": "1000"}}), "plan")
    assert "Out of date" not in said(app)
    assert "How sure is this?" in said(app)


def test_while_it_runs(long_study: Study, app: AppTest) -> None:
    """Run gives way to Stop; a second session at the same address sees the search; Stop keeps the plan."""
    draft = draft_of(app)
    draft.raw = read_raw_of(long_study)
    draft.version += 1
    app = press(on(app, "plan"), "Run")
    key = draft.asked
    assert view_of(key).running
    tab = on(opened(draft), "plan")
    for session in (app, tab):
        assert "Searching: " in said(session)
        assert not [button for button in session.button if button.label == "Run"]
    wait_until(lambda: view_of(key).progress.cost is not None)
    press(tab, "Stop and keep the best plan")
    assert ended(key).state is JobState.DONE
    assert "not proved" in said(checked(app.run()))


def read_raw_of(study: Study) -> RawStudy:
    """Return a study as it is read from files."""
    import tempfile  # noqa: PLC0415 - one test needs it

    from siting.study.write import write_study  # noqa: PLC0415

    with tempfile.TemporaryDirectory() as folder:
        write_study(study, Path(folder) / "study")
        return read_raw(Path(folder) / "study")


def test_an_edit_while_it_runs(long_study: Study, app: AppTest) -> None:
    """The search on the old tables is shown as such and can be stopped; Run on the new ones ends it."""
    draft = draft_of(app)
    draft.raw = read_raw_of(long_study)
    draft.version += 1
    app = press(on(app, "plan"), "Run")
    first = draft.asked
    draft.put_setting("outbound_rate", "0.06")
    app = on(on(app, "inputs"), "plan")
    assert "A search on the tables as they were before your last edits is still running." in said(app)
    app = press(app, "Run")
    assert draft.asked != first
    assert view_of(first).state is not JobState.RUNNING
    stop_job(draft.asked)


def test_a_failed_search_says_why(app: AppTest, monkeypatch: pytest.MonkeyPatch) -> None:
    """The reason is shown, nothing typed is lost, and Run is there again."""
    monkeypatch.setattr("sys.executable", "/nowhere/python")
    app = solved(app)
    assert "The search failed; nothing you typed is lost" in said(app)
    assert "The search could not be started." in said(app)
    assert [button for button in app.button if button.label == "Run"]


def test_an_impossible_study_says_what_would_repair_it(app: AppTest) -> None:
    """Demand beyond all capacity: the repair stands in the headline or below it, and what to do next."""
    app = solved(edit(choose(app, "customers"), {0: {"demand": "1000000"}, 1: {"reach_km": "1"}}))
    text = said(app)
    assert "mpossible" in text or "No plan can meet everything that is asked" in text
    assert "Change it on the page Inputs, then press Run here." in text
    assert "Nothing to share yet" in said(on(app, "share"))


def test_how_hard_to_search_is_part_of_the_study(app: AppTest) -> None:
    """A gap typed on the Plan page is in the settings, and a fault there is told like any other."""
    app = on(app, "plan")
    [gap] = [field for field in app.text_input if field.label.startswith("gap")]
    checked(gap.set_value("0.05").run())
    study = draft_of(app).checked.study
    assert study is not None
    assert study.settings.solve.gap == 0.05
    [gap] = [field for field in app.text_input if field.label.startswith("gap")]
    checked(gap.set_value("wide").run())
    assert "No plan while the tables have faults" in said(app)


def test_hostile_names_are_text_everywhere(tmp_path: Path) -> None:
    """No element of our own markup comes from a name, on any page, in any state."""
    app = opened(keep_draft(read_raw(hostile_folder(tmp_path / "hostile")), HOSTILE[0]))
    texts = [said(app), said(solved(app)), said(on(app, "share"))]
    for text in texts:
        assert "<script" not in text
        assert "onerror=" not in text.replace("onerror=&quot;", "")
        assert "<img src=x" not in text
    assert "&lt;script&gt;window.ran=1&lt;/script&gt;" in texts[0]
    shown = choose(on(app, "inputs"), "customers").dataframe[0].value["customer"].tolist()
    assert "{{ 7*7 }} 5" in shown


def test_jobs_are_shared_by_content_alone(tiny: Study) -> None:
    """A job is found by who has the same tables, and by no one else."""
    job = ended(start_job(tiny).key)
    assert jobs.find_job(job.key) is not None
    assert jobs.find_job(job.key[:-1]) is None
