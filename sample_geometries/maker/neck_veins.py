"""Sample ``neck-veins``: dural sinuses and neck veins with a narrowed right and a small left side.

Lengths in mm, in the frame of the sample ``head-arteries`` (origin at the sella), lying
supine. The right transverse sinus is narrowed before it becomes the sigmoid sinus; the left
one is small throughout. The occipital sinus, the marginal sinuses around the foramen magnum, the
condylar veins and the vertebral veins form a way around both, so the network has two loops.

Published sizes the vessels were drawn into ("seen" = read in public text):

- transverse sinus, diameter: right 6.65 ± 1.57, left 5.37 ± 1.35: doi:10.3868/j.issn.2096-0689.2024.01.003, seen;
  small (hypoplastic) below 50 % of the superior sagittal sinus at its end: PMID 29097057, seen;
- superior sagittal sinus 36.65 ± 12.38 mm² (equal-area diameter 6.8): PMID 28286027, seen, unit not printed;
- internal jugular, men, area from C2/C3 to C7/T1 in mm²: right 41.6 to 82.0, left 28.0 to 52.2
  (diameters 7.3 to 10.2, 6.0 to 8.2): Magnano 2016, doi:10.1371/journal.pone.0149532, seen;
- place of the narrowing: 93 % of gradients sit where the transverse sinus becomes the sigmoid:
  Fargen 2020, doi:10.1136/neurintsurg-2019-015251, seen;
- straight sinus 3-5, inferior anastomotic vein 2-4, superior petrosal sinus about 2, occipital and
  marginal sinuses about 2, condylar vein about 2-3, vertebral vein 2-3.5: memory.
"""

from __future__ import annotations

from pathlib import Path

from maker.lines import repeated_trunks, write_xml
from maker.tree import Phantom, Track, cut
from maker.truth import truth, write_names, write_truth

__all__ = ["NARROWED_PLACE", "neck_veins", "write_neck_veins"]

_DECIMALS = 3
NARROWED_PLACE = (-52.6, 49.0, -6.8)
"""Middle of the narrowed stretch of the right transverse sinus."""

