"""Repairs as a table for a person."""

from __future__ import annotations

from collections.abc import Sequence

from geomprep.cli.console import table
from geomprep.model import Repair

__all__ = ["repair_lines"]

_SHOWN = 30


def repair_lines(repairs: Sequence[Repair], verbose: bool) -> list[str]:
    """Return one line per repair, questions first; the first thirty unless all are wanted.

    Parameters
    ----------
    repairs : sequence of Repair
    verbose : bool
    """
    if not repairs:
        return ["  none"]
    ordered = sorted(repairs, key=lambda repair: repair.verdict_by != "open")
    shown = ordered if verbose else ordered[:_SHOWN]
    rows = [
        [
            repair.id,
            repair.kind,
            f"asked: {' | '.join(repair.options)}" if repair.verdict_by == "open" else repair.choice,
            "" if repair.score is None else f"{repair.score:.2f}",
            ", ".join(f"{1e3 * value:.5g}" for value in repair.position),
            repair.reason,
        ]
        for repair in shown
    ]
    more = len(ordered) - len(shown)
    return [
        *table(["id", "kind", "choice", "score", "at, mm", "reason"], rows),
        *([f"  … and {more} more (--verbose shows all)"] if more else []),
    ]
