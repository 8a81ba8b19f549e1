"""Repair: lines joined into one graph, and one step per defect."""

from geomprep.repair.join import JoinResult, join
from geomprep.repair.settings import JoinSettings

__all__ = ["JoinResult", "JoinSettings", "join"]
