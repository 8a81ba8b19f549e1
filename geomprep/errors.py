"""Errors a caller may want to catch.

    GeomprepError
    ├── InputError (also ValueError)   something a person gave cannot be used
    │   ├── FileError                  a file cannot be read, or says something impossible
    │   ├── CaseError                  the case file cannot be understood
    │   ├── OpenQuestions              the case leaves open what the numbers cannot answer
    │   └── NetworkFileError           a network file fails its validation
    └── ModelError (also ValueError)   the geometry and the parameters contradict each other

Every message is one line: the value, the rule it breaks, the way out.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

__all__ = [
    "CaseError",
    "FileError",
    "GeomprepError",
    "InputError",
    "ModelError",
    "NetworkFileError",
    "OpenQuestions",
    "Question",
]


class GeomprepError(Exception):
    """Parent of every error that geomprep raises on purpose."""


class InputError(GeomprepError, ValueError):
    """Something a person gave (a file, a case, an argument) cannot be used."""


class FileError(InputError):
    """A file cannot be read, or holds something impossible.

    Parameters
    ----------
    file : str
        Name of the file as the person gave it.
    fault : str
        What is wrong and what can be done, in one line.
    """

    def __init__(self, file: str, fault: str) -> None:
        super().__init__(f"{file}: {fault}")
        self.file = file
        self.fault = fault


class CaseError(InputError):
    """The case file has an unknown key, a bad value or a contradiction."""


class NetworkFileError(InputError):
    """A network file breaks its schema, its units or its own sums."""


class ModelError(GeomprepError, ValueError):
    """Geometry and parameters contradict each other (a negative outlet resistance, say)."""


@dataclass(frozen=True)
class Question:
    """One thing the case must state because the numbers cannot answer it.

    Attributes
    ----------
    key : str
        Key of the case file that answers it, such as ``input[0].length_unit``.
    text : str
        The question in one line.
    candidates : tuple of str
        Answers that fit the numbers, best first.
    evidence : tuple of str
        What speaks for each candidate (same length as `candidates`).
    """

    key: str
    text: str
    candidates: tuple[str, ...] = ()
    evidence: tuple[str, ...] = ()

    def oneline(self) -> str:
        """Return question, candidates and the key to set, on one line."""
        choices = f"; candidates: {', '.join(self.candidates)}" if self.candidates else ""
        return f"{self.text}{choices}; set {self.key}"


class OpenQuestions(InputError):
    """The case leaves questions open; all of them are listed at once, numbered."""

    def __init__(self, questions: Sequence[Question]) -> None:
        self.questions = tuple(questions)
        listed = "; ".join(f"({number}) {question.oneline()}" for number, question in enumerate(self.questions, 1))
        super().__init__(f"the case leaves {len(self.questions)} question(s) open: {listed}")
