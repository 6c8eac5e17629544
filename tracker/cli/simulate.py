"""`margent simulate`: a seeded sequence of Tern Quay, with truth."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from tracker.errors import UsageError

if TYPE_CHECKING:
    from tracker.simulation import SimulatedSequence


def simulate(
    scene: Annotated[
        str | None,
        typer.Argument(
            metavar="SCENE", help="Name of a scene; --scenes lists them.", show_default=False
        ),
    ] = None,
    seed: Annotated[
        int, typer.Option(min=0, help="Seed of everything random; the same seed, the same files.")
    ] = 1,
    seconds: Annotated[
        float | None,
        typer.Option(help="Length of the sequence; short for --set clock.seconds=..."),
    ] = None,
    settings: Annotated[
        Path | None,
        typer.Option(help="Settings of the scene as TOML; what it leaves out keeps its default."),
    ] = None,
    set_: Annotated[
        list[str] | None,
        typer.Option(
            "--set",
            metavar="SECTION.NAME=VALUE",
            help="Change one setting, e.g. --set detection.probability=0.8. Repeatable.",
        ),
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option(help="Folder to write; by default SCENE-SEED in the current folder."),
    ] = None,
    video: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE.mp4", help="Also draw what the sensor looked at (needs opencv)."
        ),
    ] = None,
    scenes: Annotated[bool, typer.Option("--scenes", help="List the scenes, and stop.")] = False,
    print_settings: Annotated[
        bool,
        typer.Option(
            "--print-settings", help="Print the scene's settings with their meaning, and stop."
        ),
    ] = False,
) -> None:
    """Simulate a scene of Tern Quay, an invented ferry terminal: detections with truth.

    Writes detections.csv, truth.csv and sequence.toml, the same bytes for the same seed and
    settings. Everyone in it is invented: what works here can still fail on real people.

    Example: margent simulate forecourt --seed 7 --out forecourt
    """
    from tracker.settings import settings_as_toml
    from tracker.simulation import SCENES, find_scene, write_sequence
    from tracker.simulation import simulate as simulate_scene
    from tracker.simulation.overrides import scene_settings

    if scenes:
        width = max(map(len, SCENES))
        print("\n".join(f"{item.name:<{width}}  {item.summary}" for item in SCENES.values()))
        return
    if scene is None:
        raise UsageError(f"name a scene: {', '.join(SCENES)}")
    overrides = [*(set_ or []), *([] if seconds is None else [f"clock.seconds={seconds}"])]
    chosen = scene_settings(find_scene(scene).settings, settings, tuple(overrides))
    if print_settings:
        sys.stdout.write(settings_as_toml(chosen))
        return
    if video is not None and video.suffix.lower() != ".mp4":
        raise UsageError(f"--video writes MP4 files: name it {video.stem}.mp4 (found {video.name})")
    sequence = simulate_scene(scene, seed=seed, settings=chosen)
    folder = out or Path(f"{scene}-{seed}")
    inside = video is not None and video.absolute().parent == folder.absolute()
    write_sequence(sequence, folder, replacing={video.name} if video and inside else ())
    if video is not None:
        _draw(sequence, video)
    print(
        f"{scene}: {len(sequence.frames)} frames, {len(sequence.detections)} detections of "
        f"{len(set(sequence.objects.object.tolist()))} objects in {folder}",
        file=sys.stderr,
    )


def _draw(sequence: SimulatedSequence, path: Path) -> None:
    from tracker.cli.progress import watched
    from tracker.simulation.video import render, write_video

    frames = watched(render(sequence), total=len(sequence.frames), label="drawing")
    write_video(sequence, path, iter(frames))
