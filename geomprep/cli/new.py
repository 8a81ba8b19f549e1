"""``geomprep new FILE… -o CASE``: start a case for centreline files."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from geomprep.case.new import new_case
from geomprep.cli.console import Console
from geomprep.errors import Question

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("files", metavar="FILE", nargs="+", type=Path, help="centreline files")
    parser.add_argument("-o", "--output", metavar="CASE", type=Path, default=Path("case.toml"), help="file to write")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Write the case; ask on a terminal."""
    asks = sys.stdin.isatty() and sys.stdout.isatty() and not (console.quiet or console.json)
    case = new_case(arguments.files, arguments.output, _ask if asks else None)
    console.say(f"written    {case}", f"next       answer its CHOOSE lines, then: geomprep build {case}")
    console.document({"case": str(case)})
    return 0


def _ask(question: Question) -> str | None:
    """Ask on the terminal; an empty answer leaves the question open in the file."""
    evidence = question.evidence or ("",) * len(question.candidates)
    lines = [
        f"  {number}  {one}  {why}"
        for number, (one, why) in enumerate(zip(question.candidates, evidence, strict=True), 1)
    ]
    sys.stdout.write("\n".join(["", question.text, *lines, "number or answer, or Enter to leave it open: "]))
    sys.stdout.flush()
    answer = sys.stdin.readline().strip()
    if answer.isdigit() and 1 <= int(answer) <= len(question.candidates):
        return question.candidates[int(answer) - 1]
    return answer or None
