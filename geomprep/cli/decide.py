"""``geomprep decide CASE ID CHOICE``: record a person's choice on a repair."""

from __future__ import annotations

import argparse
import getpass
from pathlib import Path

from geomprep.case.deciding import decision_rows, record_decision
from geomprep.cli.console import Console, table

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("case", metavar="CASE", type=Path, help="the case file")
    parser.add_argument("id", metavar="ID", nargs="?", help="id of the repair, or its beginning")
    parser.add_argument("choice", metavar="CHOICE", nargs="?", help="one of its options")
    parser.add_argument("--because", metavar="TEXT", default="", help="the reason")
    parser.add_argument("--by", metavar="NAME", help="who decided, with the role (the user of this account)")
    parser.add_argument("--undo", action="store_true", help="take the decision on ID back")
    parser.add_argument("--list", action="store_true", help="list what can be decided and what was")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Record, take back, or list."""
    if arguments.list or arguments.id is None:
        rows = decision_rows(arguments.case)
        console.say(*(table(list(rows[0]), [list(row.values()) for row in rows]) if rows else ["nothing to decide"]))
        console.document(rows)
        return 0
    choice = None if arguments.undo else arguments.choice or ""
    by = arguments.by or getpass.getuser()
    decision = record_decision(arguments.case, arguments.id, choice, arguments.because, by)
    said = "taken back" if arguments.undo else f"recorded as '{decision.choice}'"
    console.say(f"decision   {decision.id} {said} by {decision.recorded_by}")
    console.say(f"next       geomprep build {arguments.case}")
    console.document(vars(decision))
    return 0
