"""Draw the Saltmere phantom series: invented vessels with sizes from published ranges.

    python make_samples.py [FOLDER]

writes the geometry, names and truth of each sample into FOLDER (this folder where none is
given); the case files stand beside them and are written by hand. The same numpy gives the
same bytes: there is no random number and no date in it.
"""

from __future__ import annotations

import sys
from pathlib import Path

from maker.defects import write_neck_veins_rough
from maker.head_arteries import write_head_arteries
from maker.limb import write_limb
from maker.neck_veins import write_neck_veins

WRITERS = {
    "head-arteries": write_head_arteries,
    "limb": write_limb,
    "neck-veins": write_neck_veins,
    "neck-veins-rough": write_neck_veins_rough,
}
"""Folder of each sample and the function that fills it."""


def make_samples(folder: Path) -> None:
    """Write all samples into sub-folders of a folder."""
    for name, write in WRITERS.items():
        target = folder / name
        target.mkdir(parents=True, exist_ok=True)
        write(target)


if __name__ == "__main__":
    make_samples(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
