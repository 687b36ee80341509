"""What is done at the frame at which it is due: another lane heard, with its state; coefficients; lanes; the source."""

TEXT = '''
@helper
def take_state(host, action, before_, lane_):
    lane = record(lane_, LANE)
    clipped, copies = 0, action.changeover == {keep} or action.changeover == {carry} and action.argument == 0
    if action.changeover == {carry} and action.argument < 0 or before_ == 0:
        return 0
    for i in range(lane.words):
        set_word(lane.state, i, word(record(before_, LANE).state, i) if copies else 0)
    lane.frame = record(before_, LANE).frame if copies else 0
    if action.changeover == {carry} and action.argument > 0:
        clipped = call_part(host.carry, host.address, before_, lane_, action.argument)
    if lane.ideal != 0:
        call_part(host.ideal, host.address, lane_, 0, 0)
    return clipped


@helper
def hear(host, action):
    before_, lane_, clipped = word(host.lanes, action.before), word(host.lanes, action.lane), 0
    if lane_ == 0:
        return -1
    if action.changeover == {cold} or action.changeover < {warm} and before_ != lane_:
        clipped = take_state(host, action, before_, lane_)
    host.fade_frames = 0
    if action.changeover == {fade}:
        host.before, host.fade_from, host.fade_frames = host.heard_lane, host.frame, action.count
    host.heard_lane = action.lane
    return clipped


@part
def act(host_, at, unused, nothing):
    host, action, lane_, clipped = record(host_, HOST), record(at, ACTION), 0, 0
    if action.lane >= 0:
        lane_ = word(host.lanes, action.lane)
    if action.kind == {HEAR}:
        clipped = hear(host, action)
    elif action.kind == {BANK} and lane_ != 0:
        lane = record(lane_, LANE)
        lane.bank, lane.banks_left, lane.bank_frame = action.argument, action.count, host.frame
        if lane.ideal != 0:
            ideal = record(lane.ideal, LANE)
            ideal.bank, ideal.banks_left, ideal.bank_frame = action.ideal_argument, action.count, host.frame
    elif action.kind == {PLACE}:
        set_word(host.lanes, action.lane, action.argument)
    elif action.kind == {SOURCE_KIND}:
        host.source = action.argument
    elif action.kind == {SUBTRACT}:
        host.minus, host.raise_by = action.lane, action.value
    meters = record(host.meters, HOST_METERS)
    log = record(host.log + meters.logged % host.log_length * {log_bytes}, LOG)
    log.ticket, log.kind, log.frame, log.lane = action.ticket, action.kind, host.frame, action.lane
    log.before, log.changeover, log.clipped = action.before, action.changeover, clipped
    store_release(host.meters + {logged_at}, meters.logged + 1)
    host.taken += 1
    store_release(at + {done_at}, 1)
    store_release(host.meters + {taken_at}, host.taken)
    return 0
'''
