"""One picture of the network: true proportions beside a flat map, as a plain SVG."""

from __future__ import annotations

from html import escape
from pathlib import Path

import numpy as np

from geomprep.atomic import write_atomic
from geomprep.export.context import ExportContext
from geomprep.export.flat_map import FlatMap, flat_map
from geomprep.export.projection import View, chosen_view
from geomprep.export.texts import CAUTIONS
from geomprep.model import VESSEL_CLASSES, FloatArray, Network, SteadyState
from geomprep.units import format_quantity

__all__ = ["overview_svg", "write_overview"]

_PANEL = 620.0
_MARGIN = 50.0
_TOP = 92.0
_COLOURS = {"artery": "#a8452f", "vein": "#3f6a86", "unknown": "#77736a"}
_MOST_NAMES = 60
_NAME_SIZE = 10
_MOST_CORNERS = 80
_MOST_SEGMENTS = 400
"""Above this the widest vessels are drawn; the picture says so."""


def write_overview(path: Path, network: Network, state: SteadyState, context: ExportContext) -> None:
    """Write the overview picture.

    Parameters
    ----------
    path : Path
    network : Network
        With measures, inlets and outlets.
    state : SteadyState
    context : ExportContext

    Raises
    ------
    InputError
        The folder is not writable or full.
    """
    write_atomic(path, overview_svg(network, state, context).encode())


def overview_svg(network: Network, state: SteadyState, context: ExportContext) -> str:
    """Return the overview picture as SVG text.

    Left: the vessels in true proportions, seen along the axis that shows them widest, line width = lumen
    diameter; a rule in millimetres; left, right, head and feet at the edges where the frame is known;
    repairs ringed. Right: the flat map, inlets at the top, outlets at the bottom, line width by flow.
    Arteries are warm, veins cool.
    """
    shown = _widest(network)
    view = chosen_view(network, context.frame, _PANEL)
    height = _TOP + _PANEL + 2 * _MARGIN + 30
    width = 2 * _PANEL + 4 * _MARGIN
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width:.0f} {height:.0f}" '
        'font-family="Georgia, serif" font-size="15">',
        f"<title>{escape(context.name)}: overview</title>",
        f'<rect width="{width:.0f}" height="{height:.0f}" fill="#faf7f0"/>',
        *_heading(network, state, context, len(shown)),
        f'<g transform="translate({_MARGIN:.0f} {_TOP + _MARGIN:.0f})">',
        *_proportions(network, view, shown),
        *_rings(context, view),
        *_edges(view),
        "</g>",
        f'<g transform="translate({_PANEL + 3 * _MARGIN:.0f} {_TOP + _MARGIN:.0f})">',
        *_map(network, state, flat_map(network), shown),
        "</g>",
        f'<text x="{_MARGIN:.0f}" y="{height - 14:.0f}" fill="#6b655a" font-size="12">{escape(" ".join(CAUTIONS[:2]))} '
        "A computed pressure is not a measurement.</text>",
        "</svg>\n",
    ]
    return "\n".join(parts)


def _widest(network: Network) -> list[int]:
    """Rows of the segments to draw, the thin ones first so that trunks lie on top."""
    size = network.measures.median_radius if network.measures else np.ones(len(network.segments))
    order = np.argsort(size, kind="stable")
    rows: list[int] = order[-_MOST_SEGMENTS:].tolist()
    return rows


def _heading(network: Network, state: SteadyState, context: ExportContext, shown: int) -> list[str]:
    """Name, question, sizes."""
    flow = format_quantity(float(state.inlet_flow.sum()), "mL/min")
    few = "" if shown == len(network.segments) else f"; the {shown:,} widest are drawn"
    facts = f"{len(network.segments):,} segments, {len(network.nodes):,} nodes, {flow} in{few}"
    return [
        f'<text x="{_MARGIN:.0f}" y="40" font-size="24" fill="#2e2a24">{escape(context.name)}</text>',
        f'<text x="{_MARGIN:.0f}" y="64" fill="#4a453c">{escape(context.question)}</text>',
        f'<text x="{_MARGIN:.0f}" y="86" fill="#6b655a">{escape(facts)}</text>',
        f'<text x="{_PANEL + 3 * _MARGIN:.0f}" y="86" fill="#6b655a">inlets at the top, outlets at the bottom, '
        "width by flow</text>",
    ]


