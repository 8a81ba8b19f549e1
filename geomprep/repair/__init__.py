"""Repair: lines joined into one graph, and one step per defect."""

from geomprep.repair.join import JoinResult, join
from geomprep.repair.radius import RadiusResult, RadiusSettings, mend_radii
from geomprep.repair.settings import JoinSettings
from geomprep.repair.steps import Step, StepResult, run_steps
from geomprep.repair.verdicts import OPEN, PERSON, RULE, Verdict, Verdicts, Zones

__all__ = [
    "OPEN",
    "PERSON",
    "RULE",
    "JoinResult",
    "JoinSettings",
    "RadiusResult",
    "RadiusSettings",
    "Step",
    "StepResult",
    "Verdict",
    "Verdicts",
    "Zones",
    "join",
    "mend_radii",
    "run_steps",
]
