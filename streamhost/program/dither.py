"""Triangular dither as a counter: the same values on every machine and for any division into blocks.

mix is the finalizer of splitmix64 (Steele, Lea & Flood, OOPSLA 2014); all arithmetic is modulo 2^64.
"""

MASK = (1 << 64) - 1
GAMMA = 0x9E3779B97F4A7C15


def mix(z: int) -> int:
    z ^= z >> 30
    z = z * 0xBF58476D1CE4E5B9 & MASK
    z ^= z >> 27
    z = z * 0x94D049BB133111EB & MASK
    return z ^ z >> 31


def dither_key(seed: int, ordinal: int, channel: int) -> int:
    """The key of one rounding in one channel."""
    key = mix(seed + GAMMA & MASK)
    key = mix(key + GAMMA * (ordinal + 1) & MASK)
    return mix(key + GAMMA * (channel + 1) & MASK)


def dither_word(key: int, frame: int, j: int) -> int:
    """The 64 random bits r_j of a frame, j = 0 or 1."""
    return mix(key + GAMMA * (2 * frame + j + 1) & MASK)


def dither_value(key: int, frame: int, drop: int) -> int:
    """u_0 - u_1 in units of the last of `drop` dropped bits."""
    if drop <= 0:
        return 0
    first, second = (dither_word(key, frame, j) for j in (0, 1))
    if drop > 64:
        return (first - second) << (drop - 64)
    return (first >> (64 - drop)) - (second >> (64 - drop))