def _proportions(network: Network, view: View, shown: list[int]) -> list[str]:
    """Every segment as the outline of its lumen."""
    offsets, radius = network.stations.offsets, network.stations.radius
    drawn = []
    for row in shown:
        first, last = int(offsets[row]), int(offsets[row + 1])
        step = max(1, (last - first) // _MOST_CORNERS)
        rows = np.unique(np.append(np.arange(first, last, step), last - 1))
        place = view.place(network.stations.position[rows])
        colour = _COLOURS[VESSEL_CLASSES[int(network.segments.vessel_class[row])]]
        drawn.append(_outline(place, np.maximum(0.3, view.scale * radius[rows]), colour))
    return drawn


def _outline(place: FloatArray, half: FloatArray, colour: str) -> str:
    """A tube of half widths along a line, round at both ends."""
    along = np.gradient(place, axis=0)
    size = np.linalg.norm(along, axis=1, keepdims=True)
    aside = np.stack((-along[:, 1], along[:, 0]), axis=1) / np.where(size > 0, size, 1.0) * half[:, None]
    corners = np.concatenate((place + aside, (place - aside)[::-1]))
    edge = "L".join(f"{x:.1f},{y:.1f}" for x, y in corners.tolist())
    ends = "".join(
        f"M{x - r:.1f},{y:.1f}a{r:.1f},{r:.1f} 0 1,0 {2 * r:.1f},0a{r:.1f},{r:.1f} 0 1,0 {-2 * r:.1f},0"
        for (x, y), r in ((place[0].tolist(), float(half[0])), (place[-1].tolist(), float(half[-1])))
    )
    return f'<path d="M{edge}Z{ends}" fill="{colour}" stroke="{colour}" stroke-width="0.4"/>'


def _rings(context: ExportContext, view: View) -> list[str]:
    """A ring round the place of every repair."""
    if not context.repairs:
        return []
    place = view.place(np.array([repair.position for repair in context.repairs]))
    return [
        f'<circle cx="{x:.1f}" cy="{y:.1f}" r="9" fill="none" stroke="#c58b2a" stroke-width="2">'
        f"<title>{escape(repair.kind)}: {escape(repair.reason)}</title></circle>"
        for (x, y), repair in zip(place.tolist(), context.repairs, strict=True)
    ]


def _edges(view: View) -> list[str]:
    """The rule in millimetres, and the sides of the body at the edges."""
    length, label = view.rule()
    y = _PANEL + 26
    marks = [
        f'<line x1="0" y1="{y:.0f}" x2="{length:.1f}" y2="{y:.0f}" stroke="#4a453c" stroke-width="2"/>',
        f'<text x="{length + 8:.1f}" y="{y + 5:.0f}" fill="#4a453c">{label}</text>',
    ]
    places = ((-8.0, _PANEL / 2, "end"), (_PANEL + 8, _PANEL / 2, "start"), (_PANEL / 2, -12.0, "middle"),
              (_PANEL / 2, _PANEL + 40, "middle"))  # fmt: skip
    return marks + [
        f'<text x="{x:.0f}" y="{y:.0f}" text-anchor="{anchor}" fill="#8a8375" font-style="italic">{word}</text>'
        for (x, y, anchor), word in zip(places, view.sides, strict=True)
        if word
    ]


def _map(network: Network, state: SteadyState, layout: FlatMap, shown: list[int]) -> list[str]:
    """Segments as curves between the rows of their nodes, names beside them."""
    largest = float(np.abs(state.flow).max(initial=0.0)) or 1.0
    place = layout.place * _PANEL
    drawn = []
    for row in shown:
        a, b = place[network.segments.from_node[row]], place[network.segments.to_node[row]]
        width = 0.8 + 11.0 * abs(float(state.flow[row])) / largest
        colour = _COLOURS[VESSEL_CLASSES[int(network.segments.vessel_class[row])]]
        drawn.append(_curve(a, b, float(layout.bulge[row]) * _PANEL, width, colour))
    labels = _labels(network, place, layout, shown) if len(shown) <= _MOST_NAMES else []
    dots = [
        f'<circle cx="{x:.1f}" cy="{y:.1f}" r="3" fill="#2e2a24"/>'
        for x, y in (place.tolist() if len(place) <= 400 else [])
    ]
    return drawn + dots + labels


def _curve(a: FloatArray, b: FloatArray, bulge: float, width: float, colour: str) -> str:
    """One segment of the flat map."""
    middle = 0.5 * (a[1] + b[1])
    return (
        f'<path d="M{a[0]:.1f},{a[1]:.1f} C{a[0] + bulge:.1f},{middle:.1f} {b[0] + bulge:.1f},{middle:.1f} '
        f'{b[0]:.1f},{b[1]:.1f}" fill="none" stroke="{colour}" stroke-opacity="0.75" stroke-width="{width:.2f}"/>'
    )


def _labels(network: Network, place: FloatArray, layout: FlatMap, shown: list[int]) -> list[str]:
    """Names beside the middle of their curves; one that would lie on another moves down."""
    wanted = []
    for row in shown:
        name = str(network.segments.name[row])
        if name:
            x, y = 0.5 * (place[network.segments.from_node[row]] + place[network.segments.to_node[row]])
            wanted.append((float(y), float(x) + 0.75 * float(layout.bulge[row]) * _PANEL + 6.0, name))
    taken: list[tuple[float, float, float]] = []
    texts = []
    for y, x, name in sorted(wanted):
        width = _NAME_SIZE * 0.52 * len(name)
        left = min(x, _PANEL + _MARGIN - width)
        line = y
        while any(abs(line - at) < _NAME_SIZE + 1 and left < end and start < left + width for at, start, end in taken):
            line += _NAME_SIZE + 1
        taken.append((line, left, left + width))
        texts.append(
            f'<text x="{left:.1f}" y="{line:.1f}" font-size="{_NAME_SIZE}" fill="#4a453c">{escape(name)}</text>'
        )
    return texts
