"""The command ``geomprep``: it finds the subcommand, runs it, and turns errors into one line and an exit code.

Exit codes: 0 fine, 1 findings of severity error, 2 bad input or usage, 3 internal error, 130 stopped by the user.

A subcommand is a row in :data:`COMMANDS` and one module with ``add_arguments(parser)`` and ``run(arguments, console)``.
Only the module that is asked for is imported, so that ``geomprep --help`` is quick.
"""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
import traceback
from collections.abc import Sequence
from importlib import import_module
from typing import Final, NoReturn

from geomprep import __version__
from geomprep.cli.console import Console
from geomprep.errors import GeomprepError, OpenQuestions

__all__ = ["COMMANDS", "main"]

FINE, FINDINGS, BAD_INPUT, INTERNAL, STOPPED = 0, 1, 2, 3, 130

COMMANDS: Final[dict[str, tuple[str, str]]] = {
    "inspect": (
        "say what is in files, what is wrong, and which unit and size meaning fit; writes nothing",
        "geomprep inspect veins.vtp --vessels veins",
    ),
    "new": (
        "start a commented case file; lines marked CHOOSE need an answer",
        "geomprep new veins.vtp -o case.toml",
    ),
    "sample": ("copy a sample case", "geomprep sample neck-veins demo"),
    "build": (
        "build the network of a case with everything that goes with it",
        "geomprep build demo/neck-veins/case.toml",
    ),
    "validate": (
        "check a network file: types, ranges, meaning, and the steady check solved again",
        "geomprep validate demo/neck-veins/results/network.json",
    ),
    "decide": (
        "record a decision on a repair, take one back, or list them",
        'geomprep decide case.toml gap-1f3a join --because "one vessel on the source image"',
    ),
    "compare": (
        "say what differs between two networks, and what it does to resistance",
        "geomprep compare before/results after/results --voxel '0.6 mm'",
    ),
    "sources": ("list the published numbers and relations, or print one", "geomprep sources wave-speed-reymond-2009"),
}
"""Subcommand -> what it does, an example."""


class _Parser(argparse.ArgumentParser):
    """A parser whose errors are one line."""

    def error(self, message: str) -> NoReturn:
        """Print one line and leave with the code for wrong usage."""
        self.exit(BAD_INPUT, f"{self.prog}: {' '.join(message.split())}; see {self.prog} --help\n")


def _parser(chosen: str | None) -> argparse.ArgumentParser:
    """The parser with all subcommands; only the chosen one has its arguments."""
    parser = _Parser(
        prog="geomprep",
        description="Vessel centrelines in, a checked network for any 1D or 0D blood-flow solver out.",
        epilog="Example:  geomprep sample limb demo && geomprep build demo/limb/case.toml",
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"geomprep {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for name, (help_line, example) in COMMANDS.items():
        command = commands.add_parser(
            name,
            help=help_line,
            description=f"{help_line[0].upper()}{help_line[1:]}.",
            epilog=f"Example:  {example}",
            formatter_class=argparse.RawDescriptionHelpFormatter,
        )
        if name == chosen:
            import_module(f"geomprep.cli.{name}").add_arguments(command)
            _common(command)
    return parser


def _common(command: argparse.ArgumentParser) -> None:
    """Arguments of every subcommand."""
    command.add_argument("--json", action="store_true", help="print the result as one JSON document")
    loudness = command.add_mutually_exclusive_group()
    loudness.add_argument("-q", "--quiet", action="store_true", help="print errors only")
    loudness.add_argument("-v", "--verbose", action="store_true", help="print more")


def main(argv: Sequence[str] | None = None) -> int:
    """Run a command and return its exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the name of the program; those of the process where not given.

    Returns
    -------
    int
        0 fine, 1 findings of severity error, 2 bad input or usage, 3 internal error, 130 stopped.

    Examples
    --------
    >>> main(["sample", "--list", "--quiet"])
    0
    """
    arguments = list(sys.argv[1:] if argv is None else argv)
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a terminal that lacks a sign is no reason to fail
    console = Console(quiet="-q" in arguments or "--quiet" in arguments, json="--json" in arguments)
    try:
        code = _run(arguments)
        sys.stdout.flush()
    except SystemExit as leaving:  # argparse has printed help or the fault
        return leaving.code if isinstance(leaving.code, int) else FINE
    except BrokenPipeError:
        return _reader_left()
    except KeyboardInterrupt:
        console.error("stopped; files are written whole or not at all")
        return STOPPED
    except (GeomprepError, OSError, MemoryError) as error:
        return _refused(error, console)
    except Exception as error:
        return _failed(error, console)
    return code


def _run(arguments: list[str]) -> int:
    """Parse and run the chosen subcommand."""
    chosen = arguments[0] if arguments and arguments[0] in COMMANDS else None
    parsed = _parser(chosen).parse_args(arguments)
    console = Console(json=parsed.json, quiet=parsed.quiet, verbose=parsed.verbose)
    code: int = import_module(f"geomprep.cli.{parsed.command}").run(parsed, console)
    return code


def _refused(error: Exception, console: Console) -> int:
    """One line for something that a person gave or the machine refuses."""
    if isinstance(error, MemoryError):
        message = "not enough memory; give fewer points, or run on a larger machine"
    elif isinstance(error, OSError):
        message = f"{error.filename or 'file'}: {error.strerror or error}; check name, rights and free space"
    else:
        message = str(error)
    questions = [vars(question) for question in error.questions] if isinstance(error, OpenQuestions) else []
    console.document({"error": message, "questions": questions})
    if isinstance(error, OpenQuestions):
        console.error(f"the case leaves {len(questions)} question(s) open:")
        for number, question in enumerate(error.questions, 1):
            console.error(f"({number}) {question.oneline()}")
    else:
        console.error(message)
    return BAD_INPUT


def _failed(error: Exception, console: Console) -> int:
    """One line for a fault of the program; the details go into a file."""
    with tempfile.NamedTemporaryFile(
        "w", prefix="geomprep-", suffix=".log", delete=False, encoding="utf-8", errors="replace"
    ) as log:
        log.write(f"geomprep {__version__}, Python {sys.version}\narguments: {sys.argv[1:]}\n")
        traceback.print_exception(error, file=log)
    console.error(f"internal error ({type(error).__name__}: {error}); the details are in {log.name}; please report it")
    return INTERNAL


def _reader_left() -> int:
    """The reader of our output closed it (``| head``): nothing more to say, and nothing wrong."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return FINE


if __name__ == "__main__":
    sys.exit(main())
