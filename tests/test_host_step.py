"""The compiled step: what the realization gives, to the bit, for any division into blocks, lanes alone or together."""

import math
import re
from dataclasses import replace
from random import Random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from random_diagrams import random_diagram
from random_formats import random_format

import streamhost as sh
from streamhost.diagram import Diagram
from streamhost.errors import FormatError, RequestError
from streamhost.host import Host, Lane, Meters
from streamhost.host.records import PARTS
from streamhost.host.step import part_source, step_source
from streamhost.realization import Realization
from streamhost.structures import Built, build

FRAMES = 311
FILTER = sh.Filter.from_sections([[0.9, -1.7, 0.85, 1.0, -1.8, 0.83], [0.5, 0.3, 0.1, 1.0, -0.4, 0.6]], rate=48000)
LOUD = sh.Fixed("Q1.15", coefficients="Q2.14", overflow="wrap")
REALIZATIONS = {
    "float64": sh.realize(FILTER, form="transposed-2"),
    "float32": sh.realize(FILTER, form="direct-1", format="float32"),
    "fused": sh.realize(FILTER, form="direct-2", format="float32-fused"),
    "16x16+40": sh.realize(FILTER, form="direct-1", format="16x16+40"),
    "wrap": sh.realize(FILTER, form="transposed-1", format=LOUD),
    "dither": sh.realize(
        FILTER, form="direct-1", format=sh.Fixed("Q1.15", coefficients="Q2.14", dither="tpdf", dither_seed=3)
    ),
}
BLOCKS = (0, 1, 2, 3, 5, 7, 11, 13, 31, 64, 101)

names = st.sampled_from(sorted(REALIZATIONS))
divisions = st.lists(st.sampled_from(BLOCKS), min_size=1, max_size=12)


def signal(channels: int, seed: int = 5, frames: int = FRAMES) -> np.ndarray:
    """Loud enough that words overflow."""
    return np.random.default_rng(seed).uniform(-1.2, 1.2, (frames, channels))


def divided(x: np.ndarray, lengths: list[int]) -> list[np.ndarray]:
    """The signal in blocks of these lengths, over and over until it ends."""
    lengths = [*lengths, 1] if not any(lengths) else lengths
    blocks, start, turn = [], 0, 0
    while start < len(x):
        blocks.append(x[start : start + lengths[turn % len(lengths)]])
        start += len(blocks[-1])
        turn += 1
    return blocks


def run(lanes: list[Lane], blocks: list[np.ndarray]) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """Outputs and marks of each lane over all blocks."""
    host = Host(lanes, block=max(1, *(len(block) for block in blocks)))
    outputs: list[list[np.ndarray]] = [[] for _ in lanes]
    marks: list[list[np.ndarray]] = [[] for _ in lanes]
    for block in blocks:
        host.step(block)
        for k, lane in enumerate(lanes):
            assert len(lane.output) == len(block)
            outputs[k].append(lane.output.copy())
            marks[k].append(lane.marks.copy())
    assert host.frames == sum(len(block) for block in blocks)
    assert all(lane.frame == host.frames for lane in lanes)
    return [np.concatenate(o) for o in outputs], [np.concatenate(m) for m in marks]


def everything(lane: Lane, output: np.ndarray, marks: np.ndarray) -> tuple[object, ...]:
    """All that a run leaves behind, to the bit."""
    return output.tobytes(), marks.tobytes(), lane.memory.state.tobytes(), lane.meters, lane.tally()


# Laws


@pytest.mark.parametrize("name", sorted(REALIZATIONS))
@given(lengths=divisions, channels=st.integers(1, 5), metered=st.booleans())
@settings(max_examples=15)
def test_any_division_into_blocks_leaves_the_same_bits(
    name: str, lengths: list[int], channels: int, metered: bool
) -> None:
    x = signal(channels)
    whole, parts = (Lane(REALIZATIONS[name], channels, metered=metered) for _ in range(2))
    (y,), (m,) = run([whole], [x])
    (y_parts,), (m_parts,) = run([parts], divided(x, lengths))
    assert everything(parts, y_parts, m_parts) == everything(whole, y, m)


@given(
    chosen=st.lists(st.tuples(names, st.booleans()), min_size=1, max_size=16),
    channels=st.integers(1, 3),
    lengths=divisions,
)
@settings(max_examples=25)
def test_lanes_together_give_what_each_gives_alone(
    chosen: list[tuple[str, bool]], channels: int, lengths: list[int]
) -> None:
    blocks = divided(signal(channels), lengths)
    together = [Lane(REALIZATIONS[name], channels, metered=metered) for name, metered in chosen]
    outputs, marks = run(together, blocks)
    for lane, y, m, (name, metered) in zip(together, outputs, marks, chosen, strict=True):
        alone = Lane(REALIZATIONS[name], channels, metered=metered)
        (y_alone,), (m_alone,) = run([alone], blocks)
        assert everything(lane, y, m) == everything(alone, y_alone, m_alone)


