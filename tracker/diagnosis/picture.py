"""A decision as a picture: what was expected, what was seen, who got what, and the runner-up."""

from __future__ import annotations

# Okabe and Ito 2008, "Color Universal Design": told apart with every kind of colour vision. Their
# yellow is left out, which is hardly seen on white; line styles say the same without colour.
TRACK_COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
INK = "#000000"
FAINT = "#999999"

WIDTH_INCHES = 9.0
MARGIN_SHARE = 0.16  # of the region, around it
DASHES = (0, (5, 3))
DOTS = (0, (1, 1.6))
