"""Copies of sample cases."""

import pytest

from geomprep.case.file import read_case
from geomprep.case.samples import copy_sample, sample_folder, sample_names
from geomprep.errors import InputError


def test_the_series_is_complete():
    assert {"head-arteries", "limb", "neck-veins", "neck-veins-rough"} <= set(sample_names())


@pytest.mark.parametrize("name", ["head-arteries", "limb", "neck-veins", "neck-veins-rough"])
def test_a_copy_is_a_case_of_its_own(name, tmp_path):
    path = copy_sample(name, tmp_path / "demo")
    assert path == tmp_path / "demo" / name / "case.toml"
    assert read_case(path).inputs[0].file
    for source in (sample_folder() / name).iterdir():
        if source.is_file():
            assert (path.parent / source.name).read_bytes() == source.read_bytes()
    assert not (path.parent / "results").exists()


def test_nothing_is_overwritten_and_names_are_listed(tmp_path):
    copy_sample("limb", tmp_path)
    with pytest.raises(InputError, match="is there already"):
        copy_sample("limb", tmp_path)
    with pytest.raises(InputError, match="choose one of head-arteries, limb"):
        copy_sample("nose", tmp_path)
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="cannot be written"):
        copy_sample("limb", tmp_path / "file")
