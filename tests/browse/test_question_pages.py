"""The logic of the pages of the follow-up questions, run without a browser: each in all its states."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import pytest

from siting.browse import jobs
from siting.browse.drafts import keep_draft
from siting.browse.jobs import JobState, start_job, stop_job
from siting.browse.pins import FREE, IN, OUT, pins_of, put_pins
from siting.browse.remembered import remember_zip
from siting.browse.serve import STUDY_VARIABLE
from siting.browse.tasks import result_of
from siting.errors import PlanFileError
from siting.questions.closing import closing
from siting.questions.counts import counts
from siting.questions.shortlist import shortlist
from siting.solving.solve import solve
from siting.study.read import read_raw, read_study
from tests.browse.conftest import ended, view_of, wait_until
from tests.browse.studies import HOSTILE, hostile_folder, tiny_folder, towns_folder
from tests.browse.test_pages import checked, draft_of, on, opened, press, said, solved

if TYPE_CHECKING:
    from pathlib import Path

    from streamlit.testing.v1 import AppTest

    from siting.study.raw import RawStudy
    from siting.study.tables import Study

ASKS = {"close_a_site": ("closing", "Test each"), "shortlist": ("shortlist", "Make the shortlist"),
        "how_many": ("counts", "Try each number")}  # fmt: skip


@pytest.fixture
def towns(tmp_path: Path) -> Study:
    """Read the study of a few towns."""
    return read_study(towns_folder(tmp_path / "towns too"))


@pytest.fixture
def planned(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> AppTest:
    """Open the pages on the study of a few towns and plan it."""
    monkeypatch.setenv(STUDY_VARIABLE, str(towns_folder(tmp_path / "towns")))
    return solved(opened())


def asked(app: AppTest, page: str) -> AppTest:
    """Ask the question of a page and show its answer."""
    question, button = ASKS[page]
    app = press(on(app, page), button)
    job = ended(draft_of(app).questions[question])
    assert job.state is JobState.DONE, job.error
    return checked(app.run())


@pytest.mark.parametrize("page", ASKS)
def test_a_question_without_a_plan_leads_to_the_plan(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, page: str
) -> None:
    """The page says that the plan comes first, offers nothing to ask, and its button goes to the page Plan."""
    monkeypatch.setenv(STUDY_VARIABLE, str(tiny_folder(tmp_path / "tiny")))
    app = on(opened(), page)
    assert "Plan first: this question is about the plan" in said(app)
    assert [button.label for button in app.button] == ["Go to Plan"]
    assert "No plan yet: press Run" in said(press(app, "Go to Plan"))


def test_closing_puts_both_answers_first(planned: AppTest, towns: Study) -> None:
    """The headline names the cheapest with both costs, as the question itself gives them; then ranking, maps, lines."""
    app = on(planned, "close_a_site")
    assert "Not asked yet: press Test each" in said(app)
    app = asked(app, "close_a_site")
    text = said(app)
    test = closing(towns, solve(towns))
    site = next(line for line in test.lines if line.kind == "site" and line.replan and line.replan.extra_cost)
    assert f"Cheapest to close: {site.name}, " in text
    assert "if everything is re-planned" in text
    assert text.index("Cheapest to close") < text.index("Others take over: more, EUR a year") < text.index("One at a")
    assert "Before and after" in text
    assert next(option.content for option in app.button_group[0].proto.options) == "The plan"


def test_each_of_the_closing_test_can_be_looked_at(planned: AppTest) -> None:
    """Every site and supplier tested can be chosen, and each shows what it costs or why it cannot be."""
    app = asked(planned, "close_a_site")
    [chooser] = app.selectbox
    assert set(chooser.options) == {"Graz", "Regensburg", "Deggendorf", "Szombathely"}
    for name in chooser.options:
        [chooser] = app.selectbox
        app = checked(chooser.select(name).run())
        text = said(app)
        assert "Extra cost" in text or "impossible" in text


def test_an_answer_is_found_again_and_goes_stale(planned: AppTest) -> None:
    """Coming back computes nothing; after an edit the answer is shown as out of date; undone, it is current."""
    app = asked(planned, "close_a_site")
    number = view_of(draft_of(app).questions["closing"]).number
    app = on(on(app, "inputs"), "close_a_site")
    assert "Cheapest to close" in said(app)
    assert view_of(draft_of(app).questions["closing"]).number == number
    draft_of(app).put_setting("outbound_rate", "0.21")
    app = checked(app.run())
    assert "Plan first: this question is about the plan" in said(app)
    assert "Out of date: this answers the tables and settings as they were before" in said(app)
    draft_of(app).put_setting("outbound_rate", "0.2")
    app = checked(app.run())
    assert "Out of date" not in said(app)
    assert "Cheapest to close" in said(app)


def test_counts_say_the_best_number_and_what_was_not_tried(planned: AppTest) -> None:
    """The headline counts, the table has a row for each number, and the curve is drawn."""
    app = asked(planned, "how_many")
    text = said(app)
    assert "best, at " in text
    assert "Where the money goes" in text
    assert len(app.get("vega_lite_chart")) >= 3


def test_a_shortlist_explains_its_words_and_pins(planned: AppTest) -> None:
    """Each word has its rule; a tick writes the ruling, and nothing else, into the table; the plan is re-made."""
    app = asked(planned, "shortlist")
    text = said(app)
    for word in ("irreplaceable", "robust", "replaceable", "stand-in", "never"):
        assert word in text
    draft = draft_of(app)
    before = draft.table("sites").drop(columns="ruling")
    frame = app.dataframe[0].value
    row = frame["name"].tolist().index("Graz")
    key = f"pins-{draft.token}-{draft.version}-0.005"
    app.session_state[key] = {"edited_rows": {row: {"pin out": True, "pin in": False}}, "added_rows": [],
                              "deleted_rows": []}  # fmt: skip
    app = press(checked(app.run()), "Pin these and plan again")
    assert draft.table("sites")["ruling"].tolist() == ["", "", "pinned-shut", "", ""]
    assert draft.table("sites").drop(columns="ruling").equals(before)
    assert draft.asked == draft.key
    ended(draft.asked)
    assert "EUR a year" in said(checked(app.run()))


def test_pins_in_and_out_at_once_are_refused(planned: AppTest) -> None:
    """Both ticks on one name: it is named, and the button waits."""
    app = asked(planned, "shortlist")
    draft = draft_of(app)
    name = app.dataframe[0].value["name"][0]
    key = f"pins-{draft.token}-{draft.version}-0.005"
    app.session_state[key] = {"edited_rows": {0: {"pin out": True, "pin in": True}}, "added_rows": [],
                              "deleted_rows": []}  # fmt: skip
    app = checked(app.run())
    assert f"Pinned in and out at once: {name}." in said(app)
    [button] = [button for button in app.button if button.label == "Pin these and plan again"]
    assert button.disabled


def test_another_percentage_is_another_question(planned: AppTest) -> None:
    """A moved slider asks again; what was answered before stays in sight, said to be asked otherwise."""
    app = asked(planned, "shortlist")
    [slider] = app.select_slider
    app = checked(slider.set_value(5.0).run())
    assert "Not asked yet: press Make the shortlist" in said(app)
    assert "Out of date: this was asked otherwise" in said(app)


def test_plans_are_remembered_named_and_compared(planned: AppTest) -> None:
    """One plan is not enough; two are set side by side under names the analyst gives; two of one name are refused."""
    app = on(planned, "compare")
    assert "Two plans are needed to compare: there is one plan so far" in said(app)
    draft = draft_of(app)
    put_pins(draft, {("site", "Graz"): OUT})
    app = on(solved(app), "compare")
    assert [each.name for each in draft.plans] == ["Plan 1", "Plan 2"]
    text = said(app)
    assert "Plan 1" in text
    assert text.index("Verdicts that differ") < text.index("Cost lines side by side")
    again = on(solved(app), "compare")
    assert [each.name for each in draft_of(again).plans] == ["Plan 1", "Plan 2"]
    key = f"plans-{draft.token}-2-0"
    app.session_state[key] = {"edited_rows": {1: {"name": "Without Graz"}}, "added_rows": [], "deleted_rows": []}
    app = checked(app.run())
    assert [each.name for each in draft.plans] == ["Plan 1", "Without Graz"]
    app.session_state[key] = {"edited_rows": {1: {"name": "Plan 1"}}, "added_rows": [], "deleted_rows": []}
    app = checked(app.run())
    assert "Two plans cannot bear the same name" in said(app)
    assert [each.name for each in draft.plans] == ["Plan 1", "Without Graz"]


def test_a_plan_from_a_file_joins_the_others(planned: AppTest) -> None:
    """A plan.zip of the Share page is remembered under its file's name; anything else is refused with its repair."""
    from siting.browse.kept import kept_answer  # noqa: PLC0415 - two tests need these
    from siting.browse.parcels import plan_zip  # noqa: PLC0415

    draft = draft_of(planned)
    parcel = plan_zip(kept_answer(view_of(draft.asked)))
    assert remember_zip(draft, "Last year.zip", parcel).name == "Last year"
    assert remember_zip(draft, "Last year.zip", parcel).name == "Last year 2"
    with pytest.raises(PlanFileError, match=r"the file is no zip file. Choose the plan\.zip"):
        remember_zip(draft, "x.zip", b"not a zip")


