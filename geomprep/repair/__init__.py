"""Repair: lines joined into one graph, and one step per defect."""

from geomprep.repair.join import JoinResult, join
from geomprep.repair.radius import RadiusResult, RadiusSettings, mend_radii
from geomprep.repair.settings import JoinSettings
from geomprep.repair.steps import Given, Step, StepResult, run_steps
from geomprep.repair.table import STEPS, StepRow, mend_graph
from geomprep.repair.verdicts import OPEN, PERSON, RULE, Verdict, Verdicts, Zones

__all__ = [
    "OPEN",
    "PERSON",
    "RULE",
    "STEPS",
    "Given",
    "JoinResult",
    "JoinSettings",
    "RadiusResult",
    "RadiusSettings",
    "Step",
    "StepResult",
    "StepRow",
    "Verdict",
    "Verdicts",
    "Zones",
    "join",
    "mend_graph",
    "mend_radii",
    "run_steps",
]
