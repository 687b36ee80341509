"""The monitor's path: its gain, and the output guard."""

TEXT = '''
@helper
def shut(host, meters, reason, frame):
    if meters.state != {SHUT}:
        meters.state, meters.reason, meters.reason_frame, meters.reason_lane = {SHUT}, reason, frame, host.heard_lane
    meters.gain = 0.0


@helper
def move_gain(host, meters, target):
    gain = meters.gain
    gain = min(target, gain * host.up) if gain < target else max(target, gain * host.down)
    meters.gain = gain
    if gain == target:
        meters.state = {SOUNDING}


@helper
def judge(host, meters, i, frame):
    for c in range(host.channels):
        v = real(host.sent, i * host.channels + c)
        if not abs(v) <= host.runaway:
            shut(host, meters, np.int64(1 if v != v else 2 if abs(v) == np.inf else 3), frame)


@helper
def guarded(host, meters, v, ceiling):
    if meters.gain == 0.0:
        return 0.0
    v *= meters.gain
    if abs(v) > ceiling:
        meters.held += 1
        v = ceiling if v > 0.0 else -ceiling
    return v


@helper
def obey(host, control, meters):
    if control.come_up != meters.came_up:
        meters.came_up = control.come_up
        if control.mute == 0:
            meters.state, meters.gain, meters.reason, host.loud = {COMING_UP}, host.low, 0, 0
    if control.mute != 0 and meters.state != {SHUT}:
        meters.state, meters.gain = {MUTED}, 0.0


@part
def listen(host_, out_, frames, unused):
    host = record(host_, HOST)
    control, meters = record(host.control, CONTROL), record(host.meters, HOST_METERS)
    channels, columns, ceiling = host.channels, host.output_channels, control.ceiling
    first = host.frame - frames
    obey(host, control, meters)
    for i in range(frames):
        if meters.state == {COMING_UP} or meters.state == {SOUNDING}:
            move_gain(host, meters, control.gain)
        judge(host, meters, i, first + i)
        loud = 0
        for c in range(columns):
            j, v = 0 if channels == 1 else c, 0.0
            if j < channels:
                v = guarded(host, meters, real(host.sent, i * channels + j), ceiling)
                loud |= np.int64(abs(v) >= host.loud_level * ceiling)
                meters.window_peak = max(meters.window_peak, abs(v))
                meters.window_squares += v * v
            if c == control.counter_channel:
                v = np.float64((first + i) & 16777215) / 16777216.0
            if host.sample_bytes == 8:
                set_real(out_, i * columns + c, v)
            else:
                set_single(out_, i * columns + c, np.float32(v))
        host.loud = max(host.loud + (1 if loud != 0 else -1), 0)
        if host.loud > host.loud_most:
            shut(host, meters, np.int64(4), first + i)
    meters.window_frames += frames
    if meters.window_frames >= host.window_frames:
        meters.shown_peak = meters.window_peak
        meters.shown_squares = meters.window_squares / np.float64(meters.window_frames * max(columns, 1))
        meters.window_peak, meters.window_squares, meters.window_frames = 0.0, 0.0, 0
    return 0
'''
