"""What the instrument `overflow` says, and the worst cases that are audio."""

import re
from collections.abc import Iterator

from streamhost.commands.common import MINUS, Column, ledger
from streamhost.commands.measuring.wave import Wave
from streamhost.measure import Overflow, Recovery, Register

REGISTERS = (
    Column("register"), Column("word"), Column("on overflow"), Column("largest", "L1", 4), Column("sine", "peak", 4),
    Column("noise", "L2", 4), Column("headroom", "bits", 2), Column("", "dB", 1), Column("for a sine", "dB", 1),
    Column("no input"), Column("overflows"), Column("first in", "frame"),
)
BURSTS = (
    Column("after"), Column("then"), Column("trials"), Column("overflows"), Column("joins its ideal", "frames"),
    Column("", "ms", 2),
    Column("oscillate"), Column("period", "frames"), Column("off by", "dBFS", 1),
)

MOST_NAMED = 3


def lines(result: Overflow) -> Iterator[str]:
    """A ledger of registers, whether any can overflow, a ledger of what came after bursts."""
    if not result.registers:
        yield f"Not asked: {result.reason}."
        return
    yield ledger(REGISTERS, [_register(each) for each in result.registers], numbered=False)
    if result.proven:
        yield "Proven: no input within full scale can overflow a register (the L1 norm, with all roundings, fits every word)."
    else:
        open_ = list(dict.fromkeys(each.name for each in result.registers if not each.fits))
        more = f" and {len(open_) - MOST_NAMED} more" if len(open_) > MOST_NAMED else ""
        yield f"Not proven: the L1 norm, with all roundings, is beyond the word of {', '.join(open_[:MOST_NAMED])}{more}."
    if any(each.fits and not each.proven for each in result.registers):
        yield "What fits cannot overflow as long as nothing before it does."
    if result.recoveries:
        yield ledger(BURSTS, [_recovery(each) for each in result.recoveries], numbered=False)
        allowed = f"{result.recoveries[0].allowed_dbfs:.1f}".replace("-", MINUS)
        yield f"It has joined its ideal where it stays within {allowed} dBFS of it, as much as roundings alone can make."
    elif result.reason and not result.proven:
        yield f"What comes after an overflow is not told: {result.reason}."
    if result.oscillates:
        yield "An oscillation was found: after an overflow it goes on by itself."
    elif result.oscillates is False:
        yield "No oscillation was found after these bursts; that is no proof."


def _register(each: Register) -> list[str | int | float | None]:
    return [each.name, each.word, each.on_overflow, each.l1, each.peak, each.l2, each.headroom_bits, each.headroom_db,
            each.sine_headroom_db, "proven" if each.proven else "fits" if each.fits else "", each.overflows, each.first_frame]


def _recovery(each: Recovery) -> list[str | int | float | None]:
    milliseconds = None if each.recovery_s is None else 1000.0 * each.recovery_s
    return [each.burst, each.after, each.trials, each.overflows, each.recovery_frames, milliseconds, each.oscillating,
            each.period_frames, each.peak_dbfs]


def waves(result: Overflow) -> Iterator[Wave]:
    """The worst case of each register that has one it does not hold, each input once; else of the one with least headroom."""
    open_ = [each for each in result.registers if not each.fits] or [
        each for each in result.registers if each.name == result.headroom_register]
    told: set[bytes] = set()
    for each in open_:
        if each.worst_input is not None and (key := each.worst_input.tobytes()) not in told:
            told.add(key)
            name = re.sub(r"[^A-Za-z0-9._-]+", "-", each.name.removeprefix("the "))
            yield Wave(f"worst-{name}", each.worst_input[:, None])
