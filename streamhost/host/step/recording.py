"""What is heard, into a ring that a thread outside empties; where it is full, frames are lost and counted."""

TEXT = '''
@part
def keep(host_, frames, unused, nothing):
    host = record(host_, HOST)
    meters = record(host.meters, HOST_METERS)
    width, length, at = host.outputs * host.channels, host.recording_frames, meters.recorded
    if at + frames - load_acquire(host.control + {drained_at}) > length:
        meters.overruns += frames
        return 0
    row = at % length
    for i in range(frames):
        for j in range(width):
            set_real(host.recording, row * width + j, real(host.heard, i * width + j))
        row = row + 1 if row + 1 < length else 0
    store_release(host.meters + {recorded_at}, at + frames)
    return 0
'''