def test_hostile_names_are_text_on_every_question_page(tmp_path: Path) -> None:
    """No element of our own markup comes from a name, on any page, asked or compared."""
    app = solved(opened(keep_draft(read_raw(hostile_folder(tmp_path / "hostile")), HOSTILE[0])))
    texts = [said(asked(app, page)) for page in ASKS]
    draft = draft_of(app)
    draft.put_setting("outbound_rate", "0.6")
    texts.append(said(on(solved(app), "compare")))
    for text in texts:
        assert "<script" not in text
        assert "<img src=x" not in text
        assert "onerror=" not in text.replace("onerror=&quot;", "")
    assert "&lt;script&gt;window.ran=1&lt;/script&gt;" in texts[0] + texts[1]


@pytest.fixture(autouse=True)
def _no_search_kept() -> None:
    """Begin each test without kept searches."""
    jobs._searches.clear()  # noqa: SLF001 - tests alone need to forget


def test_pins_leave_every_other_cell(raw: RawStudy) -> None:
    """A pin that is there already changes nothing; a new one changes one cell; pins are read back."""
    draft = keep_draft(raw, "tiny")
    assert not put_pins(draft, pins_of(draft))
    assert draft.version == 0
    before = draft.table("suppliers")
    assert put_pins(draft, {("supplier", "Szombathely"): IN})
    after = draft.table("suppliers")
    assert (before != after).sum().sum() == 1
    assert pins_of(draft)["supplier", "Szombathely"] == IN
    assert put_pins(draft, {("supplier", "Szombathely"): FREE})
    assert draft.table("suppliers").equals(before)


