"""Decisions are appended, never changed; the last one counts."""

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomprep.case.decisions import WITHDRAWN, append_decision, read_decisions, standing
from geomprep.errors import InputError
from geomprep.model import Decision


def test_last_entry_wins_and_withdrawing_takes_back(tmp_path: Path) -> None:
    append_decision(tmp_path, Decision("gap-1", "join", "same vessel", "B, modeller"))
    first = (tmp_path / "decisions.toml").read_bytes()
    append_decision(tmp_path, Decision("gap-1", "leave", "no, a fold", "A, radiologist"))
    append_decision(tmp_path, Decision("gap-2", "join", "", "B, modeller"))
    assert (tmp_path / "decisions.toml").read_bytes().startswith(first)
    assert standing(read_decisions(tmp_path))["gap-1"].choice == "leave"
    append_decision(tmp_path, Decision("gap-1", WITHDRAWN, "", "B, modeller"))
    assert list(standing(read_decisions(tmp_path))) == ["gap-2"]
    assert len(read_decisions(tmp_path)) == 4


@given(st.text(max_size=60))
@settings(max_examples=60, derandomize=True, deadline=None)
def test_any_text_comes_back(text: str) -> None:
    import tempfile

    try:
        text.encode()
    except UnicodeEncodeError:
        return  # a lone surrogate is no text that a file can hold
    with tempfile.TemporaryDirectory() as folder:
        append_decision(Path(folder), Decision("id", "choice", text, "name"))
        assert read_decisions(Path(folder))[0].note == text


@pytest.mark.parametrize(
    "text",
    ["[[decision]]\nid = 'a'\n", "broken = [", "[[decision]]\nid=1\nchoice=''\nnote=''\nrecorded_by=''\n", "x = 1"],
)
def test_a_broken_file_is_refused_and_kept(tmp_path: Path, text: str) -> None:
    (tmp_path / "decisions.toml").write_text(text)
    with pytest.raises(InputError, match=r"decisions\.toml"):
        append_decision(tmp_path, Decision("a", "b", "c", "d"))
    assert (tmp_path / "decisions.toml").read_text() == text
