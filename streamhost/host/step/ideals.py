"""The ideal run beside a lane: on the input as the lane quantizes it, and begun at the lane's state when that was changed."""

TEXT = '''
@helper
def rounded(v, rounding):
    if rounding == 1:
        return np.rint(v)
    if rounding == 5:
        return np.trunc(v)
    whole = np.floor(v)
    rest = v - whole
    if rounding == 4:
        return whole
    up = rest >= 0.5 if rounding == 2 or v >= 0.0 else rest > 0.5
    return whole + 1.0 if up else whole


@helper
def quantize(ideal, x_, count):
    for i in range(count):
        v = real(x_, i)
        v = v if v == v else 0.0
        if ideal.door == 7:
            v = np.float64(np.float32(v))
        elif ideal.door != 6:
            if abs(v) == np.inf and ideal.wraps != 0:
                v = 0.0
            code = rounded(min(max(v * ideal.scale, -1e300), 1e300), ideal.door)
            if ideal.wraps != 0:
                span = ideal.high - ideal.low + 1.0
                code -= np.floor((code - ideal.low) / span) * span
            v = min(max(code, ideal.low), ideal.high) / ideal.scale
        set_real(ideal.input, i, v)


@helper
def keep_added(host, lane, ideal, done, frames):
    columns, at = lane.columns, host.frame % host.recent_frames
    for i in range(done, done + frames):
        for j in range(columns):
            v = real(lane.output, i * columns + j) - real(ideal.output, i * ideal.columns + j)
            if ideal.doubled != 0:
                v -= real(ideal.output, i * ideal.columns + columns + j)
            set_real(ideal.recent, at * columns + j, v)
        at = at + 1 if at + 1 < host.recent_frames else 0


@part
def ideal(host_, lane_, done, frames):
    host, lane = record(host_, HOST), record(lane_, LANE)
    ideal, channels = record(lane.ideal, LANE), host.channels
    if frames > 0:
        quantize(ideal, host.x + done * channels * 8, frames * channels)
        y_ = ideal.output + done * ideal.columns * 8
        call_kernel(ideal.kernel, ideal.input, y_, {ideal_arrays}, frames, channels, ideal.frame)
        ideal.frame += frames
        if ideal.recent != 0:
            keep_added(host, lane, ideal, done, frames)
        return 0
    ideal.frame = lane.frame
    apart = 2 if ideal.doubled != 0 else 1
    for i in range(lane.words):
        scale = real(lane.scales, i // channels)
        v = real(lane.state, i) if scale < 0.0 else np.float64(word(lane.state, i)) * scale if scale > 0.0 else 0.0
        at = (i // channels * apart) * channels + i % channels
        set_real(ideal.state, at, v)
        if apart == 2:
            set_real(ideal.state, at + channels, 0.0)
    return 0
'''
