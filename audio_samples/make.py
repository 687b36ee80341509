"""Makes the recordings beside this file. Run it again and the bytes are the same.

    python audio_samples/make.py

plucked.wav  stereo, 7.5 s, peak -12 dBFS: plucked strings over the rumble of a turntable and footsteps, below 30 Hz.
             What a small loudspeaker should not be given, under what it should.
chord.wav    mono, 9 s, peak -30 dBFS: a quiet chord that fades into 3 s of silence.
             Noise and ringing show in the fade and in the silence.
drums.wav    mono, 8 s, peak -0.3 dBFS: a drum pattern; the bass drum glides from 110 to 45 Hz.
             Little headroom: what boosts the bass, or is large inside, clips on it.
speech.wav   mono, 8 s, peak -12 dBFS: speech-like phrases by a microphone with mains hum and a gate: a tone of 50 Hz
             comes and goes with each phrase, and the pauses are silence.
             What rings, sticks or keeps an offset shows in the pauses.

All are 48 kHz, 16 bits, rounded to nearest, undithered so that silence is silence. Only additions, multiplications,
divisions and integers are used: they are rounded alike on every machine.
"""

import itertools
import wave
from pathlib import Path

import numpy as np
import numpy.typing as npt

RATE = 48000
FULL_SCALE = 32768

Sound = npt.NDArray[np.float64]

# Equal temperament, A4 = 440 Hz, in Hz (common practice).
D2, A2, D3, E3, F3, A3, C4, D4, E4, F4, A4 = (
    73.416, 110.0, 146.832, 164.814, 174.614, 220.0, 261.626, 293.665, 329.628, 349.228, 440.0,
)  # fmt: skip

PLUCKS = [  # seconds, pitch, strength, place from 0 left to 1 right
    (0.10, D2, 1.0, 0.5), (0.40, A2, 0.7, 0.4), (0.70, D3, 0.7, 0.6), (1.00, F3, 0.8, 0.3), (1.30, A3, 0.8, 0.7),
    (1.60, D4, 0.8, 0.5), (1.90, A3, 0.6, 0.6), (2.20, F3, 0.6, 0.4), (2.50, A2, 0.9, 0.5), (2.80, E3, 0.7, 0.4),
    (3.10, A3, 0.7, 0.6), (3.40, C4, 0.8, 0.3), (3.70, E4, 0.9, 0.7), (4.00, A4, 0.8, 0.5), (4.30, E4, 0.6, 0.4),
    (4.60, D2, 1.0, 0.5), (4.61, A2, 0.7, 0.4), (4.62, D3, 0.7, 0.6), (4.63, F3, 0.7, 0.5), (4.64, A3, 0.7, 0.4),
    (4.65, F4, 0.7, 0.6),
]  # fmt: skip
FOOTSTEPS = [0.55, 1.30, 2.05, 2.85, 3.60, 5.20, 5.95, 6.75]  # seconds
BEAT = 60 * RATE // 96  # frames
BARS = [  # of four beats; one mark to a quarter of a beat, a capital is louder
    ("B..b..B...b.b...", "....S.......S..s", "H.h.H.h.H.h.H.h."),
    ("B..b..B...b.b...", "....S.......S..s", "H.h.H.h.H.h.H.h."),
    ("B..b..B....B....", "....S..s.sS.SSSS", "H.h.H.h.H.h.H..."),
]  # bass drum, snare drum, hi-hat
PHRASES = [(0.2, 2.3), (3.0, 4.7), (5.3, 7.2)]  # seconds, first and last
VOWELS = {  # formants, rounded, Hz (from memory, of a man's voice)
    "a": (730, 1090, 2440), "e": (530, 1840, 2480), "i": (270, 2290, 3010), "o": (570, 840, 2410), "u": (300, 870, 2240),
}  # fmt: skip
SYLLABLES = [  # seconds, length, from vowel, to vowel, voice in Hz at the start and at the end, hiss before it
    (0.30, 0.22, "a", "i", 118, 128, 0.0), (0.56, 0.16, "e", "e", 126, 120, 0.0), (0.82, 0.26, "o", "a", 122, 112, 0.8),
    (1.12, 0.18, "i", "u", 116, 110, 0.0), (1.40, 0.20, "u", "e", 112, 106, 0.5), (1.66, 0.50, "a", "o", 108, 84, 0.0),
    (3.16, 0.20, "i", "a", 134, 140, 0.9), (3.42, 0.18, "o", "o", 134, 126, 0.0), (3.64, 0.24, "a", "e", 126, 116, 0.0),
    (4.02, 0.50, "e", "i", 116, 92, 0.7), (5.42, 0.18, "u", "i", 122, 132, 0.0), (5.66, 0.24, "a", "a", 130, 122, 0.0),
    (6.02, 0.20, "i", "o", 118, 110, 0.9), (6.28, 0.18, "e", "a", 110, 104, 0.0), (6.50, 0.52, "o", "u", 104, 78, 0.0),
]  # fmt: skip
CHORD = [(D3, 1.0), (A3, 0.8), (D4, 0.6), (F4, 0.5), (A4, 0.35)]  # pitch, strength


