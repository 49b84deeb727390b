"""The work list as a page shows it."""

from __future__ import annotations

from siting.browse.work_view import MOST_SHOWN, work_list_html
from siting.study.work_list import work_list
from tests.builders import TINY, check_tables, with_cells


def test_each_table_is_a_group_and_the_first_is_open() -> None:
    """Title with counts, then each item with its place; a fault looks other than a warning."""
    tables = with_cells(TINY, "customers", {3: {"demand": "x"}})
    groups = work_list(check_tables(with_cells(tables, "sites", {2: {"capacity": ""}})))
    shown = work_list_html(groups)
    assert shown.startswith(
        '<details class="work" open><summary>customers: 1 fault</summary><p class="notice fault"><b>row 3, demand, '
        "&#x27;x&#x27;</b> Not a number. Write a number such as 1250 or 1250.5.</p></details>"
    )
    assert '<details class="work"><summary>sites: 1 warning</summary><p class="notice stale"><b>row 2, capac' in shown
    assert work_list_html(groups, opened="sites").startswith('<details class="work"><summary>customers')


def test_what_the_analyst_typed_is_never_run() -> None:
    """Names and values are shown as text."""
    groups = work_list(check_tables(with_cells(TINY, "customers", {3: {"demand": "<script>x</script>"}})))
    assert "<script>" not in work_list_html(groups)
    assert "&lt;script&gt;" in work_list_html(groups)


def test_long_groups_are_cut_and_counted() -> None:
    """Just as many as are shown have no line below; one more has."""
    for count, more in ((MOST_SHOWN, False), (MOST_SHOWN + 1, True)):
        rows = [f"C{n},48,16,x" for n in range(count)]
        text = "\n".join(["customer,latitude,longitude,demand", *rows])
        shown = work_list_html(work_list(check_tables({**TINY, "customers": text})))
        assert shown.count("notice fault") == MOST_SHOWN
        assert ("And 1 more." in shown) is more
    assert work_list_html(()) == ""
