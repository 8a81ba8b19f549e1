"""Start a case: a commented file in which every open question waits for its answer."""

from __future__ import annotations

import os
import tomllib
from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from geomprep.atomic import write_atomic
from geomprep.case.inspect import Inspection, inspection_of
from geomprep.case.keys import key_table
from geomprep.case.values import read_value
from geomprep.errors import CaseError, InputError, Question
from geomprep.files import FileContents, read_files
from geomprep.files.statement import InputStatement
from geomprep.model import FloatArray, IntArray

__all__ = ["new_case", "new_case_text"]

Ask = Callable[[Question], str | None]

_MOST_ENDS = 12

_HEAD = """\
# A case says everything about one build. Lines marked CHOOSE wait for your answer: take the '#' and the words before
# the key away on the line that holds. 'geomprep build' asks for what is still open. All keys: docs/case-file.md

[case]
name = {name}
# subject = "a code, never a person's name"
# question = "What should the model answer?"
# imaged_in = "supine"               # supine | prone | upright | left side | right side; needs the frame of the input
# model_as = "supine"
"""

_TAIL = """
[imaging_state]
# CHOOSE (arteries): arterial_pressure = "93 mmHg"      # mean pressure while imaged: the areas belong to it
# venous_pressure = "from steady solve"                 # the default for veins; or a pressure

# CHOOSE (veins): the wave speed at the imaged state; veins have no default
# [walls.vein]
# stiffness = "user"
# wave_speed = "4 m/s"

# Arteries without a statement follow a published relation; 'geomprep sources' lists what can be chosen.
# [walls.artery]
# stiffness = "wave-speed-reymond-2009"

# [surroundings.cranium]
# pressure = "10 mmHg"
# vessels = ["superior sagittal sinus"]
"""

_ENDS_HEAD = """
# Open ends, the widest first: place in the unit of the file, and size.
"""

_ENDS_TAIL = """
# CHOOSE: where blood enters, by mean flow or by pressure
# [[inlets]]
# at = "{at}"
# mean_flow = "250 mL/min"

# CHOOSE: where it leaves
# [[outlets]]
# at = "every other open end"
# model = "fixed pressure"           # fixed pressure | resistance | three-element windkessel
# pressure = "5 mmHg"
"""


def new_case(files: Sequence[str | Path], output: str | Path, ask: Ask | None = None) -> Path:
    """Write a commented case file for some centreline files.

    Parameters
    ----------
    files : sequence of path
        At least one file with lines.
    output : path
        The case file; it must not exist yet.
    ask : callable, optional
        Called with each question; returns the answer or None to leave it open.

    Returns
    -------
    pathlib.Path
        The case file.

    Raises
    ------
    FileError
        A file cannot be read or holds no lines.
    InputError
        The output exists or cannot be written.

    Examples
    --------
    >>> new_case(["no-such-file.vtp"], "no-such-case.toml")
    Traceback (most recent call last):
    geomprep.errors.FileError: no-such-file.vtp: there is no such file; check name and folder
    """
    target = Path(output)
    if target.exists():
        raise InputError(f"{target}: exists already; name another file with -o, or move it away")
    write_atomic(target, new_case_text(files, target.parent, target.stem, ask).encode())
    return target


def new_case_text(files: Sequence[str | Path], folder: Path, name: str, ask: Ask | None = None) -> str:
    """Return the text of a new case; see :func:`new_case`."""
    contents = read_files(list(files))
    parts = [_HEAD.format(name=_toml(name))]
    for number, (file, content) in enumerate(zip(files, contents, strict=True)):
        parts.append(_input_section(_relative(Path(file), folder), content, number, ask))
    parts += [_TAIL, _ends_section(contents[0])]
    return "".join(parts)


def _relative(file: Path, folder: Path) -> str:
    """Path of a file as seen from the case, with forward slashes."""
    return Path(os.path.relpath(str(file), str(folder))).as_posix()


