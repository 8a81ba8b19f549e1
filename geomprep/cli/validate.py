"""``geomprep validate NETWORK.json``: check a network file by itself."""

from __future__ import annotations

import argparse
from pathlib import Path

from geomprep.cli.console import Console
from geomprep.export import validate_network

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("network", metavar="NETWORK.json", type=Path, help="the network file")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Validate; every fault is one line on standard error and the exit code is 2."""
    report = validate_network(arguments.network)
    for fault in report.faults:
        console.error(f"{arguments.network}: {fault}")
    if report.valid:
        console.say(f"{arguments.network}: valid; {report.said}")
    faults = [{"word": fault.word, "place": fault.place, "message": fault.message} for fault in report.faults]
    console.document({"file": str(arguments.network), "valid": report.valid, "faults": faults})
    return 0 if report.valid else 2
