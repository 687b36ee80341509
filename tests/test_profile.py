"""What realizations cost: counts by hand, bounds by hand, the method of timing on clocks whose truth is known, the command."""

import json
from contextlib import suppress
from fractions import Fraction
from itertools import permutations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from streamhost import Filter, Fixed, Float, design, realize
from streamhost.commands.main import main
from streamhost.diagram import Builder
from streamhost.diagram.nodes import Residue
from streamhost.errors import PresetError, StructureError
from streamhost.presets import load_preset
from streamhost.presets.realizing import realize_preset
from streamhost.profile import bounds_of, estimate, load_core, parse_core, profile, profiling, work
from streamhost.profile.chains import Edge, longest_way, slowest_among, slowest_loop
from streamhost.profile.counters import counted
from streamhost.profile.driver import Lane, Machine, Speed
from streamhost.profile.machine import busy_cycles
from streamhost.profile.timing import BLOCKS, BLOCKS_A_ROUND, ENOUGH, LEAST, Times, timed
from streamhost.program.run import lower
from streamhost.shipped import names, resolve
from streamhost.structures import build, forms

RATE = 48000
PEAK = design("peak", rate=RATE, frequency=1000, gain_db=6, q=0.707)


def one(form, format="float64", filter=PEAK, decomposition="cascade"):
    return realize(filter, form=form, decomposition=decomposition, format=format)


