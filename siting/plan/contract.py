"""
The JSON that other programs read: `siting plan --json`, plan.json and `siting check --json`.

`plan.schema.json` and `check.schema.json` beside this file state their form (JSON Schema 2020-12). Money is unrounded.
"""

from __future__ import annotations

import json
from importlib.resources import files
from typing import TYPE_CHECKING, Any

from siting.errors import PlanFileError
from siting.plan.codec import decode, encode
from siting.plan.plan import Answer, CostLine, SiteVerdict, SupplierVerdict

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.errors import Fault
    from siting.plan.audit import AuditReport
    from siting.plan.plan import Plan

FORMAT_VERSION = 1
"""Raised when a key changes its meaning or goes away; new keys do not raise it."""

DETAIL = "detail"
"""Key of plan.json that holds the whole answer."""


def schema(name: str = "plan") -> dict[str, Any]:
    """
    Return a JSON Schema that is shipped with the program.

    Parameters
    ----------
    name
        `plan` for `siting plan --json` and plan.json, `check` for `siting check --json`.

    Returns
    -------
    schema
        A JSON Schema of draft 2020-12.
    """
    text = files("siting.plan").joinpath(f"{name}.schema.json").read_text(encoding="utf-8")
    loaded: dict[str, Any] = json.loads(text)
    return loaded


def summary_to_json(answer: Answer, report: AuditReport | None, *, fingerprint: str = "") -> dict[str, Any]:
    """
    Return the object of `siting plan --json`.

    Parameters
    ----------
    answer
        What was found.
    report
        The audit of its plan; None without a plan.
    fingerprint
        Of the study, used where there is no plan to take it from.

    Returns
    -------
    summary
        Plain JSON values; null where something does not exist (no cost without a plan, no saving without today).
    """
    proof, plan, today = answer.proof, answer.plan, answer.today
    gap = proof.gap
    return {
        "format_version": FORMAT_VERSION,
        "outcome": str(proof.outcome),
        "cost": proof.cost,
        "bound": proof.bound,
        "gap": None if gap is None or gap == float("inf") else gap,
        "seconds": proof.seconds,
        "engine": proof.engine,
        "sites": _names(plan, "site", SiteVerdict),
        "suppliers": _names(plan, "supplier", SupplierVerdict),
        "cost_lines": {str(line): plan.cost_lines[line] for line in CostLine} if plan else None,
        "today": {"cost": today.cost, "outcome": str(today.outcome)} if today else None,
        "saving": plan.saving if plan else None,
        "audit": {"passed": report.passed, "faults": list(report.faults)} if report else None,
        "fingerprint": plan.fingerprint if plan else fingerprint,
        "warnings": list(plan.warnings) if plan else [],
        "reasons": [encode(reason) for reason in answer.reasons],
        "together": answer.together,
    }


def _names(plan: Plan | None, kind: str, verdicts: type[SiteVerdict | SupplierVerdict]) -> dict[str, list[str]] | None:
    """Return the names under each verdict, in the order of the table; None without a plan."""
    if plan is None:
        return None
    lines = plan.sites if kind == "site" else plan.suppliers
    return {str(verdict): [getattr(line, kind) for line in lines if line.verdict == verdict] for verdict in verdicts}


def answer_to_json(answer: Answer, report: AuditReport | None, *, fingerprint: str = "") -> dict[str, Any]:
    """
    Return plan.json: the object of `siting plan --json` and, under `detail`, the whole answer.

    Parameters
    ----------
    answer
        What was found.
    report
        The audit of its plan; None without a plan.
    fingerprint
        Of the study, used where there is no plan to take it from.

    Returns
    -------
    object
        Plain JSON values, from which `answer_from_json` gives an equal answer.

    Raises
    ------
    ValueError
        If the answer holds a number that is not finite.
    """
    return {**summary_to_json(answer, report, fingerprint=fingerprint), DETAIL: encode(answer)}


def answer_from_json(value: object) -> Answer:
    """
    Return the answer that plan.json holds.

    Parameters
    ----------
    value
        The object as `json.loads` gives it.

    Returns
    -------
    answer
        Equal to the one written.

    Raises
    ------
    PlanFileError
        If it is not a plan.json, is of another version, lacks something, holds something of the wrong kind, or its
        parts contradict each other. The message gives the place.
    """
    if not isinstance(value, dict) or "format_version" not in value:
        msg = (
            "plan.json: this is not a plan: format_version is missing. Give the folder that `siting plan --out` wrote."
        )
        raise PlanFileError(msg)
    if value["format_version"] != FORMAT_VERSION:
        msg = (
            f"plan.json: format_version is {value['format_version']!r}, this program reads {FORMAT_VERSION}. "
            "Plan the study again with `siting plan --out`."
        )
        raise PlanFileError(msg)
    if DETAIL not in value:
        msg = "plan.json: detail is missing (it is in what --out writes, not in what --json prints). Use --out."
        raise PlanFileError(msg)
    answer: Answer = decode(Answer, value[DETAIL], f"plan.json: {DETAIL}")
    _check_agreement(answer, value)
    return answer


def _check_agreement(answer: Answer, value: Mapping[str, object]) -> None:
    """Refuse a plan.json whose summary says something else than its detail."""
    fingerprint = value.get("fingerprint")
    right = summary_to_json(answer, None, fingerprint=fingerprint if isinstance(fingerprint, str) else "")
    for key, wanted in right.items():
        if key == "audit":
            continue
        if key not in value:
            msg = f"plan.json: {key} is missing. Write the plan again with `siting plan --out`."
            raise PlanFileError(msg)
        if value[key] != wanted:
            msg = f"plan.json: {key} and detail contradict each other; the file was edited. Write the plan again."
            raise PlanFileError(msg)


def check_to_json(faults: Sequence[Fault], warnings: Sequence[Fault]) -> dict[str, Any]:
    """
    Return the object of `siting check --json`.

    Parameters
    ----------
    faults, warnings
        What the check of a study found.

    Returns
    -------
    object
        Plain JSON values: each fault with its parts and as one sentence.
    """
    return {
        "format_version": FORMAT_VERSION,
        "faults": [{**encode(fault), "text": str(fault)} for fault in faults],
        "warnings": [{**encode(warning), "text": str(warning)} for warning in warnings],
    }


def to_text(value: Mapping[str, object]) -> str:
    """
    Return JSON text.

    Parameters
    ----------
    value
        Plain JSON values.

    Returns
    -------
    text
        UTF-8 text, two blanks a level, with a line break at the end.

    Raises
    ------
    ValueError
        If a number is NaN or infinite, which JSON cannot hold.
    """
    return json.dumps(value, ensure_ascii=False, indent=2, allow_nan=False) + "\n"
