"""Settings: defaults, files, overrides, and messages that say what would be right."""

import tomllib

import pytest

from tracker.errors import InputError, SettingsError
from tracker.settings import (
    Settings,
    describe,
    load_settings,
    settings_as_dict,
    settings_as_toml,
    settings_from,
)


def test_defaults_written_and_read_are_the_defaults():
    for comments in (True, False):
        text = settings_as_toml(Settings(), comments=comments)
        assert settings_from(tomllib.loads(text)) == Settings()


@pytest.mark.parametrize(
    "overrides",
    [
        ("gate.probability=none", "gate.overlap_floor=0.3"),
        ("ledger.level=none",),
        ("tiers=[{name='a', score_from=0.6, gate={probability=0.9}}, {name='b'}]",),
        ("cost.terms=['overlap', 'label']", "cost.label.differ_nats=2"),
    ],
)
def test_changed_settings_survive_the_round_trip(overrides):
    chosen = load_settings(None, overrides)
    assert chosen != Settings()
    assert settings_from(tomllib.loads(settings_as_toml(chosen))) == chosen


def test_every_setting_says_what_it_means():
    for path, _, facts in describe():
        assert facts["meaning"], path


def test_none_is_a_value_of_the_ledger_and_unset_elsewhere():
    assert load_settings(None, ("ledger.level=none",)).ledger.level == "none"
    assert load_settings(None, ("time.frame_rate_hz=none",)).time.frame_rate_hz is None


@pytest.mark.parametrize(
    ("override", "words"),
    [
        ("gate.probability=1.5", "gate.probability: expected `float` < 1.0"),
        ("gate.probabilty=0.9", "no setting 'gate.probabilty'; did you mean 'gate.probability'"),
        ("lifecycle.confirm_hits=2.5", "lifecycle.confirm_hits: expected `int`"),
        ("lifecycle=3", "lifecycle: expected `object`"),
        ("nothing", "expected section.name=value, found 'nothing'"),
        ("gate.probability.low=1", "gate.probability"),
        ("tiers=[{states=['asleep']}]", "tiers[0].states[0]"),
    ],
)
def test_what_is_wrong_is_named(override, words):
    with pytest.raises(SettingsError) as caught:
        load_settings(None, (override,))
    assert words in str(caught.value)


def test_files(tmp_path):
    path = tmp_path / "s.toml"
    path.write_text("[gate]\nprobability = 0.95\n")
    chosen = load_settings(path, ("lifecycle.coast_seconds=3",))
    assert (chosen.gate.probability, chosen.lifecycle.coast_seconds) == (0.95, 3.0)
    path.write_text("[gate\n")
    with pytest.raises(InputError, match="not valid TOML"):
        load_settings(path)
    with pytest.raises(InputError, match="cannot be read"):
        load_settings(tmp_path / "none.toml")
    path.write_bytes(b"\xff\xfe\xfa")
    with pytest.raises(InputError, match="not UTF-8"):
        load_settings(path)
    path.write_text("[gate]\nprobability = 7.0\n")
    with pytest.raises(SettingsError, match=r"s.toml: gate.probability"):
        load_settings(path)


def test_plain_values_hold_everything():
    assert settings_as_dict(Settings())["cost"]["overlap"] == {"nats": 8.0, "neutral": 0.5}
