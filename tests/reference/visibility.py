"""Slow twin of kernels/visibility.py, with shapely's areas."""

import shapely


def visible_shares(mean, hides):
    """Share of each box that no single nearer box covers."""
    boxes = [shapely.box(x - w / 2, y - h / 2, x + w / 2, y + h / 2) for x, y, w, h in mean[:, :4]]
    out = []
    for i, box in enumerate(boxes):
        covered = [
            box.intersection(other).area / box.area
            for j, other in enumerate(boxes)
            if hides[j] and j != i and other.bounds[3] > box.bounds[3]
        ]
        out.append(1.0 - max(covered, default=0.0))
    return out
