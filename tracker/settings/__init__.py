"""Settings: what can be set (`schema`) and how it is read and written (`files`)."""

from tracker.settings.files import (
    describe,
    load_settings,
    settings_as_dict,
    settings_as_toml,
    settings_from,
)
from tracker.settings.schema import Settings

__all__ = [
    "Settings",
    "describe",
    "load_settings",
    "settings_as_dict",
    "settings_as_toml",
    "settings_from",
]