_MIDLINE = (
    Track(
        ("superior sagittal sinus",),
        (
            (0.0, -30.0, 80.3, 2.30, "superior sagittal start"),
            (0.3, -8.0, 92.9, 2.50),
            (0.2, 15.0, 97.0, 2.70),
            (-0.3, 40.0, 92.1, 2.95),
            (-0.6, 62.0, 78.5, 3.15),
            (-0.8, 80.0, 56.6, 3.30),
            (-1.1, 90.2, 33.4, 3.40),
            (-1.4, 94.6, 12.0, 3.42),
            (-1.5, 93.0, -2.0, 3.45, "confluence"),
        ),
    ),
    Track(
        ("straight sinus",),
        (
            (0.0, 44.0, 22.0, 1.70, "straight sinus start"),
            (-0.1, 57.0, 17.8, 1.80),
            (-0.6, 75.5, 9.6, 1.95),
            (-1.5, 93.0, -2.0, 2.05, "confluence"),
        ),
    ),
    Track(
        ("occipital sinus",),
        (
            (-1.5, 93.0, -2.0, 1.25, "confluence"),
            (-0.8, 89.4, -13.0, 1.15),
            (0.1, 81.4, -24.2, 1.05),
            (0.3, 71.8, -33.2, 1.05),
            (0.0, 64.0, -39.0, 1.10, "opisthion"),
        ),
    ),
)
_RIGHT = (
    Track(
        ("right transverse sinus", "right transverse sinus", "right sigmoid sinus", "right internal jugular vein"),
        (
            (-1.5, 93.0, -2.0, 3.45, "confluence"),
            (-11.0, 93.6, -3.2, 3.50),
            (-27.0, 87.4, -4.2, 3.60),
            (-43.0, 73.0, -4.2, 3.60, "right cortical joint"),
            (-47.6, 65.4, -4.4, 3.40),
            (-50.2, 59.2, -5.0, 2.50),
            (-51.8, 53.6, -5.8, 1.60),
            (*NARROWED_PLACE, 1.50),
            (-53.0, 45.4, -7.8, 2.35),
            (-53.0, 42.0, -9.4, 3.20, "right petrosal joint"),
            (-51.6, 37.6, -14.6, 3.60),
            (-48.6, 35.0, -22.2, 3.65),
            (-44.2, 35.2, -30.2, 3.70),
            (-39.4, 34.2, -36.4, 3.85),
            (-34.6, 30.4, -40.0, 4.25),
            (-31.9, 26.4, -44.2, 4.35, "right jugular bulb"),
            (-31.6, 23.6, -50.0, 4.05),
            (-33.2, 22.2, -61.0, 3.70),
            (-35.0, 20.6, -76.0, 3.64),
            (-36.0, 18.2, -95.0, 3.90),
            (-35.0, 15.4, -118.0, 4.40),
            (-32.6, 13.4, -140.0, 4.85),
            (-30.0, 13.6, -160.0, 5.10),
            (-27.6, 15.8, -180.0, 5.15, "right jugular end"),
        ),
    ),
    Track(
        ("right inferior anastomotic vein",),
        (
            (-57.0, 10.0, 36.0, 1.25, "right cortical start"),
            (-61.0, 21.0, 21.0, 1.35),
            (-60.0, 38.0, 8.0, 1.45),
            (-50.8, 60.6, 3.6, 1.55),
            (-43.0, 73.0, -4.2, 1.60, "right cortical joint"),
        ),
    ),
    Track(
        ("right superior petrosal sinus",),
        (
            (-15.0, 7.0, -7.0, 0.95, "right petrosal start"),
            (-26.0, 17.4, -8.4, 0.98),
            (-38.0, 28.0, -7.6, 1.02),
            (-47.0, 36.4, -8.0, 1.08),
            (-53.0, 42.0, -9.4, 1.10, "right petrosal joint"),
        ),
    ),
    Track(
        ("right condylar vein",),
        (
            (-31.9, 26.4, -44.2, 1.30, "right jugular bulb"),
            (-26.8, 31.4, -43.4, 1.25),
            (-23.4, 39.4, -45.8, 1.20),
            (-24.5, 47.0, -51.0, 1.25, "right suboccipital plexus"),
        ),
    ),
    Track(
        ("right marginal sinus", "right vertebral vein"),
        (
            (0.0, 64.0, -39.0, 1.00, "opisthion"),
            (-8.2, 62.2, -41.2, 0.98),
            (-15.0, 56.2, -44.6, 0.98),
            (-19.2, 51.2, -48.4, 1.00),
            (-24.5, 47.0, -51.0, 1.10, "right suboccipital plexus"),
            (-29.0, 42.0, -57.6, 1.20),
            (-29.8, 37.4, -67.8, 1.25),
            (-28.8, 34.2, -84.0, 1.30),
            (-28.8, 32.6, -102.0, 1.35),
            (-28.6, 33.6, -120.0, 1.42),
            (-28.2, 35.6, -140.0, 1.50),
            (-27.6, 33.8, -158.0, 1.58),
            (-27.6, 28.8, -174.0, 1.65),
            (-27.0, 23.8, -186.0, 1.70, "right vertebral end"),
        ),
    ),
)
_LEFT = (
    Track(
        ("left transverse sinus", "left transverse sinus", "left sigmoid sinus", "left internal jugular vein"),
        (
            (-1.5, 93.0, -2.0, 1.80, "confluence"),
            (9.0, 93.8, -2.2, 1.55),
            (26.4, 87.8, -3.0, 1.50),
            (43.4, 72.6, -3.8, 1.55, "left cortical joint"),
            (49.8, 59.4, -5.2, 1.60),
            (52.4, 49.0, -7.0, 1.70),
            (53.0, 42.2, -9.6, 1.80, "left petrosal joint"),
            (51.8, 37.8, -14.8, 2.05),
            (48.8, 35.2, -22.4, 2.25),
            (44.4, 35.4, -30.4, 2.40),
            (39.4, 34.2, -36.6, 2.60),
            (34.4, 30.2, -40.0, 2.90),
            (31.6, 26.4, -43.8, 3.10, "left jugular bulb"),
            (31.2, 23.6, -49.6, 3.02),
            (32.8, 22.2, -60.6, 2.95),
            (34.6, 20.4, -76.0, 2.98),
            (35.6, 18.0, -95.0, 3.15),
            (34.8, 15.6, -118.0, 3.45),
            (32.8, 13.8, -140.0, 3.80),
            (30.4, 14.2, -160.0, 4.05),
            (28.0, 16.6, -180.0, 4.10, "left jugular end"),
        ),
    ),
    Track(
        ("left inferior anastomotic vein",),
        (
            (58.0, 8.0, 32.0, 1.20, "left cortical start"),
            (61.6, 20.0, 19.0, 1.30),
            (60.0, 38.6, 7.4, 1.38),
            (50.8, 60.8, 3.8, 1.45),
            (43.4, 72.6, -3.8, 1.50, "left cortical joint"),
        ),
    ),
    Track(
        ("left superior petrosal sinus",),
        (
            (15.0, 7.2, -7.2, 0.90, "left petrosal start"),
            (25.6, 17.8, -8.2, 0.94),
            (37.6, 28.4, -7.8, 0.98),
            (47.0, 36.8, -8.2, 1.02),
            (53.0, 42.2, -9.6, 1.05, "left petrosal joint"),
        ),
    ),
    Track(
        ("left condylar vein",),
        (
            (31.6, 26.4, -43.8, 1.55, "left jugular bulb"),
            (26.6, 31.6, -43.6, 1.50),
            (23.2, 39.2, -46.2, 1.45),
            (24.3, 46.6, -51.2, 1.45, "left suboccipital plexus"),
        ),
    ),
    Track(
        ("left marginal sinus", "left vertebral vein"),
        (
            (0.0, 64.0, -39.0, 1.05, "opisthion"),
            (8.4, 62.4, -41.0, 1.02),
            (15.2, 56.2, -44.8, 1.02),
            (19.2, 51.0, -48.6, 1.05),
            (24.3, 46.6, -51.2, 1.15, "left suboccipital plexus"),
            (28.8, 41.6, -57.8, 1.25),
            (29.6, 37.0, -68.0, 1.30),
            (28.8, 34.0, -84.0, 1.35),
            (28.6, 32.8, -102.0, 1.42),
            (28.4, 34.0, -120.0, 1.50),
            (28.0, 36.0, -140.0, 1.58),
            (27.4, 34.2, -158.0, 1.65),
            (27.6, 29.2, -174.0, 1.72),
            (27.2, 24.0, -186.0, 1.78, "left vertebral end"),
        ),
    ),
)


