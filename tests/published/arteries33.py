"""The 33 arteries with a ring of Alastruey et al. 2007 (J Biomech 40:1794-1805), laid out in space.

Lengths and radii in cm, R in 1e9 Pa·s/m³, C in 1e-10 m³/Pa: from memory, supported by two relations that hold on every
row (wall thickness a quarter of the radius on the 22 cervical and cerebral rows; one time constant R·C for all outlets).
Places of the nodes are our own: x to the left, y to the back, z to the head, in cm; every artery is as long as its row says.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

__all__ = ["ARTERIES", "CEREBRAL", "NODES", "OUTLETS", "Artery", "lines"]


@dataclass(frozen=True)
class Artery:
    """One row of the table."""

    number: int
    name: str
    length: float
    radius: float
    start: str
    end: str


ARTERIES = tuple(
    Artery(int(n), name.strip(), float(length), float(radius), start, end)
    for n, name, length, radius, start, end in (
        row.split("|")
        for row in """
1|ascending aorta|4.0|1.200|h|A
2|aortic arch I|2.0|1.120|A|B
3|brachiocephalic|3.4|0.620|A|C
4|aortic arch II|3.9|1.070|B|D
5|left common carotid|20.8|0.250|B|E
6|right common carotid|17.7|0.250|C|F
7|right subclavian|3.4|0.423|C|G
8|thoracic aorta|15.6|0.999|D|t1
9|left subclavian|3.4|0.423|D|H
10|left external carotid|17.7|0.150|E|t2
11|left internal carotid I|17.7|0.200|E|I
12|right internal carotid I|17.7|0.200|F|J
13|right external carotid|17.7|0.150|F|t3
14|right vertebral|14.8|0.136|G|K
15|right brachial|42.2|0.403|G|t4
16|left brachial|42.2|0.403|H|t5
17|left vertebral|14.8|0.136|H|K
18|left internal carotid II|0.5|0.200|I|L
19|left posterior communicating|1.5|0.073|I|M
20|right posterior communicating|1.5|0.073|J|N
21|right internal carotid II|0.5|0.200|J|O
22|basilar|2.9|0.162|K|P
23|left middle cerebral|11.9|0.143|L|t6
24|right middle cerebral|11.9|0.143|O|t7
25|left anterior cerebral A1|1.2|0.117|L|Q
26|right anterior cerebral A1|1.2|0.117|O|R
27|left posterior cerebral P1|0.5|0.107|P|M
28|right posterior cerebral P1|0.5|0.107|P|N
29|left anterior cerebral A2|10.3|0.120|Q|t8
30|right anterior cerebral A2|10.3|0.120|R|t9
31|anterior communicating|0.3|0.074|Q|R
32|left posterior cerebral P2|8.6|0.105|M|t10
33|right posterior cerebral P2|8.6|0.105|N|t11
""".strip().splitlines()
    )
)

CEREBRAL = {11, 12, 14, *range(17, 34)}
"""Rows of the cerebral part: internal carotids, vertebrals, and all beyond."""

OUTLETS = {  # end: (R, C)
    "t1": (0.18, 38.70), "t2": (5.43, 1.27), "t3": (5.43, 1.27), "t4": (2.68, 2.58), "t5": (2.68, 2.58),
    "t6": (5.97, 1.16), "t7": (5.97, 1.16), "t8": (8.48, 0.82), "t9": (8.48, 0.82), "t10": (11.08, 0.62),
    "t11": (11.08, 0.62),
}  # fmt: skip

_LEFT = {
    "E": (4, -1, 12), "I": (0.9, 3.7, 19.6), "L": (0.9, 3.25, 19.75), "M": (0.45, 5, 19.4), "Q": (0.14, 2.45, 20.0),
    "t2": (8, -6, 22), "t6": (11, 3, 22), "t8": (1.0, 0.5, 29), "t10": (5, 11, 22),
}  # fmt: skip
_MIRROR = {"E": "F", "I": "J", "L": "O", "M": "N", "Q": "R", "t2": "t3", "t6": "t7", "t8": "t9", "t10": "t11"}
NODES: dict[str, tuple[float, float, float]] = {
    "h": (0, 0, 0), "A": (0, 0, 4), "B": (2, 0, 4), "C": (-2, 0, 6.7), "D": (4, 3, 3.2), "G": (-5, 0, 8), "H": (6.8, 2, 4.4),
    "K": (0, 5, 16.5), "P": (0, 5, 19.3), "t1": (3, 4, -12), "t4": (-30, 0, -15), "t5": (31, 2, -18),
    **_LEFT, **{_MIRROR[key]: (-x, y, z) for key, (x, y, z) in _LEFT.items()},
}  # fmt: skip

_ASIDE = {5: (1, 0, 0), 6: (-1, 0, 0), 11: (1, -1, 0), 12: (-1, -1, 0), 10: (1, 0, 0), 13: (-1, 0, 0), 14: (-1, 1, 0),
          17: (1, 1, 0)}  # fmt: skip
"""Where the longer arteries bend to, so that they keep clear of one another."""


def path(artery: Artery, step: float = 0.1) -> np.ndarray:
    """Two straight pieces from node to node, together exactly as long as the row says; points in cm."""
    start, end = np.array(NODES[artery.start], float), np.array(NODES[artery.end], float)
    chord = end - start
    span = float(np.linalg.norm(chord))
    if span > artery.length:
        raise ValueError(f"{artery.name}: its nodes lie {span:.3f} cm apart, it is {artery.length} cm long")
    aside = np.array(_ASIDE.get(artery.number, (0.3, 0.2, 1.0)), float)
    aside -= chord * (aside @ chord) / span**2
    aside /= np.linalg.norm(aside)
    apex = start + chord / 2 + aside * np.sqrt(artery.length**2 - span**2) / 2
    n = max(2, int(np.ceil(artery.length / 2 / step)) + 1)
    t = np.linspace(0, 1, n)[:, None]
    return np.concatenate((start + (apex - start) * t, (apex + (end - apex) * t)[1:]))


def lines(without: set[int] = frozenset(), only: set[int] | None = None) -> tuple[np.ndarray, ...]:
    """Points in cm, radius in cm, connectivity and offsets of the arteries but some; each line has its own points."""
    rows = [one for one in ARTERIES if one.number not in without and (only is None or one.number in only)]
    paths = [path(one) for one in rows]
    radius = np.concatenate([np.full(len(points), one.radius) for one, points in zip(rows, paths, strict=True)])
    offsets = np.concatenate(([0], np.cumsum([len(points) for points in paths])))
    return np.concatenate(paths), radius, np.arange(offsets[-1]), offsets
