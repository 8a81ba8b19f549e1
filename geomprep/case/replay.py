"""Verdicts and settings of repairs: those of the case, or those on the record of an earlier build."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any

from geomprep.case.decisions import read_decisions, standing
from geomprep.case.sections import Case
from geomprep.errors import InputError
from geomprep.export import SettingRecord
from geomprep.repair import PERSON, STEPS, JoinSettings, RadiusSettings, Verdict, Verdicts

__all__ = ["RepairRules", "repair_rules"]

_KINDS: dict[str, type[Any]] = {
    "join": JoinSettings,
    "radius": RadiusSettings,
    **{row.name: row.settings for row in STEPS},
}
"""Step -> its settings."""


@dataclass(frozen=True, eq=False)
class RepairRules:
    """What decides on repairs.

    Attributes
    ----------
    settings : mapping of str to settings
        By the name of the step.
    verdicts : Verdicts
    """

    settings: Mapping[str, Any]
    verdicts: Verdicts

    @property
    def records(self) -> tuple[SettingRecord, ...]:
        """Every setting of every step, for the network file."""
        return tuple(
            SettingRecord(step, field.name, json.dumps(getattr(settings, field.name)))
            for step, settings in self.settings.items()
            for field in fields(settings)
        )


def repair_rules(case: Case) -> RepairRules:
    """Return the rules of a case.

    Where ``[repair.replay]`` names a network file, its settings and all of its verdicts hold, and what it does
    not know is left alone; decisions beside the case go before them.

    Parameters
    ----------
    case : Case

    Raises
    ------
    InputError
        The network file or the decisions cannot be read.
    """
    decided = {key: Verdict(one.choice, PERSON) for key, one in standing(read_decisions(case.folder)).items()}
    if case.replay.network is None:
        settings = {
            "join": _stated(case.join, JoinSettings),
            "radius": _stated(case.radius, RadiusSettings),
            **case.steps,
        }
        return RepairRules(settings, Verdicts(decided))
    settings, recorded = _read_record(case.folder / case.replay.network)
    return RepairRules(settings, Verdicts({**recorded, **decided}, complete=True))


def _stated(section: object, kind: type[Any]) -> Any:
    """Settings of a step: what the case states, defaults for the rest."""
    return kind(**{name: value for name, value in vars(section).items() if value is not None})


def _read_record(file: Path) -> tuple[dict[str, Any], dict[str, Verdict]]:
    """Settings and verdicts of a network file."""
    try:
        document = json.loads(file.read_bytes())
        rows = [(row["step"], row["key"], json.loads(row["value"])) for row in document["provenance"]["settings"]]
        stated: dict[str, dict[str, Any]] = {step: {} for step in _KINDS}
        for step, key, value in rows:
            stated[step][key] = value
        settings = {step: kind(**stated[step]) for step, kind in _KINDS.items()}
        verdicts = {row["id"]: Verdict(str(row["choice"]), str(row["verdict_by"])) for row in document["repairs"]}
    except (OSError, ValueError, KeyError, TypeError) as fault:
        raise InputError(
            f"repair.replay.network = '{file.name}': no record of repairs can be read from it ({fault}); "
            "name the network.json of an earlier build, or leave the section out"
        ) from fault
    return settings, verdicts
