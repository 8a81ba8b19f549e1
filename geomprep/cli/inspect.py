"""``geomprep inspect FILE…``: what is in files, what is wrong, which readings of the numbers fit."""

from __future__ import annotations

import argparse

from geomprep.case.inspect import Inspection, inspect
from geomprep.cli.console import Console, table
from geomprep.cli.repairs import repair_lines
from geomprep.errors import GeomprepError
from geomprep.findings import Severity, most_severe
from geomprep.units import parse_quantity

__all__ = ["add_arguments", "run"]

_READINGS = 5


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("files", metavar="FILE", nargs="+", help="files with lines and sizes")
    parser.add_argument("--vessels", choices=("arteries", "veins"), help="hold sizes against those of this class")
    parser.add_argument("--size-array", metavar="NAME", help="array that holds the sizes, where there are several")
    parser.add_argument(
        "--voxel", metavar="LENGTH", help="voxel edge of the image, such as '0.6 mm'; tells units apart"
    )


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Inspect every file; the highest code of all of them."""
    edge = parse_quantity(arguments.voxel, "length", "--voxel") if arguments.voxel else None
    documents, code = [], 0
    for number, file in enumerate(arguments.files):
        try:
            found = inspect(
                file,
                vessels=arguments.vessels,
                size_array=arguments.size_array,
                voxel=(edge, edge, edge) if edge else None,
            )
        except GeomprepError as error:
            console.error(str(error))
            documents.append({"file": file, "error": str(error)})
            code = 2
            continue
        console.say(*([""] if number else []), *_lines(found, console.verbose))
        documents.append(found.to_dict())
        code = max(code, int(most_severe(found.findings) is Severity.ERROR))
    console.document({"files": documents})
    return code


def _lines(found: Inspection, verbose: bool) -> list[str]:
    """An inspection for a person."""
    low, high = (" ".join(f"{value:.6g}" for value in corner) for corner in found.box)
    lines = [
        f"{found.file}: {found.format}",
        f"  {found.n_points:,} points on {found.n_lines:,} lines, {found.total_length:.6g} long, "
        f"from ({low}) to ({high}) in the unit of the file",
        f"  {len(found.ends.points)} open ends, {found.ends.n_parts} part(s), {found.ends.n_loops} loop(s), "
        "counting points as joined where coordinates are equal",
    ]
    lines += ["", "arrays", *_arrays(found)]
    lines += ["", "findings", *([f"  {each.severity:<8} {each.message}" for each in found.findings] or ["  none"])]
    if found.gate:
        lines += ["", *_readings(found, verbose)]
        lines += ["", *_questions(found, verbose)]
        lines += [
            "",
            f"would be repaired, read as {found.preview.read_as}",
            *repair_lines(found.preview.repairs, verbose),
        ]
    return lines


def _arrays(found: Inspection) -> list[str]:
    """One line per array."""
    if not found.arrays:
        return ["  none"]
    rows = [
        [
            array.name,
            array.place,
            str(array.components),
            array.type,
            "" if array.minimum is None else f"{array.minimum:.5g} to {array.maximum:.5g}",
            array.may_hold,
        ]
        for array in found.arrays
    ]
    return table(["name", "on", "components", "type", "range", "remark"], rows)


def _readings(found: Inspection, verbose: bool) -> list[str]:
    """The readings of the sizes, best first."""
    gate = found.gate
    if gate is None or not gate.hypotheses:
        return []
    shown = gate.hypotheses if verbose else gate.hypotheses[:_READINGS]
    rows = [[reading.unit, reading.meaning, f"{reading.score:.2f}", ", ".join(reading.evidence)] for reading in shown]
    title = (
        f"readings of '{gate.likely.name}' against published sizes, best first "
        "(a score ranks, it proves nothing; a diameter hardly differs from a radius in this)"
    )
    return [title, *table(["unit", "size is", "score", "evidence"], rows)]


def _questions(found: Inspection, verbose: bool) -> list[str]:
    """What a case has to state."""
    lines = ["a case has to state" if found.questions else "nothing is open"]
    for number, question in enumerate(found.questions, 1):
        candidates = f": {', '.join(question.candidates)}" if question.candidates else ""
        lines.append(f"  ({number}) {question.key.split('.')[-1]}{candidates}   {question.text}")
        if verbose:
            lines += table(["", ""], zip(question.candidates, question.evidence, strict=True), indent="        ")[1:]
    return lines
