"""A measured value and what it rests on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

FEWEST = 30  # observations below which a default is kept; common practice, no source


@dataclass(frozen=True, slots=True)
class Evidence:
    """setting : its path; a name without a dot is reported, but is no setting.

    value : what was measured, None if it could not be.   interval : of 95%, where there is one.
    count : observations.   method : how, in a few words.   kept : whether the default stays.
    """

    setting: str
    value: Any
    count: int
    method: str
    interval: tuple[float, float] | None = None
    kept: bool = False

    @property
    def sentence(self) -> str:
        """The comment in the settings file."""
        if self.kept:
            few = "only " if self.count < FEWEST else ""
            return f"kept the default, {few}{self.count} observations; {self.method}"
        text = f"measured: {short(self.value)}"
        if self.interval is not None:
            text += f" (95%: {self.interval[0]:.4g} to {self.interval[1]:.4g})"
        return f"{text}, {self.count} observations; {self.method}"

    def as_dict(self) -> dict[str, Any]:
        return {
            "setting": self.setting, "value": self.value, "interval": self.interval,
            "observations": self.count, "method": self.method, "default_kept": self.kept,
        }  # fmt: skip


def short(value: Any) -> str:
    """A value for reading."""
    return f"{value:.4g}" if isinstance(value, float) else str(value)
