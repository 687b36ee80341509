"""The report of `streamhost compare`."""

import shutil
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from pathlib import Path, PurePosixPath
from typing import Any

from streamhost.commands.common import Progress, version, write_json
from streamhost.commands.compare import Compared, label
from streamhost.commands.compare_text import METHOD, conditions, document, refused, remarks
from streamhost.commands.documents import document_of
from streamhost.commands.instruments import INSTRUMENTS, Asked, limit_verdicts
from streamhost.commands.reporting import command_line, counts_of, documents_of, drawing_of
from streamhost.commands.verdict_text import SIGNAL
from streamhost.files import AudioInfo, AudioWriter, read_all, read_blocks
from streamhost.measure import Figures, Measured, Verdict, limit_band
from streamhost.measure.limits import stated_limits
from streamhost.presets import Preset
from streamhost.presets.realizing import Refusal
from streamhost.realization import Realization
from streamhost.report import AUDIO, FIGURES, INDEX, Contents, Lane, Sound, page
from streamhost.report.words import number, several

BLOCK = 1 << 16


def write_compared(
    folder: Path, compared: Sequence[Compared], info: AudioInfo, source: str, refusals: Sequence[Refusal]
) -> None:
    """The report of a comparison into its folder, which may hold the audio already; `refusals` of forms that were sought."""
    common = _common_limits([one.preset for one in compared])
    x = read_all(info.path)[0]
    lanes, shorts = [], telling([one.realization for one in compared])
    documents: list[PurePosixPath] = []
    with Progress("report", len(compared)) as progress:
        for place, one in enumerate(compared, 1):
            progress.step(one.label)
            results = _results(one, x, progress)
            lanes.append(replace(_lane(folder, place, one, results, common, info), short=shorts[place - 1]))
            documents += documents_of(folder, results, f"{place}-")
    first, title = compared[0], _shared_title([one.preset.own_title for one in compared])
    contents = Contents(
        heading=f"{title}: {several(len(compared), 'realization')}, compared", lanes=tuple(lanes),
        source=f"{info.path.name}, {info.seconds:.2f} s, {several(info.channels, 'channel')}, {info.rate} Hz",
        command=command_line(), version=version(), rate=float(info.rate),
        band=limit_band(first.preset.limits, first.preset.rate), limit_signal=SIGNAL,
        conditions=(*METHOD, conditions(compared, info)), remarks=(*remarks(compared), *refused(refusals)),
        documents=tuple(dict.fromkeys(documents)),
    )
    (folder / INDEX).write_text(page(contents), encoding="utf-8")
    figures: Any = document([replace(one, files=()) for one in compared], info, source, refusals)
    for own, lane in zip(figures["realizations"], lanes, strict=True):
        own |= {name: document_of(result) for name, result in lane.results.items()}
    write_json(str(folder / FIGURES), figures)


def _shared_title(titles: Sequence[str]) -> str:
    """What all titles begin with, up to a comma or a colon; the first where that is nothing."""
    parts = [title.replace(":", ",").split(",")[0].strip() for title in titles]
    return parts[0] if len(set(parts)) == 1 else titles[0]


def telling(realizations: Sequence[Realization]) -> list[str]:
    """Of form, decomposition and format what is not the same in all; the form in any case."""
    parts = [(each.form, each.decomposition, each.format.label) for each in realizations]
    kept = [place for place in range(3) if place == 0 or len({each[place] for each in parts}) > 1]
    return [" · ".join(each[place] for place in kept) for each in parts]


def _common_limits(presets: Sequence[Preset]) -> Mapping[str, object] | None:
    """The limits of those that state some, where they are the same in all of them."""
    stated = [preset.limits for preset in presets if stated_limits(preset.limits)]
    return stated[0] if stated and all(limits == stated[0] for limits in stated) else None


