"""How the variants of a curve are called in CURVES."""


def phono_name(subsonic_us: float) -> str:
    """Phono replay with or without the high-pass of a time constant."""
    return f"phono-replay, {subsonic_us:g} us" if subsonic_us else "phono-replay"


def fm_name(time_constant_us: float) -> str:
    """FM de-emphasis with a time constant."""
    return f"fm-de-emphasis, {time_constant_us:g} us"
