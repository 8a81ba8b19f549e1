"""What is done with a candidate: a recorded choice first, then the rule of its step."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, Repair

__all__ = ["OPEN", "PERSON", "RULE", "Verdict", "Verdicts", "Zones", "settled"]

RULE, PERSON, OPEN = "rule", "person", "open"
"""Who decided: the rule of the step, a person, or nobody yet (left as in the input)."""


@dataclass(frozen=True)
class Verdict:
    """A choice and who made it (:data:`RULE` or :data:`PERSON`)."""

    choice: str
    by: str


@dataclass(frozen=True)
class Zones:
    """Scores above which a candidate is accepted, and above which it is asked; below, it is refused.

    Raises
    ------
    InputError
        A limit lies outside 0 … 1, or they are in the wrong order.

    Examples
    --------
    >>> Zones(0.8, 0.3).of(np.array([0.9, 0.5, 0.1])).tolist()
    ['accept', 'ask', 'refuse']
    """

    accept_above: float
    ask_above: float

    def __post_init__(self) -> None:
        """Refuse limits that make no zones."""
        if not 0.0 <= self.ask_above <= self.accept_above <= 1.0:
            raise InputError(
                f"ask_above = {self.ask_above:g}, accept_above = {self.accept_above:g}: "
                "0 <= ask_above <= accept_above <= 1 is needed"
            )

    def of(self, score: FloatArray) -> np.ndarray[tuple[int], np.dtype[np.str_]]:
        """Return the zone of each score."""
        return np.where(score >= self.accept_above, "accept", np.where(score >= self.ask_above, "ask", "refuse"))


@dataclass(frozen=True)
class Verdicts:
    """Recorded choices by the id of their candidate.

    A person's decision goes before the verdict of an earlier build, and both before any rule: a
    replay on the raw input gives the same network even when thresholds have moved.

    Attributes
    ----------
    recorded : mapping of str to Verdict
    complete : bool
        True where the record holds every verdict of an earlier build: what it does not know is left alone,
        whatever the thresholds say today.
    """

    recorded: Mapping[str, Verdict] = field(default_factory=dict)
    complete: bool = False

    def wanted(self, key: str, proposed: bool) -> bool:
        """Return whether a candidate takes part: recorded, or proposed or asked by a rule that still counts."""
        return key in self.recorded or (proposed and not self.complete)

    def settle(self, key: str, options: tuple[str, ...], proposal: str | None) -> Verdict:
        """Return what is done with one candidate.

        Parameters
        ----------
        key : str
            Id of the candidate.
        options : tuple of str
            What can be done; the first leaves things as in the input.
        proposal : str, optional
            Choice of the rule; None where a person is asked.

        Returns
        -------
        Verdict
            An undecided question is left as in the input.

        Raises
        ------
        InputError
            The recorded choice is none of the options.

        Examples
        --------
        >>> verdicts = Verdicts({"gap-1": Verdict("join", "person")})
        >>> verdicts.settle("gap-1", ("leave", "join"), None)
        Verdict(choice='join', by='person')
        >>> verdicts.settle("gap-2", ("leave", "join"), None)
        Verdict(choice='leave', by='open')
        """
        found = self.recorded.get(key)
        if found is not None:
            if found.choice not in options:
                raise InputError(
                    f"decision on {key}: '{found.choice}' is no choice there; choose {' | '.join(options)}"
                )
            return found
        if self.complete:
            return Verdict(options[0], RULE)
        if proposal is None:
            return Verdict(options[0], OPEN)
        return Verdict(proposal, RULE)

    def unknown(self, seen: Iterable[str]) -> tuple[Finding, ...]:
        """Report decisions of a person on ids that do not occur (any more).

        Parameters
        ----------
        seen : iterable of str
            Ids of all candidates of this run.
        """
        known = set(seen)
        return tuple(
            Finding(
                "unknown decision",
                Severity.WARNING,
                f"A decision on '{key}' was recorded, but nothing of that id was found in this input: no effect.",
                where=key,
            )
            for key, verdict in sorted(self.recorded.items())
            if verdict.by == PERSON and key not in known
        )


def settled(repairs: tuple[Repair, ...], verdicts: Verdicts) -> tuple[Repair, ...]:
    """Return proposed repairs with recorded choices in the place of the rule's.

    Parameters
    ----------
    repairs : tuple of Repair
        As the rule would make them.
    verdicts : Verdicts

    Returns
    -------
    tuple of Repair
        A repair that is left keeps its conductance as it was before.
    """
    if not verdicts.recorded:
        return repairs
    return tuple(_settled_one(repair, verdicts) for repair in repairs)


def _settled_one(repair: Repair, verdicts: Verdicts) -> Repair:
    """One repair with its recorded choice."""
    verdict = verdicts.settle(repair.id, repair.options, repair.choice)
    if verdict.choice == repair.choice:
        return replace(repair, verdict_by=verdict.by)
    return replace(
        repair, choice=verdict.choice, verdict_by=verdict.by, conductance_after=repair.conductance_before, raw_points=()
    )