def taps(count):
    half = np.linspace(0.1, 0.4, (count + 1) // 2).tolist()
    return Filter.from_coefficients([*half, *half[::-1][count % 2 :]], rate=RATE)


FILTERS = (
    PEAK, taps(8), taps(9), Filter.from_coefficients([0.5, 0.25, -0.125], rate=RATE),
    design("moving-average", rate=RATE, length=8),
    design("butterworth", rate=RATE, response="low-pass", order=3, frequency=12000),
)
"""One of which at least every form carries."""


def drawn(filter, form):
    """The filter in a form, None where it cannot carry it."""
    for decomposition in ("whole", "cascade"):
        with suppress(StructureError):
            return build(filter, form=form, decomposition=decomposition)
    return None


# Counts


@pytest.mark.parametrize(("form", "multiplications", "additions", "states"), [
    ("direct-1", 5, 4, 4), ("direct-2", 5, 4, 2), ("transposed-2", 5, 4, 2), ("lattice-ladder", 7, 6, 2), ("normal", 9, 6, 2),
    ("lattice-normalized", 11, 6, 2),
])
def test_textbook_counts_of_a_second_order_section(form, multiplications, additions, states):
    """Static counts per output sample, from memory: Oppenheim & Schafer ch. 6, Mitra; N = 2 in 3N + 1, 3N and 5N + 1, 3N."""
    found = work(one(form).program)
    assert (found.multiplications, found.additions, found.state_words) == (multiplications, additions, states)


@pytest.mark.parametrize(("form", "multiplications"), [("direct-1", 8), ("folded", 4)])
@pytest.mark.parametrize("format", ["float64", "16x16+40"])
def test_textbook_counts_of_taps(form, multiplications, format):
    """M taps: M multiplications, M / 2 folded, M - 1 additions and states (from memory, as above)."""
    found = work(one(form, format, taps(8), "whole").program)
    assert (found.multiplications, found.additions, found.state_words) == (multiplications, 7, 7)


def test_direct_1_in_full_by_hand():
    """y = b0 x + b1 x1 + b2 x2 - a1 y1 - a2 y2 in 16 bits: reads 5 coefficients, 4 states and x, keeps 4 states, puts y out."""
    found = work(one("direct-1", "16x16+40").program)
    assert found == type(found)(
        multiplications=5, additions=4, shifts=0, roundings=1, saturations=1, loads=10, stores=5,
        state_words=4, state_bytes=8, coefficient_words=5, coefficient_bytes=10,
    )


def test_words_of_different_points_are_shifted_and_long_states_have_more_bytes():
    """transposed-2 with the state Q1.31 and products of 15 + 14 fraction bits: b0's product is shifted to the 31 of d1 in y,
    those of b1 and a1 to the 31 of d2, the sum of b2's and a2's to the state's 31; only y drops bits."""
    format = Fixed("Q1.15", coefficients="Q2.14", state="Q1.31")
    found = work(one("transposed-2", format).program)
    assert (found.shifts, found.roundings, found.state_bytes, found.coefficient_bytes) == (4, 1, 8, 10)


def test_an_accumulator_that_saturates_does_so_at_every_term():
    format = Fixed("Q1.15", coefficients="Q2.14", accumulator={"bits": 32, "overflow": "saturate"})
    assert work(one("direct-1", format).program).saturations == 5 + 1


@pytest.mark.parametrize("form", forms())
def test_the_program_multiplies_and_adds_what_the_diagram_does(form):
    """But for residues, each of which is a subtraction where bits are dropped at all."""
    diagrams = [built.diagram for filter in FILTERS if (built := drawn(filter, form)) is not None]
    assert diagrams
    for diagram in diagrams:
        counts = diagram.counts()
        for format in (Float("float64"), Fixed("Q4.28", coefficients={"bits": 32}, allow_vanishing=True)):
            found = work(lower(diagram, format))
            residues = sum(isinstance(node, Residue) for node in diagram.nodes) if isinstance(format, Fixed) else 0
            assert (found.multiplications, found.state_words) == (counts.multiplications, counts.delays)
            assert counts.additions <= found.additions <= counts.additions + residues


# Bounds. Latencies of the stated table: a multiplication and an addition of floats take 3 cycles each, of integers 3 and 1,
# a rounding 2; saturations are guessed.


@pytest.mark.parametrize(("delays", "cycles"), [(1, Fraction(6)), (2, Fraction(3)), (4, Fraction(3, 2))])
def test_a_loop_of_one_product_and_one_sum(delays, cycles):
    """y[n] = x[n] + a y[n - k]: (3 + 3) / k."""
    b = Builder()
    x, y1 = b.input(), b.delay("y1", n=delays)
    y = b.sum(x, b.gain(y1, "a", 0.5), label="y")
    b.drive(y1, y)
    b.output(y)
    program = lower(b.build(), Float("float64"))
    loop = slowest_loop(program)
    assert loop.cycles_per_frame == cycles
    assert {program.nodes[index].label for index in loop.nodes} == {"y", "y1", "a"}
    assert longest_way(program) == 3


def test_direct_forms_by_hand():
    """direct-2: w = x - a2 w2 - a1 w1, whose last term waits for a product and an addition: 6 cycles, and a2's, which is one
    addition earlier, 9 over two frames. In transposed-2 from y through a1, s1's two additions and y's one: 3 + 3 * 3."""
    assert slowest_loop(one("transposed-2").program).cycles_per_frame == 12
    for form in ("direct-1", "direct-2"):
        program = one(form).program
        sums = {node.label: node for node in program.nodes if node.kind == "sum"}
        total = sums["w" if form == "direct-2" else "y"]
        place = next(k for k, term in enumerate(total.terms) if program.nodes[term.source].label == "a1")
        assert slowest_loop(program).cycles_per_frame == 3 + 3 * (len(total.terms) - max(place, 1))


def test_integers_wait_for_one_addition_and_the_register():
    """3 + 1 and a rounding of 2, in whatever order the sum is made."""
    assert slowest_loop(one("direct-1", "16x16+40").program).cycles_per_frame == 6


def test_fused_additions_take_the_product_in():
    """Of 4 cycles each; the product itself takes none."""
    plain, fused = (slowest_loop(one("direct-1", Float("float64", fused=fused)).program) for fused in (False, True))
    assert plain.cycles_per_frame == 3 + 2 * 3
    assert fused.cycles_per_frame == 2 * 4


def test_without_a_loop_operations_rule():
    found = bounds_of(one("direct-1", "float64", taps(8), "whole"), clock_ghz=2.0, measured_ns=3.0)
    assert (found.loop_cycles, found.loop_path, found.rules) == (0.0, (), "operations")
    assert found.busy_cycles == float(busy_cycles(one("direct-1", "float64", taps(8), "whole").program)) == (8 + 7 + 2) / 4
    assert (found.bound_ns, found.measured_cycles) == (found.busy_cycles / 2, 6.0)


EDGES = st.lists(st.tuples(st.integers(0, 4), st.integers(0, 4), st.integers(0, 9), st.integers(0, 3)), max_size=12)


@given(EDGES)
def test_the_slowest_loop_is_the_slowest_of_all_loops(drawn):
    """Held against every simple loop. Edges back or to itself have a delay, so that every loop has one."""
    edges = [Edge(a, b, cycles, delays if a < b else max(1, delays)) for a, b, cycles, delays in drawn]
    ratios = []
    for count in range(1, 6):
        for path in permutations(range(5), count):
            if path[0] == min(path):
                steps = [[e for e in edges if (e.source, e.reader) == step]
                         for step in zip(path, (*path[1:], path[0]), strict=True)]
                if all(steps):
                    ratios.append(largest_ratio(steps))
    found = slowest_among(edges)
    assert (found.cycles_per_frame if found else None) == max(ratios, default=None)


def largest_ratio(steps):
    """Of a loop whose steps may each go along several edges."""
    sums = {(0, 0)}
    for step in steps:
        sums = {(cycles + edge.cycles, delays + edge.delays) for cycles, delays in sums for edge in step}
    return max(Fraction(cycles, delays) for cycles, delays in sums)


# Cores

CORE = """
clock_mhz = 100
word_bits = 16
accumulator_bits = 40
[cycles]
multiply = 1
accumulate = 1
add_64 = 4
load = 1
store = 1
shift = 1
round = 2
saturate = 1
frame = 8
"""


def test_a_short_word_by_hand():
    """5 products, 4 additions, 1 rounding of 2, 1 saturation, 10 loads, 5 stores, 8 for the frame; 100 MHz at 48 kHz leave
    2083.33 cycles between frames (arithmetic)."""
    found = estimate(one("direct-1", "16x16+40").program, parse_core(CORE, "core"), RATE)
    assert found.cycles_per_frame == 5 + 4 + 2 + 1 + 10 + 5 + 8
    assert found.budget_percent == pytest.approx(100 * 35 / 2083.33, rel=1e-5)


def test_a_long_word_is_taken_apart():
    """24 bits on words of 16: 4 products and 3 additions for each of 5, sums of 56 bits beyond 40, rounding and saturation
    in two pieces, loads and stores of two words."""
    program = one("direct-1", "24x24+56").program
    found = estimate(program, parse_core(CORE, "core"), RATE)
    assert found.by_kind == {"frame": 8, "load": 20, "store": 10, "multiply": 5 * (4 + 3), "add": 16, "round": 4, "saturate": 2}
    whole = estimate(program, parse_core(CORE.replace("16", "32").replace("40", "64"), "core"), RATE)
    assert whole.by_kind["multiply"] == 5
    assert whole.by_kind["add"] == 4


def test_what_the_readme_tells_of_the_rumble_filter():
    core = load_core(resolve("example-core", "core"), "example-core")
    found = [estimate(realize_preset(load_preset(name)).program, core, RATE)
             for name in ("rumble-double-state", "rumble-naive-24-bit", "rumble-float32")]
    assert [each.cycles_per_frame for each in found] == [102, 95, 430]
    assert found[0].budget_percent == pytest.approx(9.8, abs=0.05)


def test_floats_need_their_own_figures():
    none = estimate(one("direct-1", "float32").program, parse_core(CORE, "core"), RATE)
    assert (none.cycles_per_frame, none.budget_percent) == (None, None)
    assert none.reason == "the core states no float32_multiply and no float32_add"
    some = estimate(one("direct-1", "float32").program, parse_core(CORE + "float32_multiply = 20\nfloat32_add = 30", "c"), RATE)
    assert some.cycles_per_frame == 8 + 2 * (10 + 5) + 5 * 20 + 4 * 30


def test_mistakes_of_a_cost_file_are_told_together_with_their_lines():
    text = ('clock_mhz = 0\nword_bits = "16"\naccumulator_bits = 4\ntittle = "x"\n'
            "[cycles]\nmultply = 1\nload = -1\nadd_64 = inf\n")
    with pytest.raises(PresetError) as caught:
        parse_core(text, "mine.toml")
    told = "\n".join(caught.value.problems)
    assert "mine.toml:1: clock_mhz = 0.0 is not allowed: a clock is a number of megahertz above 0." in told
    assert 'mine.toml:2: word_bits = "16" is not allowed: word_bits is a whole number.' in told
    assert "mine.toml:3: accumulator_bits = 4 is not allowed: a core's words have from 8 to 128 bits." in told
    assert 'mine.toml:4: tittle is no key of the head of a core' in told
    assert 'mine.toml:6: multply is no key of [cycles]' in told
    assert 'Did you mean "multiply"?' in told
    assert "mine.toml:7: load = -1 is not allowed: load is a number of cycles, at least 0." in told
    assert "mine.toml:8: add_64 = inf is not a finite number." in told
    assert "mine.toml:5: store is missing: a number of cycles, at least 0." in told


@pytest.mark.parametrize(("text", "told"), [
    ("clock_mhz = \n", "c.toml:1: this is no TOML"), ("", "c.toml: cycles is missing"),
    ("cycles = 3\n", "c.toml:1: cycles = 3 is not allowed: cycles is a table."),
])
def test_what_is_no_cost_file_is_told(text, told):
    with pytest.raises(PresetError) as caught:
        parse_core(text, "c.toml")
    assert any(problem.startswith(told) for problem in caught.value.problems)


def test_the_shipped_core_is_read_and_is_no_preset():
    core = load_core(resolve("example-core", "core"), "example-core")
    assert core.title == "Example core, 16 bits"
    assert names("core") == ["example-core"]
    assert not any("core" in name for name in names("preset"))
    with pytest.raises(PresetError, match=r'no shipped core of this name\. Did you mean "example-core"'):
        resolve("exampel-core", "core")


# Timing


class Clock:
    """A machine whose truth is known: nanoseconds a frame of each lane, at a clock that slows down and a core that is shared
    now and then, which makes everything but the calibration chain take twice as long."""

    def __init__(self, truth, *, drift=0.0, shared=lambda call: False):
        self.truth, self.drift, self.shared, self.calls = truth, drift, shared, 0

    @property
    def slowness(self):
        return 1.0 + self.drift * self.calls

    def calibrate(self):
        crowding = 4.0 if self.shared(self.calls) else 2.0
        return Speed(0.5 * self.slowness, crowding, crowding)

    def block_times(self, lane, frames, blocks, *, tail=False):
        self.calls += 1
        ns = self.truth[lane] * self.slowness * (2.0 if self.shared(self.calls) else 1.0) * (3.0 if tail else 1.0)
        times = np.full(blocks, ns * frames)
        times[0] *= 40.0  # an interruption
        return times


def ratio(times, frames=64):
    first, second = (np.median(times.counted((lane, frames, False))) for lane in (0, 1))
    return second / first


def test_a_steady_machine_is_read_as_it_is():
    times = timed(["a", "b"], [True, False], Clock({"a": 10.0, "b": 15.0}), 5, profiling.unheard)
    assert times.rounds == ENOUGH > 5
    assert times.counted((0, 16, False)) == pytest.approx([10.0] * ENOUGH)
    assert times.counted((0, 64, True)) == pytest.approx([30.0] * ENOUGH)
    assert (1, 64, True) not in times.samples
    assert times.blocks((1, 1024, False))[-1] == 15.0 * 1024 * 40
    assert (times.shared_percent, times.drift_percent) == (0.0, 0.0)


def test_a_clock_that_slows_down_to_half_moves_no_ratio():
    calls = 22 * 2 * len(BLOCKS)
    times = timed(["a", "b"], [False, False], Clock({"a": 10.0, "b": 15.0}, drift=1.0 / calls), 21, profiling.unheard)
    assert times.drift_percent > 20.0
    assert ratio(times) == pytest.approx(1.5, rel=0.005)  # a calibration is one call old or one call early


def test_rounds_on_a_shared_core_do_not_count():
    """Shared for 40 calls of every 100, so that both lanes have rounds alone."""
    clock = Clock({"a": 10.0, "b": 15.0}, shared=lambda call: call % 100 < 40)
    times = timed(["a", "b"], [False, False], clock, 21, profiling.unheard)
    assert 30.0 < times.shared_percent < 50.0
    for frames in BLOCKS:
        for lane, truth in enumerate((10.0, 15.0)):
            found = times.counted((lane, frames, False))
            assert len(found) >= ENOUGH
            assert np.median(found) == pytest.approx(truth)


def test_a_core_that_is_hardly_ever_alone_gets_more_rounds():
    clock = Clock({"a": 10.0, "b": 15.0}, shared=lambda call: call % 61 >= 15)
    times = timed(["a", "b"], [False, False], clock, 21, profiling.unheard)
    assert times.rounds > 21
    assert ratio(times) == pytest.approx(1.5)
    assert times.doubtful_percent == 0.0


def test_figures_of_a_core_that_is_nearly_never_alone_are_doubtful():
    """Alone while warming up and in two rounds only; a third sample counts too, and the median is one of the two."""
    clock = Clock({"a": 10.0, "b": 15.0}, shared=lambda call: call > 6 * len(BLOCKS))
    times = timed(["a", "b"], [False, False], clock, 7, profiling.unheard)
    assert times.doubtful_percent == 100.0
    assert {len(times.counted(key)) for key in times.samples} == {LEAST}
    assert ratio(times, 1024) == pytest.approx(1.5)


def test_nothing_timed_has_no_rounds():
    assert Times().rounds == 0


def test_the_machine_itself():
    """Eight sections take longer than one, whatever else the machine does; a tail is subnormal."""
    machine = Machine()
    speed = machine.calibrate()
    assert speed.chain > 0.0
    assert 1.0 < speed.least_crowding <= speed.crowding
    low = design("butterworth", rate=RATE, response="low-pass", order=16, frequency=5000)
    lanes = [Lane(one("transposed-2", "float64", filter), 1) for filter in (PEAK, low)]
    times = [machine.block_times(lane, 1024, BLOCKS_A_ROUND) for lane in lanes]
    assert times[0].shape == (BLOCKS_A_ROUND,)
    assert 0.0 < np.median(times[0]) < np.median(times[1])
    state = lanes[0]._subnormal()
    assert 0.0 < np.abs(state).max() < np.finfo(np.float64).tiny
    assert machine.block_times(lanes[0], 64, 5, tail=True).min() > 0.0


def test_counters_are_read_or_said_to_be_absent():
    found = counted(lambda: sum(range(1000)))
    if found.reason is None:
        assert found.instructions > 1000
        assert found.cycles > 0
    else:
        assert (found.instructions, found.cycles) == (None, None)
        assert "hardware counters" in found.reason


# The command

BLOCK_KEYS = ["block_frames", "ns_per_frame", "spread_percent", "deadline_percent", "lanes_per_core", "deadline_us",
              "p999_block_us", "worst_block_us", "times_cheapest"]


class LaneClock(Clock):
    """10 ns a frame for a lane of two states, 15 for any other."""

    def __init__(self):
        super().__init__({})

    def block_times(self, lane, frames, blocks, *, tail=False):
        self.truth = {lane: 10.0 if lane.realization.program.state_words == 2 else 15.0}
        return super().block_times(lane, frames, blocks, tail=tail)


@pytest.fixture
def clock(monkeypatch):
    monkeypatch.setattr(profiling, "Machine", LaneClock)


@pytest.mark.usefixtures("clock")
def test_the_table(capsys):
    assert main(["profile", "rumble-float32", "rumble-naive-16-bit", "--cost", "example-core", "--quick"]) == 0
    shown = capsys.readouterr().out
    lines = [" ".join(line.split()) for line in shown.splitlines()]
    assert "1 Rumble filter, float32 transposed-2 · cascade · float32 2 8 5 20" in lines
    assert "2 Rumble filter, all 16 bits (fails) direct-1 · cascade · 16x16+40 4 8 5 10" in lines
    assert "1 1 64 10.00 0.0 0.048 2083 25.6 25.6 1.00" in lines
    assert "1 64, tail 30.00 0.0" in lines
    assert "2 1 64 15.00 0.0 0.072 1389 38.4 38.4 1.50" in lines
    assert "2 5 4 0 1 1 10 5" in lines
    # Cycles at the 4 GHz that two cycles in 0.5 ns are: 10 ns are 40, and 6 cycles of the table 1.5 ns.
    assert "1 12.0 6 2.8 loop 3.00 40.0 y → a1 → s1 → d1" in lines
    assert "2 6.0 6 5.0 loop 1.50 60.0 a1 → y → y1" in lines
    assert "2 5 4 0 2 1 10 5 8 35 3.36" in lines
    assert "7 interleaved rounds of 50 blocks" in shown
    assert "4.00 GHz" in shown
    assert "it takes 1: 3.00 times as long" in shown
    assert all(len(line) <= 160 for line in shown.splitlines() if "─" in line)


@pytest.mark.usefixtures("clock")
def test_the_figures(tmp_path, capsys):
    file = tmp_path / "cost.json"
    command = ["profile", "rumble-naive-16-bit", "--vary", "structure.form=direct-1,transposed-2", "--channels", "1,2"]
    assert main([*command, "--quick", "--json", str(file)]) == 0
    capsys.readouterr()
    document = json.loads(file.read_text(encoding="utf-8"))
    assert list(document) == ["method", "core", "refused", "realizations"]
    assert list(document["method"]) == ["rounds", "blocks_a_round", "pinned_to", "clock_ghz", "drift_percent", "shared_percent",
                                        "doubtful_percent", "no_counters"]
    assert document["core"] is None
    first, second = document["realizations"]
    assert list(first) == ["preset", "title", "decomposition", "form", "format", "rate", "work", "bounds", "timings",
                           "estimate"]
    assert (first["form"], second["form"]) == ("direct-1", "transposed-2")
    assert [timing["channels"] for timing in first["timings"]] == [1, 2]
    for timing in first["timings"]:
        assert [block["block_frames"] for block in timing["blocks"]] == list(BLOCKS)
        assert all(list(block) == BLOCK_KEYS for block in timing["blocks"])
        assert [block["times_cheapest"] for block in timing["blocks"]] == pytest.approx([1.5] * len(BLOCKS))
        assert timing["tail"] is None
    # 64 frames at 48 kHz are 1.3333 ms (arithmetic)
    assert first["timings"][0]["blocks"][2]["deadline_us"] == pytest.approx(1333.33, rel=1e-5)
    assert first["bounds"]["measured_cycles"] == pytest.approx(60.0)
    assert first["estimate"] is None


@pytest.mark.usefixtures("clock")
def test_what_does_not_fit_or_has_no_figures_is_told(tmp_path, capsys):
    """430 cycles of 41.7 at 2 MHz; without figures for floats none."""
    slow, bare = tmp_path / "slow.toml", tmp_path / "bare.toml"
    shipped = resolve("example-core", "core").read_text("utf-8")
    slow.write_text(shipped.replace("clock_mhz = 50", "clock_mhz = 2"), "utf-8")
    bare.write_text(CORE, "utf-8")
    assert main(["profile", "rumble-float32", "--cost", str(slow), "--quick"]) == 0
    assert "1 does not fit: 1032 % of what there is, for one channel." in capsys.readouterr().out
    assert main(["profile", "rumble-float32", "--cost", str(bare), "--quick"]) == 0
    assert "1 has no estimate: the core states no float32_multiply and no float32_add." in capsys.readouterr().out


@pytest.mark.parametrize(("arguments", "told"), [
    (["--channels", "0"], '--channels 0: "0" is not allowed: whole numbers from 1 to 64'),
    (["--channels", "1,two"], '"two" is not allowed'),
    (["--cost", "exampel-core"], 'no shipped core of this name. Did you mean "example-core"?'),
    (["--cost", "."], ".: this is a folder, and the costs of a core are a file."),
])
def test_refusals(arguments, told, capsys):
    assert main(["profile", "rumble-float32", *arguments]) == 2
    assert told in capsys.readouterr().err


def test_two_runs_on_one_clock_agree():
    asked = [[(one("direct-2"), 1)], [(one("direct-1"), 1)]]
    first, second = (profile(asked, rounds=2, timer=LaneClock()) for _ in range(2))
    assert first.realizations == second.realizations