@pytest.mark.parametrize("channels", [1, 2, 3, 4, 5])
@pytest.mark.parametrize("metered", [False, True])
@pytest.mark.parametrize("name", sorted(REALIZATIONS))
def test_the_step_gives_what_the_realization_gives(name: str, metered: bool, channels: int) -> None:
    realization, x = REALIZATIONS[name], signal(channels)
    lane = Lane(realization, channels, metered=metered)
    (y,), _ = run([lane], divided(x, [101, 7]))
    realization.reset()
    assert y.tobytes() == realization.process(x).tobytes()
    if metered:
        assert lane.tally() == realization.tally()
    realization.reset()


def test_the_loud_signal_does_overflow_so_that_the_laws_above_see_marks_and_counts() -> None:
    lanes = [Lane(REALIZATIONS[name], 2, metered=True) for name in ("16x16+40", "wrap")]
    _, marks = run(lanes, [signal(2)])
    assert lanes[0].tally().saturations > 0
    assert lanes[1].tally().wraps > 0
    assert all(0 < m.sum() < m.size for m in marks)


@given(seed=st.integers(0, 10**6), channels=st.integers(1, 2), lengths=divisions)
@settings(max_examples=12)
def test_diagrams_of_every_kind_of_node_and_of_several_outputs(seed: int, channels: int, lengths: list[int]) -> None:
    rng = Random(seed)
    diagram = random_diagram(rng, 14, step=2.0**-6)
    format = random_format(rng)
    try:
        realization = Realization(FILTER, _drawn_as(diagram), format)
        expected = realization.process(signal(channels))
    except FormatError:  # the two do not go together, which is said elsewhere
        return
    except RequestError as error:
        assert "samples are float64, which holds 53 bits" in str(error)
        return
    lane = Lane(realization, channels, metered=True)
    (y,), _ = run([lane], divided(signal(channels), lengths))
    assert y.tobytes() == expected.reshape(FRAMES, -1).tobytes()
    assert y.shape == (FRAMES, len(realization.outputs) * channels)
    assert lane.tally() == realization.tally()


def _drawn_as(diagram: Diagram) -> Built:
    return replace(build(FILTER, form="direct-1"), diagram=diagram)


# Marks, meters, state


def test_marks_stand_in_the_very_frames_that_overflow() -> None:
    gain = sh.Filter.from_coefficients([1.5], [1.0], rate=48000)
    lane = Lane(sh.realize(gain, form="direct-1", format=LOUD), 2, metered=True)
    host = Host([lane], block=4)
    host.step(np.array([[0.5, 0.9], [-0.9, 0.0], [0.6, -0.6], [0.7, 0.7]]))
    assert lane.marks.tolist() == [[0, 1], [1, 0], [0, 0], [1, 1]]
    host.step(np.array([[0.1, 0.1], [0.1, 0.9]]))
    assert lane.marks.tolist() == [[0, 0], [0, 1]]
    assert lane.tally().wraps == 5


def test_meters_are_of_all_samples_since_reset_with_nan_apart() -> None:
    wire = sh.Filter.from_coefficients([1.0], [1.0], rate=48000)
    lane = Lane(sh.realize(wire, form="direct-1"), 2)
    host = Host([lane], block=2)
    host.step(np.array([[0.25, -0.5], [0.125, 0.0]]))
    host.step(np.array([[0.0, 0.25]]))
    assert lane.meters == Meters(3, 6, 0.5, 0.25**2 + 0.5**2 + 0.125**2 + 0.25**2, 0)
    assert lane.meters.peak_dbfs == pytest.approx(20 * math.log10(0.5), abs=1e-12)
    lane.reset()
    assert lane.meters == Meters(0, 0, 0.0, 0.0, 0)
    assert lane.meters.peak_dbfs == lane.meters.rms_dbfs == -math.inf


def test_a_full_scale_sine_reads_0_dbfs() -> None:
    # AES17: the level of a sine whose peak is full scale is 0 dBFS.
    wire = sh.Filter.from_coefficients([1.0], [1.0], rate=48000)
    lane = Lane(sh.realize(wire, form="direct-1"), 1)
    Host([lane], block=4800).step(np.cos(2 * np.pi * np.arange(4800) / 48)[:, np.newaxis])
    assert lane.meters.rms_dbfs == pytest.approx(0, abs=1e-9)  # float64 sums over 4800 samples
    assert lane.meters.peak_dbfs == 0