def _toml(text: str) -> str:
    """A text as TOML."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


def _input_section(file: str, content: FileContents, number: int, ask: Ask | None) -> str:
    """One ``[[input]]`` with what is known, and a line for every candidate of what is not."""
    key = f"input[{number}]"
    statement = InputStatement(file)
    answers: dict[str, str] = {}
    if ask is not None:
        statement, answers = _asked(content, statement, key, ask)
    found = inspection_of(content, statement, key)
    lines = ["\n[[input]]", f"file = {_toml(file)}"]
    lines += [f"{name} = {answer}" for name, answer in answers.items()]
    lines += [f"# {finding.severity}: {finding.message}" for finding in found.findings]
    for question in found.questions:
        lines += _open_lines(question)
    lines += _frame_lines(found)
    return "\n".join(lines) + "\n"


def _asked(
    content: FileContents, statement: InputStatement, key: str, ask: Ask
) -> tuple[InputStatement, dict[str, str]]:
    """What a person answers, question by question: an answer may open the next (both: which array tells?)."""
    answers: dict[str, str] = {}
    left_open: set[str] = set()
    while True:
        questions = inspection_of(content, statement, key).questions
        question = next((each for each in questions if each.key not in left_open), None)
        if question is None:
            return statement, answers
        answered = _answer(content, statement, question, ask)
        if answered is None:
            left_open.add(question.key)
        else:
            answer, statement = answered
            answers[question.key.split(".")[-1]] = _as_toml(question.key.split(".")[-1], answer)


def _answer(
    content: FileContents, statement: InputStatement, question: Question, ask: Ask
) -> tuple[str, InputStatement] | None:
    """An answer that the file can take, and the statement with it; asked again until it is one, or left open."""
    section, name = question.key.split(".")
    key, asked = key_table()["input[]"][name], question
    while (answer := ask(asked)) is not None:
        try:
            written = tomllib.loads(f"value = {_as_toml(name, answer)}")["value"]
            stated = replace(statement, **{name: read_value(written, key, name, Path())})
            inspection_of(content, stated, section)
        except (CaseError, tomllib.TOMLDecodeError) as error:
            asked = replace(question, text=f"{error}. {question.text}")
        else:
            return answer, stated
    return None


def _as_toml(name: str, answer: str) -> str:
    """An answer as it stands in the file: text in quotes, a table without."""
    return answer if key_table()["input[]"][name].kind == "class values" else _toml(answer)


def _open_lines(question: Question) -> list[str]:
    """One commented line per candidate."""
    key = question.key.split(".")[-1]
    lines = [f"# {question.text}"]
    evidence = question.evidence or ("",) * len(question.candidates)
    for candidate, why in zip(question.candidates, evidence, strict=True):
        lines.append(f"# CHOOSE: {key} = {_as_toml(key, candidate)}" + (f"      # {why}" if why else ""))
    return lines if question.candidates else [*lines, f"# CHOOSE: {key} = "]


def _frame_lines(found: Inspection) -> list[str]:
    """The frame, which no file tells."""
    if any(question.key.endswith("frame") for question in found.questions):
        return []
    return [
        '# CHOOSE: frame = "LPS"             # x grows to the patient\'s left, y to the back, z to the head;',
        "#                                   # sides and gravity need it",
        '# voxel = ["0.6 mm", "0.6 mm", "0.6 mm"]',
    ]


def _ends_section(content: FileContents) -> str:
    """The open ends of the first file, and how an inlet and an outlet are written."""
    found = inspection_of(content, InputStatement(content.name))
    ends = found.ends.points
    size = _sizes(found, ends)
    order = np.argsort(-size, kind="stable")[:_MOST_ENDS]
    places = [" ".join(f"{value:.6g}" for value in content.points[end].tolist()) for end in ends[order].tolist()]
    listed = "".join(
        f"#   at = {_toml(place)}" + (f"      # size {value:.4g}\n" if np.isfinite(value) else "\n")
        for place, value in zip(places, size[order].tolist(), strict=True)
    )
    more = len(ends) - len(places)
    rest = f"#   and {more} more\n" if more > 0 else ""
    return _ENDS_HEAD + listed + rest + _ENDS_TAIL.format(at=places[0] if places else "x y z")


def _sizes(found: Inspection, ends: IntArray) -> FloatArray:
    """Size at each open end in the file's own number; NaN where it is open or stands on lines."""
    size = found.gate.size if found.gate else None
    if size is None or size.place != "points":
        return np.full(len(ends), np.nan)
    at_ends: FloatArray = np.asarray(size.values, dtype=np.float64)[ends]
    return at_ends