def noise(count: int, seed: int) -> Sound:
    """Uniform noise from -1 to 1, by a linear congruential generator of 64 bits."""
    state = seed
    values = np.empty(count)
    for index in range(count):
        state = (state * 6364136223846793005 + 1442695040888963407) % 2**64
        values[index] = (state >> 40) / 2**23 - 1.0
    return values


def smooth(sound: Sound, share: float) -> Sound:
    """A one-pole low-pass filter: each output moves by `share` of the way to the input."""
    result = np.empty_like(sound)
    level = 0.0
    for index, value in enumerate(sound):
        level += share * (value - level)
        result[index] = level
    return result


def rotation(frequency: Sound | float) -> tuple[Sound, Sound]:
    """The cosine and the sine of the angle of a frame."""
    angle = np.asarray(6.283185307179586 * frequency / RATE)
    square = angle * angle
    cosine = 1 - square / 2 * (1 - square / 12 * (1 - square / 30 * (1 - square / 56)))
    sine = angle * (1 - square / 6 * (1 - square / 20 * (1 - square / 42 * (1 - square / 72))))
    return cosine, sine


def tone(count: int, frequency: float, decay: float = 1.0) -> Sound:
    """A sine that starts at 0 with a peak of 1 and shrinks by `decay` per frame: a rotation, frame by frame."""
    cosine, sine = (float(part) for part in rotation(frequency))
    x, y = 1.0, 0.0
    result = np.empty(count)
    for index in range(count):
        result[index] = y
        x, y = decay * (cosine * x - sine * y), decay * (sine * x + cosine * y)
    return result


def gliding_tone(frequency: Sound, decay: float = 1.0) -> Sound:
    """As `tone`, with a frequency for each frame."""
    x, y = 1.0, 0.0
    result = np.empty(len(frequency))
    for index, (cosine, sine) in enumerate(zip(*(part.tolist() for part in rotation(frequency)), strict=True)):
        result[index] = y
        x, y = decay * (cosine * x - sine * y), decay * (sine * x + cosine * y)
    return result


def resonant(sound: Sound, frequency: Sound, bandwidth: float) -> Sound:
    """Two poles at a frequency for each frame, gain 1 at 0 Hz."""
    radius = 1 - 3.141592653589793 * bandwidth / RATE
    near, far = (2 * radius * rotation(frequency)[0]).tolist(), radius * radius
    before, earlier = 0.0, 0.0
    result = np.empty_like(sound)
    for index, value in enumerate(sound.tolist()):
        now = (1 - near[index] + far) * value + near[index] * before - far * earlier
        before, earlier = now, before
        result[index] = now
    return result


def line(points: list[tuple[float, float]], count: int) -> Sound:
    """Straight lines through (seconds, value), level before the first point and after the last."""
    result = np.full(count, float(points[-1][1]))
    result[: int(points[0][0] * RATE)] = points[0][1]
    for (start, low), (stop, high) in itertools.pairwise(points):
        first, last = int(start * RATE), int(stop * RATE)
        result[first:last] = low + (high - low) * (np.arange(last - first) / (last - first))
    return result


