"""A real card, if a virtual one: what an independent ear recorded behind it is what `render` gives, to the bit.

A count of frames, k / 2^24, rides on the second channel and tells which frame each recorded one is; float32 holds it exactly.
That nothing is missing is asserted of a latency of 40 ms only: other tests run beside this one. What was heard is
compared always.
"""

import os
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from unittest import mock

import numpy as np
import pytest
from numpy.typing import NDArray
from sound_server import RATE, SoundServer, counted, is_there

from streamhost.files import AudioWriter, read_all
from streamhost.host import Change, Device, Guard, Host
from streamhost.host.plan import changes_made
from streamhost.host.recording import Recorder
from streamhost.host.records import PARTS
from streamhost.host.step import compile_part
from streamhost.live.card import Card, Early
from streamhost.live.controls import Controls, planned_in_order
from streamhost.live.portaudio import Wanted
from streamhost.live.recipe import Input, LaneAsked, Recipe
from streamhost.live.watch import CLOSE_S
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_presets
from streamhost.realization import Realization
from streamhost.shipped import resolve

pytestmark = pytest.mark.skipif(not is_there(), reason="no sound server here: apt install pulseaudio pulseaudio-utils")

FAST = Guard(rise_db_per_s=600.0)
RISE = 4800 + 1024
"""Frames that the output takes to come up by 60 dB, and some for the block in which it is told to."""
STREAMS = ((64, "compiled"), (128, "compiled"), (256, "compiled"), (128, "python"))
CHANGEOVERS = ("carry", "warm", "fade", "cold")


@pytest.fixture(scope="module")
def server() -> Iterator[SoundServer]:
    for part in PARTS:
        compile_part(part)
    with SoundServer() as server, mock.patch.dict(os.environ, server.environment):
        yield server


@pytest.fixture(scope="module")
def realizations() -> tuple[Realization, ...]:
    names = ("rumble-float32", "rumble-double-state", "rumble-naive-24-bit")
    return tuple(realize_presets([load_preset(resolve(name, "preset")) for name in names], 1))


def recipe_of(realizations: Sequence[Realization], block: int, changes: Sequence[Change] = (), **more: object) -> Recipe:
    lanes = tuple(map(LaneAsked, realizations))
    made = [lane.made(1) for lane in lanes]
    return Recipe(lanes, Input("white"), 1, block, guard=FAST, planned=planned_in_order(changes, made), **more)  # type: ignore[arg-type]


def rendered(recipe: Recipe, frames: int) -> NDArray[np.float64]:
    """What is heard of the recipe, by a host that no card drives: (frames,)."""
    lanes = [lane.made(1) for lane in recipe.lanes]
    host = Host(lanes, 4096, device=Device(0, 1), source=recipe.input.made(recipe.rate, 1))
    for each in recipe.planned:
        host.plan.change(each.change)
    out, heard = np.zeros((4096, 1)), []
    while host.frames < frames:
        host.step(None, out)
        heard.append(host.heard_block[:, 0].copy())
    return np.concatenate(heard)


def wanted(block: int, *, latency_s: float = 0.04, **more: object) -> Wanted:
    return Wanted(RATE, block, 2, device="vsink", latency_s=latency_s, **more)  # type: ignore[arg-type]


@contextmanager
def playing(recipe: Recipe, wanted: Wanted) -> Iterator[Card]:
    with Early() as early, Card(recipe, wanted, early) as card:
        card.begin()
        yield card


def play(card: Card, seconds: float) -> None:
    until = time.monotonic() + seconds
    while time.monotonic() < until:
        card.tend()
        time.sleep(0.02)


def until(card: Card, what: str, *, is_lost: bool, seconds: float) -> float:
    """How long it takes."""
    began = time.monotonic()
    while card.is_lost is not is_lost:
        card.tend()
        assert time.monotonic() - began < seconds, what
        time.sleep(0.01)
    return time.monotonic() - began


