"""Sample ``limb``: the arteries of a left arm in centimetres, supine, palm to the front.

Sizes follow the arm of a healthy woman of 25 years in Front Physiol 2021;12:734311,
doi:10.3389/fphys.2021.734311, table 2, rows 21-25 (seen; radii in cm): subclavian to
brachial 0.410 to 0.228 over 39.8, radial 0.175 to 0.140 over 22.0, ulnar 0.215 over 6.7 and
0.203 to 0.180 over 17.0, interosseous 0.100 over 7.0. The deep brachial artery is not in that
table; its 0.14 cm comes from memory. Positions are invented: the artery runs from
the outer border of the first rib through the axilla, along the inner side of the humerus and
in front of the elbow; the radial artery goes to the thumb's side, which is the outer (left)
one here, and the deep brachial artery winds behind the humerus to its outer side.
"""

from __future__ import annotations

from pathlib import Path

from maker.lines import shared_points, write_legacy
from maker.tree import Phantom, Track, cut
from maker.truth import truth, write_names, write_truth

__all__ = ["limb", "write_limb"]

_DECIMALS = 4  # a thousandth of a millimetre in cm

_TRACKS = (
    Track(
        ("left axillary artery", "left brachial artery"),
        (
            (7.4, -0.6, 2.2, 0.385, "first rib"),
            (9.8, -0.9, 1.9, 0.375),
            (12.6, 0.2, 0.2, 0.355),
            (14.9, 1.3, -3.6, 0.325),
            (15.9, 1.6, -8.4, 0.300, "deep brachial origin"),
            (16.6, 1.3, -14.5, 0.275),
            (17.3, 0.4, -21.5, 0.255),
            (18.3, -0.9, -27.6, 0.242),
            (18.8, -1.4, -31.4, 0.235, "elbow fork"),
        ),
    ),
    Track(
        ("left deep brachial artery",),
        (
            (15.9, 1.6, -8.4, 0.140, "deep brachial origin"),
            (16.3, 2.7, -10.4, 0.135),
            (17.6, 3.5, -14.0, 0.125),
            (19.1, 3.1, -18.2, 0.112),
            (20.0, 1.8, -22.4, 0.100),
            (20.3, 0.6, -25.6, 0.090, "deep brachial end"),
        ),
    ),
    Track(
        ("left radial artery",),
        (
            (18.8, -1.4, -31.4, 0.175, "elbow fork"),
            (19.7, -1.9, -33.6, 0.172),
            (20.8, -2.0, -38.0, 0.164),
            (21.6, -1.7, -44.0, 0.152),
            (22.0, -2.0, -49.6, 0.141),
            (22.0, -2.5, -53.2, 0.135, "radial wrist"),
        ),
    ),
    Track(
        ("left ulnar artery I", "left ulnar artery II"),
        (
            (18.8, -1.4, -31.4, 0.212, "elbow fork"),
            (18.6, -1.2, -33.4, 0.211),
            (18.0, -0.7, -36.8, 0.208, "interosseous origin"),
            (17.6, -0.6, -40.4, 0.200),
            (17.5, -1.1, -45.4, 0.190),
            (18.0, -1.8, -50.6, 0.180),
            (18.5, -2.3, -53.6, 0.175, "ulnar wrist"),
        ),
    ),
    Track(
        ("left common interosseous artery",),
        (
            (18.0, -0.7, -36.8, 0.105, "interosseous origin"),
            (18.5, -0.1, -38.4, 0.103),
            (19.1, 0.1, -40.8, 0.099),
            (19.5, -0.1, -43.4, 0.095, "interosseous end"),
        ),
    ),
)


def limb() -> Phantom:
    """Left arm arteries, sampled every millimetre."""
    return Phantom("limb", "cm", cut(_TRACKS, 0.1, _DECIMALS))


def write_limb(folder: Path) -> None:
    """Write arteries, names and truth of the sample into an existing folder."""
    phantom = limb()
    drawn = shared_points(phantom)
    title = "Saltmere phantom 2: arteries of a left arm, invented, lengths in cm"
    write_legacy(drawn, folder / "arteries.vtk", title, ("diameter", 2 * drawn.radius), _DECIMALS)
    write_names(phantom, folder, _DECIMALS)
    content = truth(phantom)
    content["points"], content["lines"] = len(drawn.points), len(drawn.lines)
    write_truth(content, folder)