def pluck(count: int, frequency: float, seed: int) -> Sound:
    """A plucked string: a loop as long as its period, filled with noise and smoothed at each turn.

    K. Karplus, A. Strong, "Digital synthesis of plucked-string and drum timbres", Computer Music Journal, 1983.
    """
    period = RATE / frequency
    whole = int(period)
    part = period - whole
    loss = 1.0 - 1.2 * period / RATE  # it falls by 1.2 nepers a second, its overtones faster
    edge, middle = 0.15, 0.7  # the smoothing; then a straight line between two samples tunes the string
    taps = [edge * (1 - part), middle * (1 - part) + edge * part, edge * (1 - part) + middle * part, edge * part]
    string = np.zeros(3 + whole + count)
    burst = smooth(noise(whole, seed), 0.25)
    string[3 : 3 + whole] = burst - np.add.accumulate(burst)[-1] / whole
    for start in range(3 + whole, len(string), whole - 1):
        stop = min(start + whole - 1, len(string))
        for lag, weight in enumerate(taps, whole - 1):
            string[start:stop] += loss * weight * string[start - lag : stop - lag]
    return string[3 : 3 + count]


def strings(count: int) -> Sound:
    """All plucks, (count, 2)."""
    mix = np.zeros((count, 2))
    for number, (second, pitch, strength, place) in enumerate(PLUCKS):
        start = int(second * RATE)
        string = strength * pluck(count - start, pitch, seed=1000 + number)
        mix[start:, 0] += (1 - place) * string
        mix[start:, 1] += place * string
    return mix


def rumble(count: int) -> Sound:
    """A turntable's bearing and footsteps on the floor, all of it below about 30 Hz; (count,), peak 1."""
    bearing = noise(count, seed=7)
    for _ in range(4):
        bearing = smooth(bearing, 0.0016)
    bearing -= smooth(bearing, 0.0003)
    steps = np.zeros(count)
    for second in FOOTSTEPS:
        start = int(second * RATE)
        steps[start:] += tone(count - start, 17.0, decay=0.9998)
    for _ in range(2):
        steps = smooth(steps, 0.003)
    return scaled(scaled(bearing, 0.5) + scaled(steps, 1.0), 1.0)


def scaled(sound: Sound, peak: float) -> Sound:
    return sound * (peak / float(np.max(np.abs(sound))))


def fall(count: int, first: int, last: int) -> Sound:
    """1 until frame `first`, 0 from frame `last`, in between the fourth power of a straight line."""
    line = np.clip((last - np.arange(count)) / (last - first), 0.0, 1.0)
    return line * line * line * line