def test_results_travel_between_processes_without_loss(towns: Study) -> None:
    """What a job hands back is what the question returns when asked here, but for the seconds."""
    plan = ended(start_job(towns).key)
    answer = solve(towns)
    here = {
        "closing": closing(towns, answer),
        "counts": counts(towns, answer),
        "shortlist": shortlist(towns, answer, within=0.05, most=4),
    }
    for question, found in here.items():
        parameters = {"within": 0.05, "most": 4} if question == "shortlist" else {}
        job = ended(start_job(towns, question, parameters, plan=plan.answer).key)
        there = result_of(question, job.answer)
        assert type(there) is type(found)
        assert _numbers(there) == _numbers(found)


def _numbers(found: Any) -> list[object]:  # noqa: ANN401 - a result of any question
    """Return what a result says, without the seconds it took."""
    if hasattr(found, "near"):
        return [(line.name, line.firmness, line.used_in, line.headroom.yearly) for line in found.lines]
    if hasattr(found, "not_asked"):
        return [(line.count, line.cost, line.fixed, line.open_sites) for line in found.lines]
    return [
        (line.name, each.extra_cost, each.changes, each.shifts, each.cost_lines, each.why)
        for line in found.lines
        for each in (line.reroute, line.replan)
    ]


def test_searches_are_shared_between_questions(towns: Study) -> None:
    """What the closing test searched is handed to the next question on the same study, and kept once."""
    plan = ended(start_job(towns).key).answer
    ended(start_job(towns, "closing", plan=plan).key)
    [kept] = [held for held in jobs._searches.values() if held]  # noqa: SLF001 - what is kept has no other way out
    count = len(kept)
    assert count >= 3
    first = ended(start_job(towns, "closing", plan=plan).key)
    assert first.state is JobState.DONE
    assert len(kept) == count


def test_stop_keeps_what_is_done(long_study: Study) -> None:
    """A question stopped in mid-search hands over a result that says what was not asked."""
    first = start_job(long_study)
    wait_until(lambda: view_of(first.key).progress.cost is not None)
    stop_job(first.key)
    plan = ended(first.key).answer
    job = start_job(long_study, "closing", plan=plan)
    wait_until(lambda: view_of(job.key).progress.phase != "")
    stop_job(job.key)
    done = ended(job.key)
    assert done.state is JobState.DONE, done.error
    assert not result_of("closing", done.answer).complete


@pytest.mark.parametrize("question", ["nobody", "Closing"])
def test_an_unknown_question_is_refused(tiny: Study, question: str) -> None:
    """A question no page asks ends in a failure that names it."""
    job = ended(start_job(tiny, question).key)
    assert job.state is JobState.FAILED
    assert f"no job asks '{question}'" in job.error
