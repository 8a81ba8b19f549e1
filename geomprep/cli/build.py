"""``geomprep build CASE``: the whole way from a case file to a checked network."""

from __future__ import annotations

import argparse
from pathlib import Path

from geomprep.case.build import BuildResult, build
from geomprep.cli.console import Console
from geomprep.cli.repairs import repair_lines
from geomprep.findings import Severity, most_severe

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("case", metavar="CASE", type=Path, help="the case file")
    parser.add_argument(
        "-o", "--output", metavar="DIR", type=Path, help="folder for the results (results/ beside the case)"
    )
    parser.add_argument("--dry-run", action="store_true", help="build and check everything, write nothing")
    parser.add_argument(
        "--strict", action="store_true", help="refuse while decisions are open or findings of severity error are left"
    )


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Build and print the closing lines; 1 where findings of severity error are left."""
    result = build(
        arguments.case,
        output=arguments.output,
        dry_run=arguments.dry_run,
        strict=arguments.strict,
        progress=console.progress,
    )
    console.end_progress()
    console.detail(*(f"{finding.severity:<8} {finding.message}" for finding in result.findings))
    console.detail(*(f"repair   {repair.id}: {repair.reason} ({repair.choice})" for repair in result.repairs))
    if arguments.dry_run:
        console.say("would be repaired", *repair_lines(result.repairs, console.verbose), "")
    console.say(*result.summary)
    console.document(_plain(result))
    return 1 if most_severe(result.findings) is Severity.ERROR else 0


def _plain(result: BuildResult) -> dict[str, object]:
    """The result as JSON holds it; the network itself stands in its file."""
    return {
        "output_folder": str(result.output_folder) if result.output_folder else None,
        "nodes": len(result.network.nodes),
        "segments": len(result.network.segments),
        "stations": len(result.network.stations),
        "mass_residual": float(result.state.mass_residual),
        "findings": [vars(finding) for finding in result.findings],
        "repairs": [
            {name: value for name, value in vars(repair).items() if name != "raw_points"} for repair in result.repairs
        ],
        "summary": list(result.summary),
    }