def plucked() -> Sound:
    count = 15 * RATE // 2
    sound = scaled(strings(count), 0.7) + scaled(rumble(count), 0.3)[:, np.newaxis]
    return scaled(sound * fall(count, 11 * RATE // 2, count - RATE // 20)[:, np.newaxis], 0.251189)  # -12 dBFS


def chord() -> Sound:
    count = 9 * RATE
    sound = np.zeros(count)
    for pitch, strength in CHORD:
        for overtone in range(1, 5):
            for detuning in (0.9992, 1.0008):  # two strings to a note, beating slowly
                sound += strength / (overtone * overtone) * tone(count, pitch * overtone * detuning)
    rise = 1.0 - fall(count, 0, RATE)
    return scaled(sound * rise * fall(count, 2 * RATE, 13 * RATE // 2), 0.0316228)[:, np.newaxis]  # -30 dBFS


def bass_drum(count: int) -> Sound:
    frequency = 45.0 + 65.0 * fall(count, 0, RATE // 6)
    return gliding_tone(frequency, decay=0.99984) * fall(count, RATE // 5, count)


def snare_drum(count: int) -> Sound:
    rattle = noise(count, seed=11)
    rattle = (rattle - smooth(rattle, 0.12)) * fall(count, 0, count)
    skin = tone(count, 186.0, decay=0.9994) + 0.6 * tone(count, 331.0, decay=0.9991)
    return 0.5 * rattle + 0.6 * skin * fall(count, 0, count)


def hi_hat(count: int) -> Sound:
    metal = noise(count, seed=13)
    for _ in range(3):
        metal = metal - smooth(metal, 0.55)
    return metal * fall(count, 0, count)


def drums() -> Sound:
    sound = np.zeros(8 * RATE)
    kit = [(bass_drum(RATE // 2), 1.0), (snare_drum(RATE // 4), 0.55), (hi_hat(RATE // 14), 0.25)]
    for number, bar in enumerate(BARS):
        for (drum, strength), marks in zip(kit, bar, strict=True):
            for quarter, mark in enumerate(marks):
                if mark != ".":
                    start = number * 4 * BEAT + quarter * BEAT // 4
                    sound[start : start + len(drum)] += (strength if mark.isupper() else 0.4 * strength) * drum
    return scaled(sound, 0.966051)[:, np.newaxis]  # -0.3 dBFS


def voice(frequency: Sound) -> Sound:
    """The flow of the vocal folds, differentiated: a rise, a fall to a sharp closure, and a rest, in each period."""
    result = np.empty(len(frequency))
    phase = 0.0
    for index, step in enumerate((frequency / RATE).tolist()):
        phase = phase + step if phase + step < 1.0 else phase + step - 1.0
        opening = phase / 0.6
        result[index] = opening * (2.0 - 3.0 * opening) if opening < 1.0 else 0.0
    return result


def swell(count: int, start: float, stop: float, edge: float) -> Sound:
    """0, then 1 between two seconds, with a rise before and a fall after as long as `edge`."""
    rise = 1.0 - fall(count, int((start - edge) * RATE), int(start * RATE))
    return rise * fall(count, int(stop * RATE), int((stop + edge) * RATE))


def speech() -> Sound:
    count = 8 * RATE
    ends = [(one[0] + place * one[1], one[2 + place], one[4 + place]) for one in SYLLABLES for place in (0, 1)]
    loudness, hiss = np.zeros(count), np.zeros(count)
    for start, length, _, _, _, _, hissing in SYLLABLES:
        loudness += swell(count, start + 0.03, start + length - 0.06, edge=0.06)
        hiss += hissing * swell(count, start - 0.07, start - 0.03, edge=0.03)
    mouth = voice(line([(second, pitch) for second, _, pitch in ends], count)) + 0.02 * noise(count, seed=17)
    for formant, bandwidth in enumerate((80.0, 100.0, 140.0)):
        mouth = resonant(mouth, line([(second, VOWELS[vowel][formant]) for second, vowel, _ in ends], count), bandwidth)
    breath = resonant(noise(count, seed=19), np.full(count, 5200.0), 1500.0)
    spoken = scaled(mouth * loudness, 1.0) + 0.25 * scaled((breath - smooth(breath, 0.3)) * hiss, 1.0)
    gate = sum(swell(count, first, last, edge=0.08) for first, last in PHRASES)
    return scaled((spoken + 0.05 * tone(count, 50.0)) * gate, 0.251189)[:, np.newaxis]  # -12 dBFS


def recordings() -> dict[str, npt.NDArray[np.int16]]:
    """Name to codes (frames, channels)."""
    sounds = {"plucked.wav": plucked(), "chord.wav": chord(), "drums.wav": drums(), "speech.wav": speech()}
    return {name: np.rint(sound * FULL_SCALE).astype(np.int16) for name, sound in sounds.items()}


def write(path: Path, codes: npt.NDArray[np.int16]) -> None:
    with wave.open(str(path), "wb") as file:
        file.setnchannels(codes.shape[1])
        file.setsampwidth(2)
        file.setframerate(RATE)
        file.writeframes(codes.astype("<i2").tobytes())


if __name__ == "__main__":
    for file_name, file_codes in recordings().items():
        write(Path(__file__).parent / file_name, file_codes)