def _routes() -> tuple[tuple[str, ...], ...]:
    """Ways from inlets to outlets that together cover every segment."""
    routes = []
    for side, start in (("right", "superior sagittal start"), ("left", "straight sinus start")):
        bulb = f"{side} jugular bulb"
        leave = (f"{side} suboccipital plexus", f"{side} vertebral end")
        routes += [
            (start, "confluence", f"{side} cortical joint", f"{side} petrosal joint", bulb, f"{side} jugular end"),
            (f"{side} cortical start", f"{side} cortical joint", f"{side} petrosal joint", bulb, *leave),
            (f"{side} petrosal start", f"{side} petrosal joint", bulb, f"{side} jugular end"),
            (start, "confluence", "opisthion", *leave),
        ]
    return tuple(routes)


def neck_veins() -> Phantom:
    """Sinuses from the vertex and the great cerebral vein down to the ends of the neck veins, every millimetre."""
    return Phantom("neck-veins", "mm", cut((*_MIDLINE, *_RIGHT, *_LEFT), 1.0, _DECIMALS))


def write_neck_veins(folder: Path) -> None:
    """Write veins, names and truth of the sample into an existing folder."""
    phantom = neck_veins()
    drawn = repeated_trunks(phantom, _routes())
    write_xml(drawn, folder / "veins.vtp", "radius", _DECIMALS)
    write_names(phantom, folder, _DECIMALS)
    content = truth(phantom)
    content["points"], content["lines"] = len(drawn.points), len(drawn.lines)
    content["narrowings"] = [
        {"vessel": "right transverse sinus", "position": list(NARROWED_PLACE), "minimum_radius": 1.5}
    ]
    write_truth(content, folder)
