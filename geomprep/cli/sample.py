"""``geomprep sample NAME [DIR]``: copy a sample case."""

from __future__ import annotations

import argparse
from pathlib import Path

from geomprep.case.samples import copy_sample, sample_names
from geomprep.cli.console import Console
from geomprep.errors import InputError

__all__ = ["add_arguments", "run"]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of this command."""
    parser.add_argument("name", metavar="NAME", nargs="?", help="name of the sample")
    parser.add_argument("folder", metavar="DIR", nargs="?", type=Path, default=Path(), help="where its folder is made")
    parser.add_argument("--list", action="store_true", help="list the samples")


def run(arguments: argparse.Namespace, console: Console) -> int:
    """Copy the sample, or list them all."""
    if arguments.list:
        console.say(*sample_names())
        console.document({"samples": list(sample_names())})
        return 0
    if arguments.name is None:
        raise InputError(f"sample: name one of {', '.join(sample_names())}, such as geomprep sample limb")
    case = copy_sample(arguments.name, arguments.folder)
    console.say(f"copied     {case.parent}", f"next       geomprep build {case}")
    console.document({"case": str(case)})
    return 0
