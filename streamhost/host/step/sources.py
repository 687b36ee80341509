"""What comes in: the device's buffer, a file in memory round and round, or a generated signal, frame by frame.

The generators are those of `signals.py`, to the bit, for as long as one likes. Pink noise is the white one through
first-order sections in float64, `y = x - zero x1 + pole y1` one after the other, rounded to 24-bit codes.
"""

TEXT = '''
@helper
def uniform(start, n, peak):
    z = U(n + 1) * U(0x9E3779B97F4A7C15) + U(start)
    z = (z ^ (z >> U(30))) * U(0xBF58476D1CE4E5B9)
    z = (z ^ (z >> U(27))) * U(0x94D049BB133111EB)
    z = z ^ (z >> U(31))
    return np.int64((z >> U(24)) * U(2 * peak + 1) >> U(40)) - peak


@helper
def sine(phase):
    quarter = (U(phase) + U(2305843009213693952)) >> U(62)
    rest = np.int64(U(phase) - (quarter << U(62)))
    angle = np.float64(rest) * (6.283185307179586 / 18446744073709551616.0)
    square = angle * angle
    odd, even = 0.0, 0.0
{odd}
{even}
    value = angle * odd if quarter & U(1) == U(0) else even
    return -value if quarter & U(3) >= U(2) else value


@helper
def pink(source, channel):
    channels = source.channels
    v = np.float64(uniform(word(source.data, channel), source.position, source.first)) * source.level
    for k in range(source.length):
        at = channels + k * (2 + 2 * channels)
        kept = at + 2 + 2 * channel
        y = v - real(source.data, at) * real(source.data, kept) + real(source.data, at + 1) * real(source.data, kept + 1)
        set_real(source.data, kept, v)
        set_real(source.data, kept + 1, y)
        v = y
    peak = np.float64(source.peak)
    return min(max(np.rint(v), -peak), peak) + 0.0


@helper
def same_in_all(source, kind, peak, n):
    if kind == {sine}:
        return np.rint(sine(source.first * n) * peak) + 0.0
    if kind == {tones}:
        return np.rint(sine(source.first * n) * peak) + np.rint(sine(source.second * n) * peak) + 0.0
    if kind == {sweep}:
        if n % source.period == 0:
            source.phase, source.step = 0, source.first_step
        code = np.rint(sine(source.phase) * peak) + 0.0
        source.phase += np.int64(source.step)
        source.step *= source.ratio
        return code
    return peak if kind == {dc} or kind == {impulses} and n % source.period == 0 else 0.0


@part
def generate(host_, x_, frames, unused):
    source = record(record(host_, HOST).source, SOURCE)
    channels, kind, peak = source.channels, source.kind, np.float64(source.peak)
    for i in range(frames):
        n = source.position
        code = same_in_all(source, kind, peak, n)
        for c in range(channels):
            if kind == {white}:
                code = np.float64(uniform(word(source.data, c), n, source.peak))
            elif kind == {pink}:
                code = pink(source, c)
            set_real(x_, i * channels + c, real(source.data, n * channels + c) if kind == {loop} else code / 8388608.0)
        source.position = 0 if kind == {loop} and n + 1 == source.length else n + 1
    return 0
'''
