"""What the compiled step takes of a block's time: a script to be run by hand, since no test is timed.

Eight order-8 lanes, four of them float and four fixed point with their meters, one heard and sent through the guard, blocks
of 64 frames at 48 kHz on the clock, as fast as they go. Printed are the times of the step against the deadline, and the load
of each lane.

    python tests/benchmarks/step.py [--seconds 60] [--block 64] [--channels 2] [--ideal]

To reach: a median of at most 1 %, and 99.9 % of blocks within 5 % of the deadline.
"""

import argparse

import streamhost as sh
from streamhost.formats import Fixed
from streamhost.host import Device, Host, Lane
from streamhost.host.clock import run_on_clock
from streamhost.host.figures import lane_figures, run_figures
from streamhost.host.sources import looped
from streamhost.signals import white

RATE = 48000
LANES = (
    ("transposed-2", "float32"), ("direct-1", "float32"), ("transposed-2", "float64"), ("lattice-ladder", "float64"),
    ("direct-1", "16x16+40"), ("direct-1", "24x24+56"), ("transposed-1", "32x32+64"), ("direct-1", "24x24+56"),
)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--block", type=int, default=64)
    parser.add_argument("--channels", type=int, default=2)
    parser.add_argument("--ideal", action="store_true")
    arguments = parser.parse_args()
    channels = arguments.channels
    filter = sh.design("butterworth", rate=RATE, response="low-pass", order=8, frequency=1000)
    realizations = [sh.realize(filter, form=form, decomposition="cascade", format=format) for form, format in LANES]
    lanes = [Lane(each, channels, metered=isinstance(each.format, Fixed), ideal=arguments.ideal) for each in realizations]
    noise = looped(white(10 * RATE, channels, 1, -20.0), "noise")
    host = Host(lanes, arguments.block, device=Device(0, channels, float32=True), source=noise, recent=1 << 15)
    host.come_up()
    run_on_clock(host, int(arguments.seconds * RATE), real_time=False)
    figures = run_figures(host.shared, arguments.block, RATE)
    deadline = figures["deadline_us"]
    assert isinstance(deadline, float)
    for name in ("step_p50_us", "step_p999_us", "step_max_us"):
        value = figures[name]
        assert isinstance(value, float)
        print(f"{name:<14} {value:9.2f}   {100 * value / deadline:6.2f} % of {deadline:.0f} us")
    print(f"{figures['blocks']} blocks, {figures['blocks_over_half']} over half of the deadline")
    for number, (form, format) in enumerate(LANES):
        print(f"{form:<16} {format:<10} load {lane_figures(host.shared, number, channels, RATE).load_percent:.3f} %")


if __name__ == "__main__":
    main()
