"""Settings from files and --set, and back to the command that makes the same sequence."""

from __future__ import annotations

import shlex

import pytest

from tests.simulation.pairs import settings
from tracker.errors import InputError, SettingsError
from tracker.settings import describe, settings_as_toml
from tracker.simulation import SCENES
from tracker.simulation.overrides import changes, command, scene_settings


@pytest.mark.parametrize("scene", list(SCENES))
def test_printed_settings_read_back_the_same(scene, tmp_path):
    file = tmp_path / "scene.toml"
    file.write_text(settings_as_toml(SCENES[scene].settings), encoding="utf-8")
    assert scene_settings(SCENES[scene].settings, file) == SCENES[scene].settings


@pytest.mark.parametrize("scene", list(SCENES))
def test_every_setting_says_what_it_means(scene):
    for path, _, facts in describe(SCENES[scene].settings):
        assert facts["meaning"], path


def test_set_goes_over_the_file_and_both_over_the_scene(tmp_path):
    file = tmp_path / "scene.toml"
    file.write_text("[clutter]\nper_frame = 3\n[clock]\nseconds = 9\n", encoding="utf-8")
    chosen = scene_settings(SCENES["fog"].settings, file, ("clock.seconds=2",))
    assert chosen.clutter.per_frame == 3
    assert chosen.clock.seconds == 2
    assert chosen.detection == SCENES["fog"].settings.detection


def test_the_command_makes_the_same_settings_again():
    chosen = settings(
        "forecourt", "clutter.per_frame=2.25", "site.obstacles=[]",
        'site.places=[{name = "a bench", x_m = 1.0, y_m = 20.0}]',
    )  # fmt: skip
    words = shlex.split(command("forecourt", 9, chosen, SCENES["forecourt"].settings))
    assert words[:5] == ["margent", "simulate", "forecourt", "--seed", "9"]
    assert words[5::2] == ["--set"] * 3
    assert settings("forecourt", *words[6::2]) == chosen
    assert changes(SCENES["rush"].settings, SCENES["rush"].settings) == []


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("clutter.per_fram=1", "no setting 'clutter.per_fram'; did you mean 'clutter.per_frame'"),
        ("clutter.per_frame=-1", "--set: clutter.per_frame: expected `float` >= 0.0"),
        ("clutter.per_frame=many", "--set: clutter.per_frame: expected `float`, got `str`"),
        ("clutter.per_frame=inf", "clutter.per_frame: must be a finite number"),
        ("scores.clutter_mean=nan", "scores.clutter_mean: must be a finite number"),
        ("detection.probability=1.2", "expected `float` <= 1.0"),
        ("lidar.x_m=3", "this scene has no setting 'lidar'"),
        ("clutter", "expected section.name=value, found 'clutter'"),
        ("clutter=3", "clutter: expected `object`, got `int`"),
        ("site.doors=[]", "site.doors: expected `array` of length >= 2"),
    ],
)
def test_wrong_settings_are_named(text, sentence):
    with pytest.raises(SettingsError) as caught:
        settings("forecourt", text)
    assert sentence in str(caught.value)


def test_unreadable_files_are_named(tmp_path):
    with pytest.raises(InputError, match="the settings file cannot be read: No such file"):
        scene_settings(SCENES["fog"].settings, tmp_path / "none.toml")
    bad = tmp_path / "bad.toml"
    bad.write_text("x = = 1", encoding="utf-8")
    with pytest.raises(InputError, match="not valid TOML"):
        scene_settings(SCENES["fog"].settings, bad)
    bad.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="not UTF-8 text"):
        scene_settings(SCENES["fog"].settings, bad)
