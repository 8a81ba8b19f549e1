"""The reference pages are what the tables say."""

import runpy
from pathlib import Path

import pytest

DOCS = Path(__file__).parent.parent.parent / "docs"
PAGES = runpy.run_path(str(DOCS / "make_reference.py"))["PAGES"]


@pytest.mark.parametrize("name", sorted(PAGES))
def test_page_is_made_from_its_table(name: str) -> None:
    assert (DOCS / name).read_text(encoding="utf-8") == PAGES[name](), (
        f"run python docs/make_reference.py: {name} is old"
    )
