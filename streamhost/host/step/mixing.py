"""What is heard, with the changeover's fade, and what is sent to the monitor: that, or a difference, raised."""

TEXT = '''
@helper
def fade(host, done, frames):
    lane_, width = word(host.lanes, host.heard_lane), host.outputs * host.channels
    into = host.heard + done * width * 8
    if lane_ == 0:
        for i in range(frames * width):
            set_real(into, i, 0.0)
        return
    lane = record(lane_, LANE)
    first, match = lane.output + done * width * 8, lane.match
    for i in range(frames * width):
        set_real(into, i, real(first, i) * match)
    before_, left = word(host.lanes, host.before), host.fade_from + host.fade_frames - host.frame
    if host.fade_frames > 0 and before_ != 0:
        before = record(before_, LANE)
        first, match = before.output + done * width * 8, before.match
        for i in range(min(frames, left)):
            share = np.float64(host.fade_frames - left + i + 1) / np.float64(host.fade_frames + 1)
            for j in range(i * width, (i + 1) * width):
                set_real(into, j, real(into, j) * share + real(first, j) * match * (1.0 - share))
    if frames >= left:
        host.fade_frames = 0


@part
def mix(host_, done, frames, unused):
    host = record(host_, HOST)
    fade(host, done, frames)
    width, channels, output = host.outputs * host.channels, host.channels, host.output_index * host.channels
    other_ = 0
    if host.minus > {nothing}:
        other_ = word(host.lanes, host.heard_lane if host.minus < 0 else host.minus)
    match, columns, first, doubled = 0.0, 0, 0, 0
    if other_ != 0:
        lane = record(other_, LANE)
        match, columns, first = lane.match, lane.columns, lane.output
        if host.minus < 0:
            if lane.ideal != 0:
                ideal = record(lane.ideal, LANE)
                columns, first, doubled = ideal.columns, ideal.output, ideal.doubled
            else:
                match, first = 0.0, 0
    raise_by, heard_, sent_ = host.raise_by, host.heard, host.sent
    at = host.frame % max(host.recent_frames, 1)
    for i in range(done, done + frames):
        for c in range(channels):
            v = real(heard_, i * width + output + c)
            if first != 0:
                place = i * columns + output + c
                v -= real(first, place) * match
                if doubled != 0:
                    v -= real(first, place + width) * match
                v *= raise_by
            set_real(sent_, i * channels + c, v)
            if host.sent_recent != 0:
                set_real(host.sent_recent, at * channels + c, v)
        if host.heard_recent != 0:
            for j in range(width):
                set_real(host.heard_recent, at * width + j, real(heard_, i * width + j))
        at = at + 1 if at + 1 < host.recent_frames else 0
    return 0
'''
