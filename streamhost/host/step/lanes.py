"""A chunk of input through every lane, by the address of its kernel; what came is counted."""

TEXT = '''
@helper
def into_ring(ring, length, frame, from_, frames, columns):
    at = frame % length * columns
    for i in range(frames):
        for j in range(columns):
            set_real(ring, at + j, real(from_, i * columns + j))
        at = at + columns if at + columns < length * columns else 0


@helper
def bring_in(host, in_, done, frames):
    channels, given, x_ = host.channels, host.input_channels, host.x + done * host.channels * 8
    if record(host.source, SOURCE).kind != {device}:
        call_part(host.generate, host.address, x_, frames, 0)
    else:
        empty, wide = in_ == 0 or given == 0, host.sample_bytes == 8
        for i in range(frames):
            for c in range(channels):
                at, v = (done + i) * given + min(c, given - 1), 0.0
                if not empty:
                    v = real(in_, at) if wide else np.float64(single(in_, at))
                set_real(x_, i * channels + c, v)
    into_ring(host.input_recent, host.input_recent_frames, host.frame, x_, frames, channels)


@helper
def count(lane, shown, y_, samples, window):
    peak, total, bad, own_peak, own_total = shown.peak, shown.sum_of_squares, 0, shown.window_peak, shown.window_squares
    for i in range(samples):
        v = real(y_, i)
        if v != v:
            bad += 1
        else:
            peak, own_peak = max(peak, abs(v)), max(own_peak, abs(v))
            total += v * v
            own_total += v * v
    shown.peak, shown.sum_of_squares, shown.window_peak, shown.window_squares = peak, total, own_peak, own_total
    shown.not_a_number += bad
    shown.samples += samples
    shown.window_frames += samples // lane.columns
    if shown.window_frames >= window:
        shown.shown_peak, shown.shown_squares = own_peak, own_total / np.float64(shown.window_frames * lane.columns)
        shown.window_peak, shown.window_squares, shown.window_frames = 0.0, 0.0, 0
    if lane.metered != 0:
        saturations, wraps, overflows = 0, 0, 0
        for i in range(lane.counters):
            number, kind = word(lane.meters, i), word(lane.kinds, i)
            saturations += number if kind == 1 else 0
            wraps += number if kind == 2 else 0
            overflows += number if kind == 3 else 0
        shown.saturations, shown.wraps, shown.accumulator_overflows = saturations, wraps, overflows


@helper
def run_all(host, done, frames):
    x_, channels = host.x + done * host.channels * 8, host.channels
    now = nanoseconds()
    for k in range({most}):
        lane_ = word(host.lanes, k)
        if lane_ == 0:
            continue
        lane = record(lane_, LANE)
        shown, columns = record(lane.shown, LANE_METERS), lane.columns
        y_ = lane.output + done * columns * 8
        if lane.metered != 0:
            for i in range(frames * channels):
                set_byte(lane.marks, done * channels + i, np.uint8(0))
        call_kernel(lane.kernel, x_, y_, {arrays}, frames, channels, lane.frame)
        lane.frame += frames
        count(lane, shown, y_, frames * columns, host.window_frames)
        if lane.ideal != 0:
            call_part(host.ideal, host.address, lane_, done, frames)
        if lane.recent != 0:
            into_ring(lane.recent, host.recent_frames, host.frame, y_, frames, columns)
        shown.frame = lane.frame
        before, now = now, nanoseconds()
        shown.nanoseconds += now - before
'''