def _results(one: Compared, x: Any, progress: Progress) -> dict[str, Any]:
    """Of all instruments, quick; noise is that of the comparison itself."""
    asked = Asked(one.preset, one.realization, x, limit_band(one.preset.limits, one.preset.rate), True, progress.within)
    assert one.noise is not None, "a comparison with a report keeps it"
    return {instrument.name: one.noise if instrument.name == "noise" else instrument.run(asked) for instrument in INSTRUMENTS}


def _verdicts(one: Compared, common: Mapping[str, object] | None) -> tuple[Verdict, ...]:
    """Its own, or against what the others state."""
    if one.verdicts or common is None:
        return one.verdicts
    return limit_verdicts(replace(one.preset, limits=dict(common)), one.realization)


def _lane(
    folder: Path, place: int, one: Compared, results: Mapping[str, Any], common: Mapping[str, object] | None, info: AudioInfo
) -> Lane:
    sounds, silent = _sounds(folder, one, info)
    return Lane(
        number=place, title=one.preset.title, form=label(one.realization), short="", states_limits=bool(one.verdicts),
        verdicts=_verdicts(one, common), results=results, facts=tuple(_facts(one)), drawing=drawing_of(one.realization),
        counts=counts_of(one.realization), sounds=sounds, silent=silent,
    )


def _facts(one: Compared) -> Iterator[tuple[str, dict[str, str]]]:
    measured = one.measured
    for place, figures in enumerate(measured.outputs):
        shared = {} if place else dict(_facts_of_all(measured))
        yield figures.name if len(measured.outputs) > 1 else "", dict(_facts_of(figures)) | shared


def _facts_of_all(measured: Measured) -> Iterator[tuple[str, str]]:
    tally, counts = measured.tally, measured.counts
    yield "Overflows, frames", f"{tally.saturations + tally.wraps:,}"
    yield "Unstable, poles", str(measured.unstable)
    yield "Multiply", str(counts.multiplications)
    yield "Add", str(counts.additions)
    yield "Memory, words", str(counts.delays)
    yield "Time, ns", number(measured.ns_per_frame)


def _facts_of(figures: Figures) -> Iterator[tuple[str, str]]:
    noise, prediction = figures.noise, figures.prediction
    yield "Noise, dBFS", number(noise.dbfs)
    yield "95 %, ± dB", number(noise.interval_db, 2)
    yield "Predicted, dBFS", number(prediction.dbfs if prediction is not None else None)
    yield "A-weighted, dBFS", number(noise.a_dbfs)
    yield "Peak, dBFS", number(figures.peak_dbfs)


def _sounds(folder: Path, one: Compared, info: AudioInfo) -> tuple[tuple[Sound, ...], tuple[str, ...]]:
    """Outputs as they are, differences raised so that they can be heard; the files come to lie in the report."""
    sounds, silent = [], []
    for figures, (output, difference) in zip(one.measured.outputs, one.files, strict=True):
        of = f" at {figures.name}" if len(one.measured.outputs) > 1 else ""
        beside = folder / AUDIO
        if output.parent != beside:
            shutil.copyfile(output, beside / output.name)
        sounds.append(Sound(f"Output{of}", PurePosixPath(AUDIO, output.name)))
        gain = figures.difference_gain_db
        if difference is None or gain is None:
            silent.append(f"No difference{of}: it {'ran away' if difference is None else 'is silent'}.")
        else:
            _raised(difference, beside / difference.name, gain, info)
            how = f"raised by {gain} dB" if gain >= 0 else f"lowered by {-gain} dB"
            sounds.append(Sound(f"Difference{of}, {how}", PurePosixPath(AUDIO, difference.name)))
        if difference is not None and gain is None and difference.parent == beside:
            difference.unlink()
    return tuple(sounds), tuple(silent)


def _raised(source: Path, target: Path, gain_db: int, info: AudioInfo) -> None:
    with AudioWriter(target, rate=info.rate, channels=info.channels, subtype="pcm24", frames_expected=info.frames,
                     overwrite=True) as writer:
        for block in read_blocks(source, BLOCK):
            writer.write(block * 10.0 ** (gain_db / 20.0))
