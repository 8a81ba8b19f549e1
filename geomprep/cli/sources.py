"""``geomprep sources [KEY]``: published rows that a case can choose."""

from __future__ import annotations

import argparse

from geomprep.cli.console import Console, table
from geomprep.literature import row, rows

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("key", metavar="KEY", nargs="?", help="one row; left out: list them")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Print one row, or a line for each."""
    found = [row(arguments.key)] if arguments.key else list(rows())
    if arguments.key:
        filled = [[name, str(value)] for name, value in vars(found[0]).items() if value not in (None, "", ())]
        console.say(*table(["field", "value"], filled))
    else:
        console.say(
            *table(["key", "class", "checked", "what"], [[r.key, r.vessel_class, r.checked, r.of] for r in found])
        )
    console.document([vars(one) for one in found])
    return 0
