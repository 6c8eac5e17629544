"""What all settings sections are made of."""

from __future__ import annotations

from typing import Annotated

from msgspec import Meta, Struct

Positive = Meta(gt=0.0)
NonNegative = Meta(ge=0.0)
Probability = Meta(gt=0.0, lt=1.0)
PositiveFloat = Annotated[float, Positive]
ProbabilityFloat = Annotated[float, Probability]


def about(meaning: str, unit: str = "", source: str = "") -> Meta:
    """What `--print-settings` says about one setting."""
    return Meta(description=meaning, extra={"unit": unit, "source": source})


class Section(Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """Base of all sections: immutable, no unknown names."""
