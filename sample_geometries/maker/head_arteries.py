"""Sample ``head-arteries``: carotid and vertebral arteries, the ring at the base of the brain, first branches.

Lengths in mm; origin in the midline at the height of the sella. The left side is written
out; the right side is its mirror with its own calibres and course. The right posterior
communicating artery is missing, so the ring is open and the network holds no loop.

Published sizes the vessels were drawn into (diameters in mm; "seen" = read in public text):

- ring: Shatri 2017, doi:10.3889/oamjms.2017.160, min-max, seen: ACA A1 1.1-2.93 (length 9.9-21),
  ACoA 0.9-2.4 (0.9-4.9), MCA M1 2.45-4.34 (13.2-21.6), ICA 2.81-4.2 near its end, PCoA 0.9-2.1
  (10-16.4), PCA P1 0.9-2.8 (3.2-9.9), basilar 1.9-4.15 (23.6-35.6);
- internal carotid: Baz 2021, doi:10.3390/medicina57080832, seen: sinus 7.59 ± 1.00, distal
  cervical 4.67 ± 0.47, first intracranial 4.53 ± 0.47, length 150 ± 20 (women) 161 ± 29 (men);
- cavernous part 5.0 ± 0.6, M2 2.4 ± 0.4: J NeuroIntervent Surg 5:371, seen second-hand;
- vertebral: 1.5-5.0, proximal 3.9 ± 0.8, distal 2.8 ± 0.6: J NeuroIntervent Surg 5:597, seen second-hand;
- ophthalmic about 1.4, A2 about 2.2, P2 about 2.0: memory.
"""

from __future__ import annotations

from pathlib import Path

from maker.lines import private_copies, write_xml
from maker.tree import Phantom, Track, cut, mirrored
from maker.truth import truth, write_names, write_truth

__all__ = ["head_arteries", "write_head_arteries"]

_DECIMALS = 3
_SUPRACLINOID = "left supraclinoid carotid artery"  # the part inside the dura, from the ophthalmic artery on
_RIGHT_CAROTID = ("right internal carotid artery", "right supraclinoid carotid artery")