def test_what_is_heard_is_what_is_rendered(server: SoundServer, realizations: tuple[Realization, ...]) -> None:
    """One engine, whose stream is opened again with other blocks, the last time through Python; in each a change."""
    recipe = recipe_of(realizations, 256, [Change(2 * RISE, 2, "warm")])
    ups = []
    with server.ear() as ear, playing(recipe, wanted(64)) as card:
        card.count_on(1)
        card.come_up()
        controls = Controls(card, [lane.made(1) for lane in recipe.lanes], chosen=2)
        for lane, ((block, callback), changeover) in enumerate(zip(STREAMS, CHANGEOVERS, strict=True)):
            if lane:
                card.choose(wanted(block, callback=callback))
                until(card, "it plays again", is_lost=False, seconds=10.0)
            ups.append(card.frame + RISE)
            play(card, 0.35)
            controls.changeover = changeover
            controls.hear(lane % 3)
            play(card, 0.25)
            ups.append(card.frame - 6000)  # what is on its way is lost with the stream
            assert card.opened.callback == callback
        changes = [Change(each.frame, each.lane, each.changeover) for each in changes_made(card.shared)]
    assert [each.changeover for each in changes] == ["warm", *CHANGEOVERS]
    assert len(set(card.hashes)) == 3
    count, sound = counted(ear.heard)
    exact = rendered(recipe_of(realizations, 256, changes), count[-1] + 1).astype(np.float32)
    for first, last, change in zip(ups[::2], ups[1::2], changes[1:], strict=True):
        there = (count >= first) & (count < last)
        assert np.array_equal(count[there], np.arange(first, last)), "nothing is missing, nothing comes twice"
        assert first < change.frame < last
        assert np.array_equal(sound[there], exact[first:last])
        assert np.abs(sound[there]).max() > 0.05


def test_a_card_lost_and_found_goes_on_where_it_was(server: SoundServer, realizations: tuple[Realization, ...]) -> None:
    recipe = recipe_of(realizations[:2], 128)
    with playing(recipe, wanted(128)) as card:
        card.count_on(1)
        controls = Controls(card, [lane.made(1) for lane in recipe.lanes])
        controls.louder(-6)
        controls.hear(1)
        card.come_up()
        play(card, 0.3)
        server.kill()
        assert until(card, "the loss of a server is noticed", is_lost=True, seconds=1.0) < 1.0
        assert card.said == "card lost, looking"
        server.start()
        with server.ear() as ear:
            until(card, "the card comes back", is_lost=False, seconds=15.0)
            back_at = card.frame
            play(card, 0.5)
        assert (card.heard, card.said, controls.notice) == (1, "sounding", "Lane 2, by carry.")
        server.suspend(True)
        assert until(card, "a sink that stands still is noticed", is_lost=True, seconds=1.0) < 1.0
        server.suspend(False)
        until(card, "it comes back", is_lost=False, seconds=15.0)
    count, sound = counted(ear.heard)
    up = count > back_at + RISE
    assert up.sum() > RATE / 8
    exact = rendered(recipe_of(realizations[:2], 128, [Change(0, 1, "cold")]), count[-1] + 1)[count[up]]
    assert np.abs(sound[up] - exact * 10.0**-0.3).max() < 1e-4  # lane 2 began by carry: up to its roundings of 2^-15
    assert [loss.reason for loss in card.losses] == ["has gone", "stands still"]


def test_a_frozen_server_is_left_by_killing_the_engine(server: SoundServer, realizations: tuple[Realization, ...]) -> None:
    with playing(recipe_of(realizations[:2], 256), wanted(256)) as card:
        first = card.engine
        card.wait(card.subtract(1, 6.0))
        Controls(card, [lane.made(1) for lane in card.recipe.lanes]).hear(1)
        play(card, 0.2)
        server.freeze()
        try:
            assert until(card, "a frozen server is noticed", is_lost=True, seconds=1.0) < 1.0
            frames = card.frame
            play(card, CLOSE_S + 0.5)
        finally:
            server.thaw()
        until(card, "the card comes back", is_lost=False, seconds=30.0)
        assert card.engine != first
        assert card.frame > frames
        assert (card.heard, card.said) == (1, "muted")
        server.freeze()
        began = time.monotonic()
    server.thaw()
    assert time.monotonic() - began < 4.0
    assert not Path(f"/proc/{card.engine}").exists()


def test_what_comes_in_comes_in_whole(server: SoundServer, tmp_path: Path, realizations: tuple[Realization, ...]) -> None:
    """Duplex on a card whose input is its own output: the count that goes out comes in again, through a lane that is a wire."""
    preset = tmp_path / "wire.toml"
    preset.write_text('title = "A wire"\nrate = 48000\n[[filter]]\nequation = "y[n] = x[n]"\n')
    wire = realize_presets([load_preset(preset)], 2)
    recipe = Recipe((LaneAsked(wire[0]),), Input("device"), 2, 128, inputs=2, guard=FAST, recording=RATE)
    file = tmp_path / "heard.wav"
    with playing(recipe, Wanted(RATE, 128, 2, 2, device="vduplex", latency_s=0.04)) as card:
        card.count_on(1)
        with Recorder(card.shared, AudioWriter(file, rate=RATE, channels=2, subtype="float")):
            play(card, 0.8)
    count, _ = counted(read_all(file)[0].astype(np.float32))
    assert len(count) > RATE / 3
    steps, places = np.unique(np.diff(count), return_counts=True)
    assert steps[np.argmax(places)] == 1
    assert places.sum() - places.max() <= 3, "gaps of a loaded machine, and no more"
