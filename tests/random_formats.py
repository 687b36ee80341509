"""Random formats in every corner: words, roundings, overflows, accumulators, points, dither, and all floats."""

from random import Random

from streamhost.errors import FormatError
from streamhost.formats import OVERFLOWS, ROUNDINGS, Fixed, Float, Format


def random_format(rng: Random) -> Format:
    """One format; fixed point four times in five."""
    if rng.random() < 0.2:
        return random_float(rng)
    while True:
        try:
            return random_fixed(rng)
        except FormatError:
            continue


def random_float(rng: Random) -> Float:
    kind = rng.choice(["float32", "float64"])
    wide = "float64" if kind == "float32" and rng.random() < 0.5 else None
    return Float(kind, accumulator=wide, fused=rng.random() < 0.4, flush_subnormals=rng.random() < 0.3)


def random_word(rng: Random) -> str:
    """One in three longer than 32 bits."""
    bits = rng.choice([4, 8, 12, 16, 16, 24, 32, 48, 64, rng.randint(2, 64)])
    integer = rng.choice([1, 1, 1, 2, 3, rng.randint(1, max(1, bits // 2))])
    return f"Q{min(integer, bits - 1)}.{bits - min(integer, bits - 1)}"


def random_place(rng: Random) -> dict[str, object]:
    place: dict[str, object] = {}
    if rng.random() < 0.7:
        place["word"] = random_word(rng)
    if rng.random() < 0.5:
        place["rounding"] = rng.choice(ROUNDINGS)
    if rng.random() < 0.5:
        place["overflow"] = rng.choice(OVERFLOWS)
    return place


def random_accumulator(rng: Random) -> object:
    pick = rng.random()
    overflow = rng.choice(OVERFLOWS)
    if pick < 0.35:
        return "full"
    if pick < 0.7:
        drop = rng.choice([0, 0, -1, 4, 8, 16, 40, 64])
        return {"bits": rng.choice([16, 24, 32, 40, 56, 64]), "drop": drop, "overflow": overflow}
    fraction = rng.randint(4, 62)
    return {"word": f"Q{rng.randint(2, 64 - fraction)}.{fraction}", "overflow": overflow}


def random_fixed(rng: Random) -> Fixed:
    keys: dict[str, object] = {"rounding": rng.choice(ROUNDINGS), "overflow": rng.choice(OVERFLOWS)}
    for name in ("input", "operand", "state", "output"):
        if rng.random() < 0.3:
            keys[name] = random_place(rng)
    if rng.random() < 0.5:
        keys["accumulator"] = random_accumulator(rng)
    if rng.random() < 0.2:
        keys["rounding_place"] = "product"
    elif rng.random() < 0.4:
        keys["product"] = {"bits": rng.randint(2, 90), "rounding": rng.choice(ROUNDINGS)}
    keys["coefficients"] = {"bits": rng.choice([8, 12, 16, 24, 32, 48, 64]), "rounding": rng.choice(ROUNDINGS),
                            "point": rng.choice(["section", "polynomial", "realization", "coefficient"])}
    keys["feedback"] = rng.choice(["subtracted", "negated"])
    keys["pre_sum"] = rng.choice(["exact", "exact", "half", "signal"])
    if rng.random() < 0.3:
        keys |= {"dither": "tpdf", "dither_seed": rng.randint(0, 2**64 - 1)}
    return Fixed(random_word(rng), allow_vanishing=True, allow_clamping=True, **keys)  # type: ignore[arg-type]