_BASILAR = Track(
    ("basilar artery",),
    (
        (0.0, 24.5, -29.0, 1.72, "vertebrobasilar junction"),
        (0.7, 20.6, -22.0, 1.70),
        (0.9, 15.4, -13.0, 1.64),
        (0.2, 10.6, -5.2, 1.58),
        (0.0, 8.5, -1.0, 1.55, "basilar tip"),
    ),
)
_ACOA = Track(
    ("anterior communicating artery",),
    (
        (1.45, -13.4, 8.2, 0.74, "left A1 end"),
        (0.1, -13.75, 8.3, 0.72),
        (-1.45, -13.4, 8.2, 0.74, "right A1 end"),
    ),
)
_CAROTID = Track(
    ("left internal carotid artery", _SUPRACLINOID, _SUPRACLINOID),
    (
        (25.5, 9.0, -97.0, 3.40, "left carotid bifurcation"),
        (26.8, 10.8, -91.0, 3.75),
        (28.0, 12.8, -82.0, 2.80),
        (27.8, 14.2, -70.0, 2.42),
        (28.8, 16.2, -57.0, 2.36),
        (27.4, 15.8, -45.0, 2.34),
        (26.2, 13.8, -36.0, 2.32),
        (25.2, 12.0, -29.6, 2.30),
        (22.4, 9.2, -25.4, 2.30),
        (16.6, 5.6, -23.6, 2.30),
        (13.4, 3.8, -20.0, 2.33),
        (12.4, 3.0, -14.0, 2.42),
        (11.9, -0.4, -10.0, 2.45),
        (11.4, -7.2, -9.6, 2.40),
        (10.8, -12.8, -8.0, 2.32),
        (10.4, -14.2, -4.4, 2.25),
        (10.5, -11.4, -1.2, 2.12, "left ophthalmic origin"),
        (10.9, -8.2, 0.5, 2.00, "left PCoA origin"),
        (11.6, -5.6, 2.5, 1.92),
        (12.4, -3.4, 5.0, 1.85, "left carotid terminus"),
    ),
)
_VERTEBRAL = Track(
    ("left vertebral artery",),
    (
        (23.0, 24.0, -176.0, 2.05, "left vertebral origin"),
        (24.6, 28.6, -160.0, 1.98),
        (26.0, 30.6, -138.0, 1.92),
        (26.2, 28.4, -118.0, 1.88),
        (26.6, 27.2, -100.0, 1.85),
        (26.6, 28.6, -83.0, 1.82),
        (28.0, 31.4, -68.0, 1.80),
        (33.4, 34.2, -57.6, 1.78),
        (37.0, 37.6, -50.0, 1.76),
        (36.0, 43.6, -45.2, 1.74),
        (29.2, 48.6, -44.6, 1.72),
        (20.4, 48.6, -45.4, 1.70),
        (13.4, 45.2, -43.2, 1.66),
        (8.0, 38.2, -38.2, 1.60),
        (3.6, 30.0, -32.4, 1.55),
        (0.0, 24.5, -29.0, 1.52, "vertebrobasilar junction"),
    ),
)
_MIDDLE_CEREBRAL = (
    Track(
        ("left middle cerebral artery M1",),
        (
            (12.4, -3.4, 5.0, 1.60, "left carotid terminus"),
            (16.6, -5.6, 6.4, 1.58),
            (22.0, -6.8, 6.0, 1.50),
            (27.6, -5.4, 6.6, 1.44, "left M1 fork"),
        ),
    ),
    Track(
        ("left middle cerebral artery M2 superior",),
        (
            (27.6, -5.4, 6.6, 1.22, "left M1 fork"),
            (30.6, -7.2, 9.6, 1.20),
            (33.8, -10.2, 16.6, 1.14),
            (36.0, -11.4, 25.6, 1.06),
            (38.8, -8.6, 34.0, 0.98),
            (43.4, -5.0, 39.6, 0.92, "left M2 superior end"),
        ),
    ),
    Track(
        ("left middle cerebral artery M2 inferior",),
        (
            (27.6, -5.4, 6.6, 1.18, "left M1 fork"),
            (31.6, -2.4, 8.2, 1.16),
            (35.4, 4.4, 12.4, 1.10),
            (37.8, 13.2, 17.8, 1.03),
            (40.2, 22.6, 22.4, 0.96),
            (44.4, 30.2, 25.2, 0.90, "left M2 inferior end"),
        ),
    ),
)
_ANTERIOR_CEREBRAL = (
    Track(
        ("left anterior cerebral artery A1", "left anterior cerebral artery A2"),
        (
            (12.4, -3.4, 5.0, 1.10, "left carotid terminus"),
            (9.4, -7.8, 5.6, 1.08),
            (5.2, -11.4, 6.8, 1.05),
            (1.45, -13.4, 8.2, 1.04, "left A1 end"),
            (1.9, -17.8, 11.6, 1.10),
            (2.2, -25.4, 18.6, 1.06),
            (2.4, -30.4, 28.4, 1.00),
            (2.6, -28.0, 38.0, 0.95),
            (3.0, -20.4, 44.4, 0.90, "left A2 end"),
        ),
    ),
)
_POSTERIOR_CEREBRAL = Track(
    ("left posterior cerebral artery P1", "left posterior cerebral artery P2"),
    (
        (0.0, 8.5, -1.0, 1.03, "basilar tip"),
        (3.2, 8.2, -0.2, 1.02),
        (6.4, 7.0, 0.5, 1.00, "left PCoA end"),
        (11.4, 10.2, 0.0, 1.03),
        (17.2, 18.4, 0.8, 1.00),
        (20.0, 28.4, 4.0, 0.95),
        (17.8, 38.2, 8.6, 0.90),
        (13.0, 46.6, 12.4, 0.85, "left P2 end"),
    ),
)
_PCOA = Track(
    ("left posterior communicating artery",),
    (
        (10.9, -8.2, 0.5, 0.68, "left PCoA origin"),
        (9.6, -4.4, -0.9, 0.64),
        (7.9, 2.0, -0.6, 0.60),
        (6.4, 7.0, 0.5, 0.62, "left PCoA end"),
    ),
)
_OPHTHALMIC = Track(
    ("left ophthalmic artery",),
    (
        (10.5, -11.4, -1.2, 0.72, "left ophthalmic origin"),
        (10.4, -15.2, 0.4, 0.71),
        (12.4, -21.4, -0.8, 0.68),
        (15.8, -29.0, -2.2, 0.63),
        (18.6, -36.6, -0.8, 0.58, "left ophthalmic end"),
    ),
)


def _right_side() -> tuple[Track, ...]:
    """Right side: mirrored, with its own calibres and course, and without the posterior communicating artery."""
    return (
        mirrored(_CAROTID, 1.02, (0.9, -1.1, 0.3), "left PCoA origin", _RIGHT_CAROTID),
        mirrored(_OPHTHALMIC, 0.97, (-0.4, 0.0, 0.5)),
        mirrored(_VERTEBRAL, 0.85, (0.8, 1.2, -1.5)),
        *(mirrored(track, 0.98, (-0.6, 0.9, -0.7)) for track in _MIDDLE_CEREBRAL),
        *(mirrored(track, 0.93, (-0.3, 0.9, 0.8)) for track in _ANTERIOR_CEREBRAL),
        mirrored(_POSTERIOR_CEREBRAL, 1.03, (0.5, -0.7, 0.6), "left PCoA end", ("right posterior cerebral artery",)),
    )


def head_arteries() -> Phantom:
    """Arteries from the carotid bifurcations and the origins of the vertebrals, every 0.7 mm."""
    left = (_CAROTID, _OPHTHALMIC, _VERTEBRAL, *_MIDDLE_CEREBRAL, *_ANTERIOR_CEREBRAL, _POSTERIOR_CEREBRAL, _PCOA)
    return Phantom("head-arteries", "mm", cut((*left, _BASILAR, _ACOA, *_right_side()), 0.7, _DECIMALS))


def write_head_arteries(folder: Path) -> None:
    """Write arteries, names and truth of the sample into an existing folder."""
    phantom = head_arteries()
    drawn = private_copies(phantom)
    write_xml(drawn, folder / "arteries.vtp", "radius", _DECIMALS)
    write_names(phantom, folder, _DECIMALS)
    content = truth(phantom)
    content["points"], content["lines"] = len(drawn.points), len(drawn.lines)
    content["missing"] = ["right posterior communicating artery"]
    write_truth(content, folder)
