"""Formulas on arrays: tube laws, stiffness relations, lumped values, profiles, splits.

No network, no tables, no units but SI. Import the module that holds a formula, such as
``from geomprep.laws import tube``.
"""

from geomprep.laws import blood, fittings, lumped, power_pair, reference_state, shapes, splits, stiffness, tube

__all__ = ["blood", "fittings", "lumped", "power_pair", "reference_state", "shapes", "splits", "stiffness", "tube"]
