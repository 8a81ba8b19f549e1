"""A receiver of the network file: json and numpy alone solve its steady state and compare."""

import json
import sys
from pathlib import Path

import numpy as np


def largest_difference(path: str) -> float:
    """Return the largest relative difference between what the file says and what follows from it."""
    net = json.loads(Path(path).read_text(encoding="utf-8"))
    nodes, segments, stations, check = (net[key] for key in ("nodes", "segments", "stations", "steady_check"))
    if "companion" in stations:
        stations = {**stations, **np.load(Path(path).parent / stations["companion"]["file"])}
    last = np.asarray(stations["distance"])[np.array(stations["offsets"][1:]) - 1]
    resistance, n = np.array(segments["lumped"]["resistance"]), len(nodes["id"])
    weight = net["blood"]["density"] * np.linalg.norm(net["conventions"]["gravity"]) * np.array(nodes["height"])
    drop = np.eye(n)[segments["from_node"]] - np.eye(n)[segments["to_node"]]  # head at the start less head at the end
    unit, ends = np.median(resistance), net["inlets"] + net["outlets"]
    matrix, right = np.zeros((n + len(ends), n + len(ends))), np.zeros(n + len(ends))
    matrix[:n, :n] = drop.T @ (drop * (unit / resistance)[:, None])  # what leaves through segments enters at ends
    for i, end in enumerate(ends, start=n):  # unknowns: pressure + weight at nodes, then unit * flow inwards at ends
        matrix[end["node"], i] = -1.0
        if end.get("mean_flow") is not None:
            matrix[i, i], right[i] = 1.0, end["mean_flow"] * unit
        else:  # an outlet's resistance lies between its node and the far pressure
            behind = (end.get("characteristic_resistance") or 0.0) + (end.get("peripheral_resistance") or 0.0)
            matrix[i, end["node"]], matrix[i, i] = 1.0, behind / unit
            right[i] = end.get("pressure", end.get("far_pressure")) + weight[end["node"]]
    head, inwards = np.split(np.linalg.lstsq(matrix, right, rcond=None)[0], [n])
    ours = [last, head - weight, drop @ head / resistance, inwards / unit]
    said = [segments["length"], check["pressure"], check["flow"]]
    said.append(np.concatenate([check["inlet_flow"], np.negative(check["outlet_flow"])]))
    return max(float(np.max(np.abs(a - b)) / np.max(np.abs(b))) for a, b in zip(ours, said, strict=True))


if __name__ == "__main__":
    print(f"largest relative difference {largest_difference(sys.argv[1]):.1e}")
