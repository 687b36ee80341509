"""The step itself, with the signature of a sound card's callback: blocks cut where something is due, and timed."""

TEXT = '''
@helper
def run_block(host, in_, out_, frames):
    done = np.int64(0)
    while done < frames:
        now = until_next(host, frames - done)
        bring_in(host, in_, done, now)
        run_all(host, done, now)
        if host.mix != 0:
            call_part(host.mix, host.address, done, now, 0)
        host.frame += now
        done += now
    if out_ != 0:
        call_part(host.listen, host.address, out_, frames, 0)
    if host.recording != 0 and record(host.control, CONTROL).recording != 0:
        call_part(host.record, host.address, frames, 0, 0)


@helper
def tell_time(host, meters, took, frames):
    meters.nanoseconds += took
    meters.longest_nanoseconds = max(meters.longest_nanoseconds, took)
    meters.blocks_over_half += np.int64(np.float64(took) * host.rate_hz * 2.0 > np.float64(frames) * 1e9)
    octave = 0
    while took >= 2 * {bins}:
        took >>= 1
        octave += 1
    place = min(octave * {bins} + max(took, 0), {all_bins} - 1)
    set_word(host.histogram, place, word(host.histogram, place) + 1)


@cfunc(types.int32(types.voidptr, types.voidptr, types.uint64, types.voidptr, types.uint64, types.voidptr),
       cache=CACHE, error_model="numpy")
def step(in_, out_, frames, time, flags, user):
    began = nanoseconds()
    host = record(address_of(user), HOST)
    meters = record(host.meters, HOST_METERS)
    given, wanted = address_of(in_), address_of(out_)
    left = np.int64(frames)
    while left > 0:
        now = min(left, host.block)
        run_block(host, given, wanted, now)
        if given != 0:
            given += now * host.input_channels * host.sample_bytes
        if wanted != 0:
            wanted += now * host.output_channels * host.sample_bytes
        left -= now
    meters.input_gaps += np.int64((flags & U(3)) != U(0))
    meters.output_gaps += np.int64((flags & U(12)) != U(0))
    meters.frame, meters.heard_lane = host.frame, host.heard_lane
    ended = nanoseconds()
    meters.last_nanoseconds = ended
    tell_time(host, meters, ended - began, np.int64(frames))
    store_release(host.meters + {callbacks_at}, meters.callbacks + 1)
    return 0
'''
