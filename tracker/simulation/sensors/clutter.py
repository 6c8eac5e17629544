"""False detections: a Poisson number in each frame, anywhere or around a few hot spots."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from msgspec import Meta

from tracker.log.model import Codes, Floats, Ints
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.settings import Section, Share, check_rows
from tracker.simulation.streams import Streams


class ClutterSettings(Section, frozen=True):
    """Clutter in the image. The number in a frame is Poisson, independent of everything else."""

    per_frame: Annotated[
        float, NonNegative, about("Mean number of false detections a frame", "detections")
    ] = 1.0
    height_median_px: Annotated[
        float, Positive, about("Median height of their boxes (log-normal)", "px")
    ] = 70.0
    height_spread: Annotated[
        float, NonNegative, about("Standard deviation of the logarithm of the height")
    ] = 0.45
    aspect: Annotated[float, Positive, about("Median of width over height (log-normal)")] = 0.45
    aspect_spread: Annotated[
        float, NonNegative, about("Standard deviation of the logarithm of the aspect")
    ] = 0.3
    hotspots: Annotated[
        int, Meta(ge=0, le=1000), about("Places where clutter gathers (posters, reflections)")
    ] = 0
    hotspot_share: Annotated[
        float, Share, about("Share of the clutter that is at a hot spot, if there are any")
    ] = 0.5
    hotspot_sigma_px: Annotated[
        float, NonNegative, about("Standard deviation around a hot spot", "px")
    ] = 12.0


def clutter_frames(mean: float, frames: int, streams: Streams) -> Ints:
    """(n,) sorted frame indices of clutter, `mean` a frame. Raises UsageError if too many."""
    check_rows(mean * frames, "false detections")
    return np.repeat(np.arange(frames), streams("clutter numbers").poisson(mean, frames))


def clutter_boxes(
    settings: ClutterSettings, count: int, width: float, height: float, streams: Streams
) -> Floats:
    """(count, 4) left, top, width, height of clutter in an image of `width` x `height` pixels.

    Centres are uniform over the image, or normal around hot spots, whose places are uniform.
    """
    draws = streams("clutter places").random((count, 4))
    normals = streams("clutter sizes").standard_normal((count, 4))
    image = np.array([width, height])
    centre = draws[:, :2] * image
    if settings.hotspots:
        spots = streams("clutter hot spots").random((settings.hotspots, 2)) * image
        at = (draws[:, 2] * settings.hotspots).astype(np.int64)
        near = spots[at] + settings.hotspot_sigma_px * normals[:, :2]
        centre = np.where((draws[:, 3] < settings.hotspot_share)[:, None], near, centre)
    tall = settings.height_median_px * np.exp(settings.height_spread * normals[:, 2])
    wide = tall * settings.aspect * np.exp(settings.aspect_spread * normals[:, 3])
    return np.stack((centre[:, 0] - 0.5 * wide, centre[:, 1] - 0.5 * tall, wide, tall), axis=1)


def clutter_labels(count: int, kinds: int, streams: Streams) -> Codes:
    """(count,) labels of clutter, each as likely."""
    return (streams("clutter labels").random(count) * kinds).astype(np.int32)
