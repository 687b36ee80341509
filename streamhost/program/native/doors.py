"""How a real sample enters a fixed-point kernel: scaled, limited, rounded, as the input's quantizer says."""

from streamhost.formats import Quantizer
from streamhost.program.native.text import Text

ROUNDED = {
    "half-even": "np.rint({z})",
    "floor": "np.floor({z})",
    "toward-zero": "np.trunc({z})",
    "half-up": "(np.floor({z}) + np.float64({z} - np.floor({z}) >= 0.5))",
    "half-away": "(np.trunc({z}) + np.float64({z} - np.trunc({z}) >= 0.5) - np.float64(np.trunc({z}) - {z} >= 0.5))",
}


def input_text(text: Text, name: str, quantizer: Quantizer, *, metered: bool) -> None:
    """Statements that read x[n, c] into an integer variable; NaN becomes 0 and is counted."""
    word = quantizer.word
    assert word.bits <= 53, "longer words come in as codes"
    text("z = x[n, c]")
    if metered:
        text("m0 += np.int64(z != z)")
    if quantizer.overflow == "saturate":
        text("z = 0.0 if z != z else z")
        text(f"z = min(max(z * {2.0**word.fraction!r}, {float(word.low)!r}), {float(word.high)!r})")
        text(f"{name} = np.int64({ROUNDED[quantizer.rounding].format(z='z')})")
        return
    text(f"z = z * {2.0**word.fraction!r} if np.isfinite(z) else 0.0")
    text(f"z = {ROUNDED[quantizer.rounding].format(z='z')}")
    text(f"z = z - np.floor(z * {2.0**-word.bits!r}) * {2.0**word.bits!r}")
    text(f"{name} = (np.int64(z) << {64 - word.bits}) >> {64 - word.bits}")
