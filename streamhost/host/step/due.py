"""What is due next: the actions that wait, and the next coefficients of a ramp."""

TEXT = '''
@helper
def next_bank(lane, frame, begins):
    for i in range(lane.coefficient_words):
        set_word(lane.coefficients, i, word(lane.bank, i))
    lane.bank += lane.coefficient_words * 8
    lane.banks_left -= 1
    lane.bank_frame = frame - (frame - begins) % {bank_frames} + {bank_frames}


@helper
def earliest(host):
    best, due, ticket = 0, 0, 0
    for k in range(record(host.control, CONTROL).used):
        at = host.actions + k * {action_bytes}
        if load_acquire(at) != 0 and record(at, ACTION).done == 0:
            action = record(at, ACTION)
            frame = max(action.frame, host.frame)
            if action.kind == {HEAR} and host.fade_frames > 0:
                frame = max(frame, host.fade_from + host.fade_frames)
            if best == 0 or frame < due or frame == due and action.ticket < ticket:
                best, due, ticket = at, frame, action.ticket
    host.due = due
    return best


@helper
def until_next(host, frames):
    while load_acquire(host.control) != host.taken:
        at = earliest(host)
        if at == 0:
            break
        if host.due > host.frame:
            frames = min(frames, host.due - host.frame)
            break
        call_part(host.act, host.address, at, 0, 0)
    for k in range({most}):
        if word(host.lanes, k) != 0:
            lane = record(word(host.lanes, k), LANE)
            if lane.banks_left > 0:
                if lane.bank_frame <= host.frame:
                    next_bank(lane, host.frame, host.begins)
                    if lane.ideal != 0:
                        next_bank(record(lane.ideal, LANE), host.frame, host.begins)
                if lane.banks_left > 0:
                    frames = min(frames, lane.bank_frame - host.frame)
    return frames
'''
