"""`streamhost profile`: what realizations cost, on this machine and on a core of the user's own."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import click

from streamhost.commands.common import (
    Progress,
    check_figures,
    force_option,
    json_option,
    presets_named,
    structures_option,
    vary_option,
    write_json,
)
from streamhost.errors import RequestError

if TYPE_CHECKING:
    from streamhost.presets import Preset
    from streamhost.presets.realizing import Refusal
    from streamhost.profile import Core, Profile
    from streamhost.realization import Realization

MOST_CHANNELS = 64


@dataclass(frozen=True)
class Costed:
    """What was asked for, as it is realized for the first number of channels, and what was found of all.

    refusals: of forms that were sought.
    """

    presets: "tuple[Preset, ...]"
    realizations: "tuple[Realization, ...]"
    profile: "Profile"
    core: "Core | None"
    refusals: "tuple[Refusal, ...]" = ()


@click.command()
@click.argument("presets", metavar="PRESET...", nargs=-1, required=True)
@click.option("--channels", "channels", metavar="N,...", help="Time them on so many channels, for instance 1,2,8. Unless said: "
              "on as many as the preset tells apart, which for most is 1.")
@click.option("--cost", "cost", metavar="FILE", help="A file with the cycles that a core of yours takes for each operation, or "
              "example-core, to begin with.")
@click.option("--quick", is_flag=True, help="A third of the rounds.")
@vary_option
@json_option
@structures_option
@force_option
def profile(
    presets: Sequence[str], channels: str | None, cost: str | None, quick: bool, variations: Sequence[str],
    json_file: str | None, force: bool,
) -> int:
    """What each realization costs: operations and memory, time on this machine, and the bound that keeps it from being faster.

    Every PRESET is a preset file or the name of a shipped one. All are timed together, so that ratios hold on a machine that
    does other work too. Timed are the kernels that the host runs, without meters.
    """
    from streamhost.cache import notice
    from streamhost.commands.profile_text import document, text

    counts = _channels(channels)
    core = _core(cost)
    check_figures(json_file, None, force=force)
    costed = _costed(presets_named(presets, variations), counts, core, quick=quick)
    if problem := notice():
        click.echo(problem, err=True)
    if json_file != "-":
        click.echo(text(costed))
    if json_file is not None:
        write_json(json_file, document(costed), force=force)
    return 0


def _channels(asked: str | None) -> tuple[int, ...]:
    """The numbers of channels, each once; none where it is left to the presets."""
    if asked is None:
        return ()
    counts = []
    for each in asked.split(","):
        if not each.strip().isdecimal() or not 1 <= int(each) <= MOST_CHANNELS:
            raise RequestError(f'--channels {asked}: "{each}" is not allowed: whole numbers from 1 to {MOST_CHANNELS}, '
                               "for instance 1,2,8.")
        counts.append(int(each))
    return tuple(dict.fromkeys(counts))


def _core(name: str | None) -> "Core | None":
    if name is None:
        return None
    from streamhost.profile import load_core
    from streamhost.shipped import resolve

    return load_core(resolve(name, "core"), name)


def _costed(asked: "Sequence[Preset]", counts: tuple[int, ...], core: "Core | None", *, quick: bool) -> Costed:
    """Everything realized for each number of channels, and timed together."""
    from streamhost.commands.compare_text import refused
    from streamhost.presets.realizing import realize_presets, realize_those_that_carry
    from streamhost.profile import profile
    from streamhost.profile.timing import QUICK_ROUNDS, ROUNDS

    made, refusals = realize_those_that_carry(asked, counts[0] if counts else None)
    if not made:
        raise RequestError(" ".join(refused(refusals, "profiled")))
    presets, first = (tuple(each) for each in zip(*made, strict=True))
    others = [realize_presets(presets, count) for count in counts[1:]]
    for preset, realization in made:
        realization.check_samples(preset.source.name)
    alike = [[(one, count) for one, count in zip(each, counts or (each[0].diagram.channels,), strict=True)]
             for each in zip(first, *others, strict=True)]
    with Progress("profile", 1) as progress:
        progress.step("1 realization" if len(made) == 1 else f"{len(made)} realizations")
        found = profile(alike, core, rounds=QUICK_ROUNDS if quick else ROUNDS, report=progress.within)
    return Costed(presets, first, found, core, tuple(refusals))
