"""What the commands print, and where: results on standard output, everything else on standard error."""

from __future__ import annotations

import json
import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

__all__ = ["Console", "table"]

_BAR = 24


@dataclass(frozen=True)
class Console:
    """How much a command prints and in which form.

    Attributes
    ----------
    json : bool
        Results as one JSON document; no other words on standard output.
    quiet : bool
        Results are not printed; errors are.
    verbose : bool
        More lines.
    """

    json: bool = False
    quiet: bool = False
    verbose: bool = False

    def say(self, *lines: str) -> None:
        """Print lines for a person."""
        if not (self.json or self.quiet):
            sys.stdout.write("".join(f"{line}\n" for line in lines))

    def detail(self, *lines: str) -> None:
        """Print lines that only ``--verbose`` shows."""
        if self.verbose:
            self.say(*lines)

    def document(self, content: Any) -> None:
        """Print a result as JSON where ``--json`` asks for it."""
        if self.json:
            text = json.dumps(_finite(content), indent=2, ensure_ascii=False, allow_nan=False)
            sys.stdout.write(text + "\n")

    def error(self, message: str) -> None:
        """Print one line on standard error."""
        self.end_progress()
        sys.stderr.write(f"geomprep: {' '.join(message.split())}\n")

    def progress(self, stage: str, part: float) -> None:
        """Draw a bar on a terminal; nothing elsewhere."""
        if self._draws():
            filled = round(_BAR * min(max(part, 0.0), 1.0))
            bar = "█" * filled + "·" * (_BAR - filled)
            sys.stderr.write(f"\r\x1b[K{bar} {part:4.0%}  {stage}")
            sys.stderr.flush()

    def end_progress(self) -> None:
        """Wipe the bar."""
        if self._draws():
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()

    def _draws(self) -> bool:
        """Whether a bar may be drawn."""
        return sys.stderr.isatty() and not (self.quiet or self.json)


def _finite(content: Any) -> Any:
    """The content with every NaN and infinity as null: JSON has no such numbers."""
    if isinstance(content, dict):
        return {str(name): _finite(value) for name, value in content.items()}
    if isinstance(content, list | tuple):
        return [_finite(value) for value in content]
    if isinstance(content, float) and content - content != 0.0:
        return None
    return content


def table(head: Sequence[str], rows: Iterable[Sequence[str]], indent: str = "  ") -> list[str]:
    """Return a table as lines with aligned columns; the last column runs free.

    Examples
    --------
    >>> table(["name", "value"], [["radius", "2"], ["x", "10"]])
    ['  name    value', '  radius  2', '  x       10']
    """
    everything = [list(head), *(list(row) for row in rows)]
    widths = [max(len(row[column]) for row in everything) for column in range(len(head))]
    return [
        (indent + "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True))).rstrip()
        for row in everything
    ]