def test_nan_in_an_output_is_counted_and_spoils_no_level() -> None:
    # A sum of infinities of both signs is the only way to NaN behind a door that lets none in.
    filter = sh.Filter.from_coefficients([1.0, -1.0], [1.0], rate=48000)
    lane = Lane(sh.realize(filter, form="direct-1"), 1)
    host = Host([lane], block=4)
    host.step(np.array([[0.5], [0.25]]))
    assert lane.meters.is_finite
    host.step(np.array([[np.inf], [np.inf], [0.0]]))
    assert (lane.meters.not_a_number, lane.meters.peak, lane.meters.is_finite) == (1, np.inf, False)


def test_a_lane_leaves_the_realizations_own_state_alone_and_can_begin_again() -> None:
    realization, x = REALIZATIONS["dither"], signal(2)
    realization.reset()
    first = realization.process(x[:100])
    lane = Lane(realization, 2)
    host = Host([lane], block=FRAMES)
    host.step(x)
    y = lane.output.copy()
    assert np.concatenate([first, realization.process(x[100:])]).tobytes() == y.tobytes()
    lane.reset()
    host.step(x)
    assert lane.output.tobytes() == y.tobytes()
    assert (lane.frame, host.frames) == (FRAMES, 2 * FRAMES)
    realization.reset()


def test_blocks_that_are_not_contiguous_are_read_in_their_order() -> None:
    x = signal(2)
    straight, turned = Lane(REALIZATIONS["float64"], 2), Lane(REALIZATIONS["float64"], 2)
    Host([straight], FRAMES).step(x)
    Host([turned], FRAMES).step(np.asfortranarray(x))
    assert straight.output.tobytes() == turned.output.tobytes()


# Refusals


def test_what_does_not_fit_a_host_is_refused() -> None:
    lane = Lane(REALIZATIONS["float64"], 2)
    host = Host([lane], block=8)
    for shape in ((8,), (8, 1), (8, 3), (9, 2), (8, 2, 1)):
        with pytest.raises(RequestError, match=r"does not fit this host: \(up to 8, 2\) is needed"):
            host.step(np.zeros(shape))
    assert (host.frames, lane.frame) == (0, 0)
    with pytest.raises(RequestError, match="at least one lane"):
        Host([])
    with pytest.raises(RequestError, match=r"one number of channels; these have \[1, 2\]"):
        Host([lane, Lane(REALIZATIONS["float64"], 1)])
    with pytest.raises(RequestError, match="at least 1 frame, not 0"):
        Host([lane], block=0)


def test_a_lane_of_other_channels_than_its_coefficients_is_refused() -> None:
    diagram = random_diagram(Random(4), 8, channels=2)
    realization = Realization(FILTER, _drawn_as(diagram), sh.Float())
    with pytest.raises(RequestError, match="coefficients for 2 channels, and 3 came"):
        Lane(realization, 3)
    assert Lane(realization, 2).channels == 2


# What an audio thread may not do


CALLED_BY_NAME = {
    "memset", "memcpy", "fabs", "is", "assume", "rint", "floor", "trunc", "umin", "umax", "smin", "smax", "lifetime",
    "@clock_gettime",
}
"""What the processor does itself, under the names that the compiler has for it, and the clock."""


@pytest.mark.parametrize("name", ["the core", *(pytest.param(name, marks=pytest.mark.slow) for name in PARTS)])
def test_the_compiled_step_allocates_nothing_locks_nothing_and_cannot_raise(name: str) -> None:
    module: dict[str, object] = {"CACHE": False, "__name__": "step_in_memory"}
    exec(step_source() if name == "the core" else part_source(name), module)
    compiled = module[{"the core": "step", "record": "keep"}.get(name, name)]
    text = compiled.inspect_llvm()  # type: ignore[attr-defined]
    bodies = [body[: body.index("\n}")] for body in re.split(r"^define ", text, flags=re.MULTILINE)[1:]]
    ours = [body for body in bodies if re.match(r"[^@]* i32 @_ZN", body)]
    assert ours
    for body in ours:
        # kernels and parts are called by address, our own functions by names that begin with _ZN
        called = re.findall(r"\b(?:call|invoke) [^\n(]*?@([^\s(]+)\(", body)
        others = {"@" + each if "." not in each else each.split(".")[1] for each in called if not each.startswith("_ZN")}
        assert others <= CALLED_BY_NAME
        # Numba's functions answer 0 when all is well and anything else when an exception is under way.
        assert all(only_zero(body, value) for value in re.findall(r"\bret i32 (\S+)", body))


def only_zero(body: str, value: str) -> bool:
    """Whether a function's answer is 0, or that of another of ours that it has called."""
    if value == "0":
        return True
    (made,) = re.findall(rf"^  {re.escape(value)} = (.*)$", body, flags=re.MULTILINE)
    if made.startswith("phi"):
        return all(only_zero(body, each) for each in re.findall(r"\[ (\S+),", made))
    return re.match(r"(tail )?call (range\S+ \S+ )?(noundef )?i32 @_ZN", made) is not None
