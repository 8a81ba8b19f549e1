"""Limits of joining."""

from __future__ import annotations

import pytest

from geomprep.errors import InputError
from geomprep.repair import JoinSettings


@pytest.mark.parametrize(
    ("name", "value", "rule"),
    [
        ("tolerance", -0.1, "at least 0 and below 1"),
        ("tolerance", 1.0, "at least 0 and below 1"),
        ("copies_within", 0.5, "below 0.2"),
        ("joints_within", float("nan"), "at least 0"),
        ("copies_overlap", 0.1, "at least 1"),
        ("copies_radius_ratio", 0.9, "at least 1"),
    ],
)
def test_values_out_of_range_are_refused(name: str, value: float, rule: str) -> None:
    with pytest.raises(InputError, match=rf"repair\.join\.{name} = .*{rule}"):
        JoinSettings(**{name: value})


def test_defaults() -> None:
    settings = JoinSettings()
    assert (settings.tolerance, settings.copies_within, settings.joints_within) == (1e-3, 0.05, 0.1)
