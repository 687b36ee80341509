"""What the compiled step and Python share: records in memory, each with one address, none of which ever moves.

LANE, HOST, SOURCE, CARRY and ACTION hold addresses and belong to the process that runs the step. CONTROL, HOST_METERS,
LANE_METERS, LOG and all rings hold none: they may lie in memory that several processes share.
"""

import numpy as np

ARRAYS = ("state", "coefficients", "keys", "meters", "marks", "trace")
"""The arrays that a kernel takes after its input and output, in its order; their addresses stand in the record."""

MOST_LANES = 16
LOGGED = 256
"""Actions that the log holds; older ones are overwritten."""
BANK_FRAMES = 32
"""Coefficients of a ramp change at frames that are multiples of this, counted from the first frame of the run."""

BINS_PER_OCTAVE = 32
BINS = 36 * BINS_PER_OCTAVE
"""Of the histogram of block times: [0, 32) ns one by one, then 32 bins an octave."""


Record = np.dtype[np.void]


def _record(integers: str, floats: str = "") -> Record:
    fields = [(name, "<i8") for name in integers.split()] + [(name, "<f8") for name in floats.split()]
    return np.dtype(fields)


LANE = _record(
    # addresses
    "kernel output " + " ".join(ARRAYS) + " shown recent input ideal scales bank "
    # what it is: outputs; columns of its output block; words of state and of coefficients, all channels; doubled: an ideal
    # whose columns are followed by as many low parts; doors: 0 takes the host's input, else how that is quantized first
    "outputs columns metered words coefficient_words doubled door wraps "
    # where it is: frames since reset; banks still to come, the frame of the next
    "frame banks_left bank_frame "
    # of the kernel's meters: how many counters; the kind of each stands in `kinds`: 1 saturation, 2 wrap, 3 accumulator
    "counters kinds",
    "match scale low high",
)

LANE_METERS = _record(
    "frame samples not_a_number saturations wraps accumulator_overflows nanoseconds window_frames",
    # of all samples since reset; then of the last whole window, and of the one under way
    "peak sum_of_squares shown_peak shown_squares window_peak window_squares",
)

PARTS = ("act", "carry", "generate", "ideal", "mix", "listen", "record")
"""Of the step, compiled apart and called by address, each only where it is needed."""

HOST = _record(
    " ".join(PARTS) + " "
    "address lanes control meters histogram actions log source x heard sent heard_recent sent_recent input_recent recording "
    "channels outputs block input_channels output_channels sample_bytes recent_frames input_recent_frames recording_frames "
    "log_length window_frames begins "
    "frame heard_lane before fade_from fade_frames minus loud loud_most output_index taken due",
    "raise_by up down low rate_hz runaway loud_level",
)

CONTROL = _record("published used mute come_up recording drained counter_channel", "gain ceiling")
"""From outside to the step. published: actions so far (release); used: action slots that may be waiting; come_up: raised
by one to leave mute, and to be acknowledged after the guard has shut; drained: frames taken out of the recording."""

HOST_METERS = _record(
    "frame taken logged state reason reason_frame reason_lane held came_up heard_lane "
    "callbacks blocks_over_half last_nanoseconds longest_nanoseconds nanoseconds "
    "input_gaps output_gaps recorded overruns window_frames",
    "gain shown_peak shown_squares window_peak window_squares",
)

ACTION = _record("ticket frame kind lane before changeover count argument ideal_argument done", "value")
LOG = _record("ticket kind frame lane before changeover clipped")

CARRY = _record(
    # addresses: M (channels, free, before + past) high and low; the tables below; scratch of (before + past) and (free)
    "high low past free reads writes steps bounds types given "
    "before pasts frees states sets"
)
"""A state that continues another. reads, writes: rows (offset, stores, k) of each state before and after; steps: the value
of a code of each state before (0 for floats), then codes in 1.0 of each state after; bounds, types: the largest code and the
kind (0 float64, 1 float32, 2 code) of each state after; past: (state, frames ago)."""

SOURCE = _record(
    "kind position length data channels peak phase period first second", "level ratio step first_step"
)

MUTED, COMING_UP, SOUNDING, SHUT = range(4)
STATES = ("muted", "coming up", "sounding", "guard shut")

REASONS = ("", "NaN", "infinity", "runaway level", "sustained full scale")

CHANGEOVERS = ("keep", "cold", "carry", "warm", "fade")
HEAR, BANK, PLACE, TAKE_SOURCE, SUBTRACT = range(1, 6)

NOTHING, IDEAL = -2, -1
"""In HOST.minus: nothing is subtracted from what is heard, or its ideal; 0 and above another lane."""
