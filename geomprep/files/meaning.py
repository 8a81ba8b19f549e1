"""Gates on reading: what a file means in metres, stated by the case and held against the numbers.

Nothing is scaled silently. What the case states is applied and checked; what it does
not state is a question with the candidates ranked, even where one of them fits best:
numbers suggest a unit, they do not prove it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import FileError, OpenQuestions, Question
from geomprep.files.classes import class_questions, line_classes
from geomprep.files.frames import is_right_handed
from geomprep.files.scale import Hypothesis, hypotheses
from geomprep.files.size_arrays import SizeArray, find_size_array, size_arrays
from geomprep.files.statement import SIZE_MEANINGS, InputStatement
from geomprep.findings import Finding, Severity
from geomprep.model import Basis, Centrelines, FloatArray
from geomprep.units import length_factor

if TYPE_CHECKING:
    from geomprep.files.contents import FileContents

__all__ = ["Gate", "gate", "to_centrelines"]

_RIVAL = 10.0
"""A reading that fits this many times better than the stated one is a contradiction."""


@dataclass(frozen=True, eq=False)
class Gate:
    """What was found out about the meaning of one file.

    Attributes
    ----------
    size : SizeArray, optional
        The array that holds the sizes; None while it is open.
    likely : SizeArray
        The same, or the first candidate while it is open.
    candidates : tuple of SizeArray
        Arrays that may hold sizes.
    hypotheses : tuple of Hypothesis
        Readings of the likely array, best first.
    questions : tuple of Question
        What the case has to state.
    findings : tuple of Finding
        Contradictions between what is stated and the numbers.
    """

    size: SizeArray | None
    likely: SizeArray
    candidates: tuple[SizeArray, ...]
    hypotheses: tuple[Hypothesis, ...]
    questions: tuple[Question, ...]
    findings: tuple[Finding, ...]


def gate(
    contents: FileContents, statement: InputStatement, *, key: str = "input[0]", posture: str | None = None
) -> Gate:
    """Hold what is stated about a file against its numbers.

    Parameters
    ----------
    contents : FileContents
        The file as read.
    statement : InputStatement
        What the case states about it.
    key : str
        Section of the case, for messages.
    posture : str, optional
        Posture that the case states; it needs the frame.

    Returns
    -------
    Gate

    Raises
    ------
    FileError
        The file has no lines, or no array that could hold sizes.
    CaseError
        A stated array does not exist or holds no sizes.
    """
    if len(contents.offsets) < 2:
        count = len(contents.points)
        raise FileError(statement.file, f"{count} points and no lines; vessels need lines through their points")
    candidates = size_arrays(contents)
    questions: list[Question] = []
    size, likely = _chosen(contents, statement, candidates, key, questions)
    ranked = hypotheses(contents, likely, statement.vessels, statement.voxel)
    _ask_vessels(contents, statement, key, questions)
    _ask_unit(statement, ranked, key, questions)
    _ask_meaning(statement, ranked, likely, key, questions)
    if posture and not statement.frame:
        text = f"the case states the posture '{posture}', but not the frame of {statement.file}: where is down?"
        questions.append(Question(f"{key}.frame", text, ("LPS", "RAS"), _FRAME_EVIDENCE))
    findings = [*_scale_findings(statement, ranked, likely, key), *_frame_findings(statement, posture)]
    findings += _length_findings(contents, statement)
    return Gate(size, likely, candidates, ranked, tuple(questions), tuple(findings))


_FRAME_EVIDENCE = ("x to the patient's left, y to the back, z to the head", "x to the right, y to the front, z up")


def _chosen(
    contents: FileContents,
    statement: InputStatement,
    candidates: tuple[SizeArray, ...],
    key: str,
    questions: list[Question],
) -> tuple[SizeArray | None, SizeArray]:
    """The size array, and the likeliest one where it is open."""
    if statement.size_array:
        named = find_size_array(contents, statement.size_array, key)
    elif candidates:
        named = candidates
    else:
        names = ", ".join([*contents.point_arrays, *contents.cell_arrays]) or "none"
        fault = (
            "no vessel sizes: no array of one number per point or line has radius, diameter or area in its name "
            f"(arrays: {names}); name the array with size_array, or add sizes to the file"
        )
        raise FileError(statement.file, fault)
    if len(named) == 1:
        return named[0], named[0]
    ranked = sorted(named, key=lambda array: array.positive < len(array.values))
    labels = tuple(_label(array, named) for array in ranked)
    text = f"{statement.file} has {len(named)} arrays that may hold the vessel sizes; which one is it?"
    evidence = tuple(array.describe() for array in ranked)
    questions.append(Question(f"{key}.size_array", text, labels, evidence))
    return None, ranked[0]


def _label(array: SizeArray, others: tuple[SizeArray, ...]) -> str:
    """Name of an array as the case should give it."""
    twice = sum(other.name == array.name for other in others) > 1
    return f"{array.name} on {array.place}" if twice else array.name


def _ask_vessels(contents: FileContents, statement: InputStatement, key: str, questions: list[Question]) -> None:
    """Arteries or veins: no number tells."""
    if statement.vessels is None:
        text = f"are the lines of {statement.file} arteries or veins? Their walls follow different laws"
        questions.append(Question(f"{key}.vessels", text, ("arteries", "veins", "both"), ("", "", "needs class_array")))
    elif statement.vessels == "both":
        questions.extend(class_questions(contents, statement, key))


def _ask_unit(statement: InputStatement, ranked: tuple[Hypothesis, ...], key: str, questions: list[Question]) -> None:
    """The length unit, with the readings ranked."""
    if statement.length_unit is not None:
        return
    best = _best_by(ranked, "unit", _stated_meaning(statement))
    text = f"{statement.file} does not say its length unit; numbers suggest one and prove none"
    evidence = tuple(_evidence(hypothesis) for hypothesis in best)
    questions.append(Question(f"{key}.length_unit", text, tuple(each.unit for each in best), evidence))


def _ask_meaning(
    statement: InputStatement, ranked: tuple[Hypothesis, ...], size: SizeArray, key: str, questions: list[Question]
) -> None:
    """Radius, diameter or area, with the readings ranked."""
    if statement.size_means is not None:
        return
    inside = [each for each in ranked if statement.length_unit in (None, each.unit)]
    best = _best_by(tuple(inside) or ranked, "meaning", None)
    candidates, evidence = [], []
    for hypothesis in best:
        for meaning, shape in SIZE_MEANINGS.items():
            if hypothesis.meaning == shape:
                candidates.append(meaning)
                evidence.append(_evidence(hypothesis))
    text = (
        f"what does the array '{size.name}' of {statement.file} hold? "
        "A diameter read as a radius divides the resistance by 16"
    )
    questions.append(Question(f"{key}.size_means", text, tuple(candidates), tuple(evidence)))


def _stated_meaning(statement: InputStatement) -> str | None:
    """Radius, diameter or area, where stated."""
    return SIZE_MEANINGS.get(statement.size_means or "")


def _best_by(ranked: tuple[Hypothesis, ...], field: str, meaning: str | None) -> tuple[Hypothesis, ...]:
    """The best reading for every value of a field, best first."""
    best: dict[str, Hypothesis] = {}
    for hypothesis in ranked:
        if meaning in (None, hypothesis.meaning):
            best.setdefault(getattr(hypothesis, field), hypothesis)
    return tuple(best.values())


def _evidence(hypothesis: Hypothesis) -> str:
    """Score and numbers of a reading."""
    score = f"{hypothesis.score:.2f}" if hypothesis.score >= 0.005 else "below 0.01"
    return f"score {score}: {', '.join(hypothesis.evidence)}"


def _scale_findings(
    statement: InputStatement, ranked: tuple[Hypothesis, ...], size: SizeArray, key: str
) -> list[Finding]:
    """Where the numbers speak against the stated unit or meaning."""
    meaning = _stated_meaning(statement)
    fits = [each for each in ranked if statement.length_unit in (None, each.unit) and meaning in (None, each.meaning)]
    if not fits or (statement.length_unit is None and meaning is None):
        return []
    stated, best = fits[0], ranked[0]
    said = f"{statement.file} read as stated ({stated.unit}, {stated.meaning})"
    if stated.impossible:
        message = (
            f"{said}: {'; '.join(stated.impossible)}: no human vessels have that; check length_unit and size_means"
        )
        return [Finding("scale", Severity.ERROR, message, key, value=stated.largest_radius, unit="m")]
    found = []
    if best.score > _RIVAL * stated.score:
        message = (
            f"{said} fits published sizes {_times(best.score, stated.score)} worse than read as {best.unit}, "
            f"{best.meaning}: {', '.join(stated.evidence)}; nothing was rescaled"
        )
        found.append(Finding("scale", Severity.WARNING, message, key, value=stated.median_radius, unit="m"))
    if meaning and len(size.named) == 1 and meaning not in size.named:
        message = f"{statement.file}: size_means says '{statement.size_means}', but the array is called '{size.name}'"
        found.append(Finding("size meaning", Severity.WARNING, message, key))
    return found


def _times(better: float, worse: float) -> str:
    """How many times one score exceeds another, in words that claim no precision."""
    return "more than 1000 times" if better > 1000.0 * worse else f"about {better / worse:.0f} times"


def _frame_findings(statement: InputStatement, posture: str | None) -> list[Finding]:
    """What the frame says, or what its absence costs."""
    if statement.frame is None:
        message = f"{statement.file}: no frame stated; left and right, head and feet, and gravity stay unknown"
        return [] if posture else [Finding("frame", Severity.NOTE, message)]
    if is_right_handed(statement.frame):
        return []
    message = (
        f"{statement.file}: the frame {statement.frame} is left-handed; a reader that takes x, y, z as right-handed "
        "sees a mirror image"
    )
    return [Finding("frame", Severity.WARNING, message)]


def _length_findings(contents: FileContents, statement: InputStatement) -> list[Finding]:
    """Stored lengths that contradict the drawn lines."""
    found = []
    for name, values in contents.cell_arrays.items():
        if "length" not in name.lower() or values.dtype.kind not in "iuf" or values.ndim != 1:
            continue
        drawn = _line_lengths(contents)
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = values / drawn
        usable = np.isfinite(ratio)
        if usable.any() and np.any(np.abs(ratio[usable] / np.median(ratio[usable]) - 1.0) > 0.01):
            message = (
                f"{statement.file}: the array '{name}' is {ratio[usable].min():.3g} to {ratio[usable].max():.3g} times "
                "the drawn length of its line; it is not used, lengths come from the points"
            )
            found.append(Finding("stored length", Severity.WARNING, message))
    return found


def _line_lengths(contents: FileContents) -> FloatArray:
    """Length of every line in the unit of the file."""
    points = np.asarray(contents.points, dtype=np.float64)[contents.connectivity]
    along = np.concatenate(([0.0], np.cumsum(np.sqrt((np.diff(points, axis=0) ** 2).sum(axis=1)))))
    first = np.minimum(contents.offsets[:-1], len(points) - 1)
    last = np.maximum(contents.offsets[1:] - 1, first)
    return along[last] - along[first]


def to_centrelines(
    contents: FileContents,
    statement: InputStatement,
    *,
    key: str = "input[0]",
    posture: str | None = None,
    number: int = 0,
) -> tuple[Centrelines, tuple[Finding, ...]]:
    """Turn a file into centrelines in SI, as the case states and the numbers allow.

    Parameters
    ----------
    contents : FileContents
        The file as read.
    statement : InputStatement
        What the case states about it.
    key : str
        Section of the case, for messages.
    posture : str, optional
        Posture that the case states; it needs the frame.
    number : int
        Number of the input, from 0.

    Returns
    -------
    centrelines : Centrelines
        Positions and radii in metres; sizes on lines also as `line_radius`, and a point
        then has the mean of its lines.
    findings : tuple of Finding
        Contradictions between what is stated and the numbers.

    Raises
    ------
    OpenQuestions
        The case leaves open what the numbers cannot answer.
    FileError, CaseError
        As :func:`gate` raises.
    """
    checked = gate(contents, statement, key=key, posture=posture)
    if checked.questions or checked.size is None:
        raise OpenQuestions(checked.questions)
    factor = length_factor(statement.length_unit or "", f"{key}.length_unit")
    stated = _radii(checked.size.values, _stated_meaning(statement) or "", factor)
    on_lines = checked.size.place == "lines"
    classes, class_findings = line_classes(contents, statement, key)
    raw = np.asarray(contents.points)
    centrelines = Centrelines(
        points=raw.astype(np.float64) * factor,
        radius=_mean_of_lines(contents, stated) if on_lines else stated,
        raw_points=raw,
        connectivity=contents.connectivity,
        offsets=contents.offsets,
        vessel_class=classes,
        input_id=np.full(contents.n_lines, number),
        radius_basis=np.full(len(raw), Basis.MEASURED),
        line_radius=stated if on_lines else None,
        extra=dict(contents.point_arrays),
    )
    return centrelines, (*checked.findings, *class_findings)


def _radii(sizes: npt.NDArray[Any], meaning: str, factor: float) -> FloatArray:
    """Radii in metres; a negative area gives a negative radius, so that it stays visible."""
    values = sizes.astype(np.float64)
    if meaning == "area":
        return np.sign(values) * np.sqrt(np.abs(values) / np.pi) * factor
    return values * (0.5 * factor if meaning == "diameter" else factor)


def _mean_of_lines(contents: FileContents, radius: FloatArray) -> FloatArray:
    """Mean radius of the lines at each point; NaN where no line is."""
    n = len(contents.points)
    along = np.repeat(radius, np.diff(contents.offsets))
    total = np.bincount(contents.connectivity, weights=along, minlength=n)
    count = np.bincount(contents.connectivity, minlength=n)
    mean: FloatArray = np.divide(total, count, out=np.full(n, np.nan), where=count > 0)
    return mean
