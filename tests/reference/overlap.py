"""Slow twins of kernels/overlap.py."""


def box_overlap(a, b):
    """IoU of two boxes (cx, cy, w, h)."""
    left = max(a[0] - a[2] / 2, b[0] - b[2] / 2)
    right = min(a[0] + a[2] / 2, b[0] + b[2] / 2)
    top = max(a[1] - a[3] / 2, b[1] - b[3] / 2)
    bottom = min(a[1] + a[3] / 2, b[1] + b[3] / 2)
    shared = max(0.0, right - left) * max(0.0, bottom - top)
    return shared / (a[2] * a[3] + b[2] * b[3] - shared)


def overlap_matrix(a, b):
    """IoU of all pairs."""
    return [[box_overlap(one, other) for other in b] for one in a]


def generalised_overlap(a, b):
    """GIoU pair by pair, from areas."""
    out = []
    for one, other in zip(a, b, strict=True):
        left = min(one[0] - one[2] / 2, other[0] - other[2] / 2)
        right = max(one[0] + one[2] / 2, other[0] + other[2] / 2)
        top = min(one[1] - one[3] / 2, other[1] - other[3] / 2)
        bottom = max(one[1] + one[3] / 2, other[1] + other[3] / 2)
        around = (right - left) * (bottom - top)
        iou = box_overlap(one, other)
        areas = one[2] * one[3] + other[2] * other[3]
        union = areas - iou * areas / (1 + iou)
        out.append(iou - (around - union) / around)
    return out
