"""Recording a decision: the id must be one of this case, the choice one of its options."""

from __future__ import annotations

from pathlib import Path

from geomprep.case.decisions import WITHDRAWN, append_decision, read_decisions, standing
from geomprep.case.file import read_case
from geomprep.case.geometry import draw_repairs
from geomprep.errors import InputError
from geomprep.model import Decision, Repair

__all__ = ["decision_rows", "record_decision"]


def decision_rows(case: Path) -> list[dict[str, str]]:
    """List every repair of a case with its options and what stands on it.

    Parameters
    ----------
    case : Path
        The case file.

    Returns
    -------
    list of dict
        id, kind, options, choice, decided by, reason.
    """
    recorded = standing(read_decisions(case.parent))
    return [
        {
            "id": repair.id,
            "kind": repair.kind,
            "options": " | ".join(repair.options),
            "choice": repair.choice,
            "decided by": recorded[repair.id].recorded_by if repair.id in recorded else repair.verdict_by,
            "reason": repair.reason,
        }
        for repair in draw_repairs(read_case(case))
    ]


def record_decision(case: Path, key: str, choice: str | None, note: str, by: str) -> Decision:
    """Append a decision to the file beside a case.

    Parameters
    ----------
    case : Path
        The case file.
    key : str
        Id of a repair of this case, or a beginning that fits one only.
    choice : str, optional
        One of its options; None takes earlier decisions back.
    note, by : str
        The reason, and who decided.

    Returns
    -------
    Decision

    Raises
    ------
    InputError
        The id fits no repair or several, or the choice is none of its options.
    """
    if choice is None:
        decision = Decision(_one_of(key, list(standing(read_decisions(case.parent)))), WITHDRAWN, note, by)
    else:
        repairs = {repair.id: repair for repair in draw_repairs(read_case(case))}
        repair = repairs[_one_of(key, list(repairs))]
        decision = Decision(repair.id, _checked(repair, choice), note, by)
    append_decision(case.parent, decision)
    return decision


def _one_of(key: str, ids: list[str]) -> str:
    """The id that a text names."""
    found = [one for one in ids if one == key] or [one for one in ids if one.startswith(key)]
    if len(found) != 1:
        what = "fits nothing" if not found else f"fits {len(found)} ids ({', '.join(found[:3])})"
        raise InputError(f"'{key}' {what}; 'geomprep decide CASE --list' shows the ids of this case")
    return found[0]


def _checked(repair: Repair, choice: str) -> str:
    """The choice, if it is one of the options."""
    if choice not in repair.options:
        raise InputError(f"'{choice}' is no choice on {repair.id}; choose one of {' | '.join(repair.options)}")
    return choice
