"""The state of one lane that continues another, as `program/carrying.py` has it, operation for operation."""

TEXT = '''
@helper
def row(rows_, k, frame):
    offset, stores, ago = word(rows_, 3 * k), word(rows_, 3 * k + 1), word(rows_, 3 * k + 2)
    return offset + ((frame - 1 - ago) % stores + stores) % stores


@helper
def gather(host, lane, carry, channel):
    for k in range(carry.before):
        at, step = row(carry.reads, k, lane.frame) * host.channels + channel, real(carry.steps, k)
        v = real(lane.state, at) if step == 0.0 else np.float64(word(lane.state, at)) * step
        set_real(carry.given, k, v)
    for k in range(carry.pasts):
        frame = host.frame - word(carry.past, 2 * k + 1)
        v = real(host.input_recent, frame % host.input_recent_frames * host.channels + channel)
        set_real(carry.given, carry.before + k, v if frame >= host.begins and v == v else 0.0)


@helper
def product(carry, at):
    high, low = 0.0, 0.0
    for j in range(carry.before + carry.pasts):
        a, b = real(carry.high, at + j), real(carry.given, j)
        p = a * b
        s, t = 134217729.0 * a, 134217729.0 * b
        a_high, b_high = s - (s - a), t - (t - b)
        a_low, b_low = a - a_high, b - b_high
        error = ((a_high * b_high - p) + a_high * b_low + a_low * b_high) + a_low * b_low
        error = error + (a * 0.0 + real(carry.low, at + j) * b)
        total = high + p
        part = total - high
        low = low + (((high - (total - part)) + (p - part)) + error)
        high = total
    return high + low


@helper
def put(carry, k, state_, at, value):
    kind = word(carry.types, k)
    if kind < 2:
        set_real(state_, at, np.float64(np.float32(value)) if kind == 1 else value)
        return 0
    top = word(carry.bounds, k)
    nearest = np.rint(value * real(carry.steps, carry.before + k)) if value == value else 0.0
    code = top
    if nearest < -9223372036854775808.0:
        code = -top - 1
    elif nearest < 9223372036854775808.0:
        code = min(max(np.int64(nearest), -top - 1), top)
    set_word(state_, at, code)
    return np.int64(np.float64(code) != nearest)


@part
def carry(host_, before_, lane_, carry_):
    host, before, lane, carry = record(host_, HOST), record(before_, LANE), record(lane_, LANE), record(carry_, CARRY)
    size, clipped, channels, zero = carry.before + carry.pasts, 0, host.channels, lane.frame
    for c in range(channels):
        gather(host, before, carry, c)
        first = 0 if carry.sets == 1 else c * carry.frees * size
        for k in range(carry.pasts):
            state = word(carry.past, 2 * k)
            at = row(carry.writes, state, zero) * channels + c
            clipped += put(carry, state, lane.state, at, real(carry.given, carry.before + k))
        for k in range(carry.frees):
            state = word(carry.free, k)
            at = row(carry.writes, state, zero) * channels + c
            clipped += put(carry, state, lane.state, at, product(carry, first + k * size))
    return clipped
'''
