"""What a comparison says: two ledgers and sentences for a reader, the same figures for a program."""

from collections.abc import Iterator, Sequence

from streamhost.commands.common import GAP, MINUS, Cell, Column, ledger, printable
from streamhost.commands.compare import Compared
from streamhost.files import AudioInfo
from streamhost.formats import Float
from streamhost.measure.limits import PEAK_DBFS, SECONDS, SEED, Verdict

LONGEST_TITLE = 56

NOISE = (
    Column("lane"), Column("form · decomposition · format"), Column("noise", "dBFS", 1), Column("95 %", "± dB", 2),
    Column("predicted", "dBFS", 1), Column("white", "model"), Column("A-weighted", "dBFS", 1),
    Column("full band", "dBFS", 1),
)
REST = (
    Column("response", "dB off", 3), Column("at", "Hz", 1), Column("poles", "unstable"), Column("saturated"),
    Column("wrapped"), Column("accumulator", "overflows"), Column("peak", "dBFS", 1), Column("mean", "LSB", 1),
    Column("multiply"), Column("add"), Column("words"), Column("time", "ns/frame", 1), Column("raise", "dB"),
)
METHOD = (
    "Noise: output minus ideal, without its mean, 20 Hz to 20 kHz, once settled. A full-scale sine reads 0 dBFS.",
    "Response: the largest deviation by coefficient rounding, where the filter is within 40 dB of its maximum.",
)


def text(compared: Sequence[Compared], info: AudioInfo) -> str:
    """The whole report for a terminal."""
    paragraphs = [
        ledger(NOISE, [_noise_row(one) for one in compared]),
        ledger(REST, [_rest_row(one) for one in compared]),
        "\n".join(_verdict(compared)),
        "\n".join(_remarks(compared)),
        "\n".join(_listening(compared)),
        "\n".join((_conditions(compared, info), *METHOD)),
    ]
    return "\n\n".join(paragraph for paragraph in paragraphs if paragraph)


def _noise_row(one: Compared) -> list[Cell]:
    noise, prediction = one.measured.noise, one.measured.prediction
    white = {True: "holds", False: "fails", None: None}[one.measured.white.holds]
    title = one.preset.title
    if len(title) > LONGEST_TITLE:
        title = title[: LONGEST_TITLE - 1] + "…"
    predicted = prediction.dbfs if prediction is not None else None
    return [title, one.label, noise.dbfs, noise.interval_db, predicted, white, noise.a_dbfs, noise.full_dbfs]


def _rest_row(one: Compared) -> list[Cell]:
    measured = one.measured
    tally, counts = measured.tally, measured.counts
    return [
        measured.deviation.db, measured.deviation.hz, measured.unstable, tally.saturations, tally.wraps,
        tally.accumulator_overflows, measured.peak_dbfs, measured.dc_lsb, counts.multiplications, counts.additions,
        counts.delays, measured.ns_per_frame, measured.difference_gain_db,
    ]


def _verdict(compared: Sequence[Compared]) -> Iterator[str]:
    asked = [one for one in compared if one.verdicts]
    if not asked:
        return
    met = sum(not one.misses for one in asked)
    others = [str(number) for number, one in enumerate(compared, 1) if not one.verdicts]
    rest = f"; {', '.join(others)} {'states' if len(others) == 1 else 'state'} none" if others else ""
    yield f"{met} of {len(asked)} with limits {'meets' if met == 1 else 'meet'} every limit{rest}."
    for number, one in enumerate(compared, 1):
        if one.misses:
            yield f"{number} misses " + "; ".join(_miss(verdict) for verdict in one.misses) + "."


def _miss(verdict: Verdict) -> str:
    allowed = f"at most {_signed(verdict.allowed)} {verdict.unit}"
    if verdict.found is None:
        return f"{verdict.key}, {allowed}: no figure, since {verdict.reason}"
    return f"{verdict.key}: {_signed(round(verdict.found, 3))}, {allowed}"


def _signed(number: float) -> str:
    return f"{number:g}".replace("-", MINUS)


