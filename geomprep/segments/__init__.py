"""From points to segments: split, resample, orient, order."""

from geomprep.segments.orders import OrderResult, order_segments
from geomprep.segments.orient import orient
from geomprep.segments.parts import ReachedPart, kept_segments, leave_out_unreached
from geomprep.segments.resample import resample
from geomprep.segments.split import split

__all__ = [
    "OrderResult",
    "ReachedPart",
    "kept_segments",
    "leave_out_unreached",
    "order_segments",
    "orient",
    "resample",
    "split",
]
