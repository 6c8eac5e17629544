"""A moving camera, measured in its video: sparse features of the background, by opencv.

Corners (Shi and Tomasi 1994) outside the boxes of the last frame are followed to the next picture
(pyramidal Lucas and Kanade: Bouguet 2000) and back again; a similarity transform is fitted to those
that come back to where they started, by consensus (Fischler and Bolles 1981).
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tracker.errors import InputError, UsageError
from tracker.log.model import Floats, Frame
from tracker.motion.camera import CameraStep

LARGEST_SIDE = 640  # pictures are made smaller than that for the search
MOST_CORNERS = 400
LEAST_CORNERS = 12  # agreeing corners below which nothing is known
THERE_AND_BACK = 0.5  # pixels: a corner followed back must end this close to where it started
CONSENSUS_PIXELS = 1.0

Picture = NDArray[np.uint8]


class VideoCamera:
    """Measures the camera's motion between the frames of a log, reading the video once through.

    Pictures are numbered from `first`, the number of the log's first picture: 0 or 1.

    Raises UsageError where opencv is not installed, InputError for a file that it cannot read.
    """

    def __init__(self, path: Path, first: int = 1) -> None:
        self._cv2 = _opencv()
        if not path.is_file():
            raise InputError("there is no such video", path=path)
        self._path = path
        self._video = self._cv2.VideoCapture(str(path))
        if not self._video.isOpened():
            raise InputError("cannot be read as a video", path=path)
        self._next = first
        self._previous: Picture | None = None
        self._scale = 1.0
        self._boxes: Floats = np.empty((0, 4))

    def step(self, frame: Frame) -> CameraStep | None:
        """What the camera did since the last frame asked for; None if that cannot be told.

        Frames must be asked for in order. Raises InputError where the video ends before the frame.
        """
        known, whole = True, np.eye(3)
        while self._next <= frame.number:
            picture = self._read(frame.number)
            if self._previous is not None:
                moved = self._between(self._previous, picture)
                known &= moved is not None
                whole = whole if moved is None else moved[0] @ whole
                support = 0.0 if moved is None else moved[1]
            else:
                known, support = False, 0.0
            self._previous = picture
            self._next += 1
        self._boxes = frame.z
        return self._step(whole, support) if known and self._previous is not None else None

    def _step(self, whole: Floats, support: float) -> CameraStep:
        assert self._previous is not None
        centre = np.array(self._previous.shape[::-1]) / 2.0 / self._scale
        shift = whole[:2, :2] @ centre + whole[:2, 2] / self._scale - centre
        parameters = np.array([shift[0], shift[1], whole[0, 0] - 1.0, whole[1, 0]])
        return CameraStep(parameters, centre, np.nan, support)

    def _read(self, wanted: int) -> Picture:
        good, picture = self._video.read()
        if not good:
            raise InputError(
                f"the video has no picture {self._next}; the log has frame {wanted}",
                path=self._path,
                remedy="Use the video of this log, from its first frame on.",
            )
        grey = self._cv2.cvtColor(picture, self._cv2.COLOR_BGR2GRAY)
        self._scale = min(1.0, LARGEST_SIDE / max(grey.shape))
        if self._scale < 1.0:
            size = (round(grey.shape[1] * self._scale), round(grey.shape[0] * self._scale))
            self._scale = size[0] / grey.shape[1]
            grey = self._cv2.resize(grey, size, interpolation=self._cv2.INTER_AREA)
        return grey

    def _between(self, before: Picture, after: Picture) -> tuple[Floats, float] | None:
        """(3, 3) transform of small pictures and how many corners agree."""
        cv2 = self._cv2
        corners = cv2.goodFeaturesToTrack(
            before, MOST_CORNERS, 0.01, 8, mask=self._background(before.shape)
        )
        if corners is None or len(corners) < LEAST_CORNERS:
            return None
        there, found, _ = cv2.calcOpticalFlowPyrLK(before, after, corners, None)
        back, found_back, _ = cv2.calcOpticalFlowPyrLK(after, before, there, None)
        apart = np.linalg.norm(back - corners, axis=2).ravel()
        good = (found.ravel() == 1) & (found_back.ravel() == 1) & (apart < THERE_AND_BACK)
        if good.sum() < LEAST_CORNERS:
            return None
        cv2.setRNGSeed(1)
        transform, agree = cv2.estimateAffinePartial2D(
            corners[good], there[good], ransacReprojThreshold=CONSENSUS_PIXELS
        )
        if transform is None or agree.sum() < LEAST_CORNERS:
            return None
        return np.vstack((transform, [0.0, 0.0, 1.0])), float(agree.sum())

    def _background(self, shape: tuple[int, ...]) -> Picture:
        """255 outside the boxes of the last frame."""
        mask = np.full(shape, 255, np.uint8)
        low = np.floor((self._boxes[:, :2] - 0.55 * self._boxes[:, 2:4]) * self._scale)
        high = np.ceil((self._boxes[:, :2] + 0.55 * self._boxes[:, 2:4]) * self._scale)
        limit = np.array(shape[::-1])
        for (x0, y0), (x1, y1) in zip(
            np.clip(low, 0, limit).astype(int), np.clip(high, 0, limit).astype(int), strict=True
        ):
            mask[y0:y1, x0:x1] = 0
        return mask


def _opencv() -> Any:
    try:
        import cv2
    except ImportError:
        raise UsageError(
            "reading videos needs opencv; install it with: pip install 'margent[video]'"
        ) from None
    return cv2