def _remarks(compared: Sequence[Compared]) -> Iterator[str]:
    """Why figures are missing, what they are worth, and what is dangerous."""
    for number, one in enumerate(compared, 1):
        measured = one.measured
        if measured.unstable:
            yield f"{number} is unstable {_as_what(one)}: {_poles(measured.unstable)} on or outside the unit circle."
        if measured.noise.reason:
            yield f"{number} has no noise figure: {measured.noise.reason}."
        elif measured.noise.excluded:
            yield f"{number}: {100 * measured.noise.excluded:.2f} % of the frames do not count: an overflow was near."
        if measured.white.reason and measured.white.holds is False:
            yield f"{number}: the white model does not hold here: {measured.white.reason}."
        elif measured.white.reason and not isinstance(one.realization.format, Float):
            yield f"{number}: whether the white model holds is not known: {measured.white.reason}."
        if isinstance(one.realization.format, Float) and measured.prediction is not None:
            yield f"{number}: in floating point the predicted noise is an estimate."
        for hazard in one.realization.built.hazards:
            yield f"{number}, hazard: {hazard}"


def _as_what(one: Compared) -> str:
    return "as asked" if one.realization.filter.unstable_poles() else "with its coefficients rounded"


def _poles(count: int) -> str:
    return "1 pole lies" if count == 1 else f"{count} poles lie"


def _listening(compared: Sequence[Compared]) -> Iterator[str]:
    for number, one in enumerate(compared, 1):
        if one.output is not None:
            yield printable(f"{number}{GAP}{one.output}{GAP}{_difference(one)}")


def _difference(one: Compared) -> str:
    gain = one.measured.difference_gain_db
    if one.difference is None:
        return "no difference written: it ran away"
    if gain is None:
        return f"{one.difference}{GAP}is silent"
    return f"{one.difference}{GAP}" + (f"raise by {gain} dB" if gain >= 0 else f"loud: lower by {-gain} dB")


def _conditions(compared: Sequence[Compared], info: AudioInfo) -> str:
    ideals: dict[str, list[str]] = {}
    for number, one in enumerate(compared, 1):
        ideals.setdefault(one.measured.ideal, []).append(str(number))
    said = "; ".join(f"{ideal} for {', '.join(numbers)}" for ideal, numbers in ideals.items())
    channels = "1 channel" if info.channels == 1 else f"{info.channels} channels"
    sentences = [
        f"Input: {printable(info.path.name)}, {info.seconds:.2f} s, {channels}, {info.rate} Hz.",
        f"The ideal ran in {said}.",
    ]
    if seed_of(compared) is not None:
        signal = f"{SECONDS:g} s of uniform white noise, peak {_signed(PEAK_DBFS)} dBFS, seed {SEED}"
        sentences.append(f"Limits were checked on {signal}.")
    return " ".join(sentences)


def seed_of(compared: Sequence[Compared]) -> int | None:
    """The seed of the random signal that was used; None where none was."""
    return SEED if any(one.verdicts for one in compared) else None


def document(compared: Sequence[Compared], info: AudioInfo) -> dict[str, object]:
    """The figures under keys that are spelt with their unit; those not given are None."""
    return {
        "rate": info.rate, "input": str(info.path), "seed": seed_of(compared),
        "realizations": [_figures(one) for one in compared],
    }


def _figures(one: Compared) -> dict[str, object]:
    measured, realization = one.measured, one.realization
    noise, tally, counts = measured.noise, measured.tally, measured.counts
    return {
        "preset": one.preset.source.name,
        "title": one.preset.title,
        "decomposition": realization.decomposition,
        "form": realization.form,
        "format": realization.format.label,
        "response_deviation_db": measured.deviation.db,
        "response_deviation_hz": measured.deviation.hz,
        "unstable": measured.unstable,
        "noise_dbfs": noise.dbfs,
        "noise_interval_db": noise.interval_db,
        "noise_full_dbfs": noise.full_dbfs,
        "noise_a_dbfs": noise.a_dbfs,
        "noise_predicted_dbfs": measured.prediction.dbfs if measured.prediction is not None else None,
        "white_model_holds": measured.white.holds,
        "dc_lsb": measured.dc_lsb,
        "peak_dbfs": measured.peak_dbfs,
        "saturations": tally.saturations,
        "wraps": tally.wraps,
        "accumulator_overflows": tally.accumulator_overflows,
        "multiplications": counts.multiplications,
        "additions": counts.additions,
        "delays": counts.delays,
        "ns_per_frame": measured.ns_per_frame,
        "output": str(one.output) if one.output is not None else None,
        "difference": str(one.difference) if one.difference is not None else None,
        "difference_gain_db": measured.difference_gain_db,
    }
