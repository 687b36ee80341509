"""Labels as runs of italic, upright, lowered and raised text, and how wide they are.

Widths are those of DejaVu Serif, the widest face of the font stack: what fits in it fits in every other.
"""

import re
from dataclasses import dataclass

SIZE = 13.0
SMALL = 0.72
MINUS = "\N{MINUS SIGN}"
DOTS = "\N{HORIZONTAL ELLIPSIS}"
SHORT = 8

# Advance widths in thousandths of the size, characters 32 to 126, rounded up to the wider of upright and italic.
ASCII = (
    318, 402, 460, 838, 636, 950, 890, 275, 390, 390, 500, 838, 318, 338, 318, 337, 636, 636, 636, 636, 636, 636, 636, 636,
    636, 636, 337, 337, 838, 838, 838, 536, 1000, 722, 735, 765, 802, 730, 694, 799, 872, 395, 401, 747, 664, 1024, 875, 820,
    673, 820, 753, 685, 667, 843, 722, 1028, 712, 660, 695, 390, 337, 390, 838, 500, 500, 596, 640, 560, 640, 592, 370, 640,
    644, 320, 310, 606, 320, 948, 644, 602, 640, 640, 478, 513, 402, 644, 565, 856, 564, 565, 527, 636, 337, 636, 838,
)
OTHERS = {MINUS: 838, DOTS: 1000}
WIDEST = 1000
GREEK = {"alpha": "\N{GREEK SMALL LETTER ALPHA}", "beta": "\N{GREEK SMALL LETTER BETA}",
         "sigma": "\N{GREEK SMALL LETTER SIGMA}", "omega": "\N{GREEK SMALL LETTER OMEGA}"}

COEFFICIENT = re.compile(r"(-?)([A-Za-z]+)_?(\d*)(?:_(\d+|[A-Za-z]))?")
TO_AN_OUTPUT = re.compile(r"(-?)([A-Za-z]|[A-Za-z]+(?=\d))(?:_?(\d+|[kN]))?_([a-z][a-z0-9]+)(?:_(\d+))?")


@dataclass(frozen=True)
class Run:
    """A piece of text; `level` is 0 on the line, -1 lowered, 1 raised."""

    text: str
    italic: bool = False
    level: int = 0

    @property
    def size(self) -> float:
        return SMALL if self.level else 1.0


Label = tuple[Run, ...]


def width(label: Label, size: float = SIZE) -> float:
    """How wide a label is at a size, in the unit of the size."""
    return sum(text_width(run.text) * run.size for run in label) * size


def text_width(text: str) -> float:
    """In units of the size."""
    return sum(map(advance, text)) / 1000


def advance(character: str) -> int:
    place = ord(character) - 32
    return ASCII[place] if 0 <= place < len(ASCII) else OTHERS.get(character, WIDEST)


def plain(label: Label) -> str:
    """The label on one line of ASCII: b0, alpha1, z^-1."""
    marks = {0: "", -1: "", 1: "^"}
    line = "".join(marks[run.level] + run.text for run in label).replace(MINUS, "-").replace(DOTS, "...")
    for word, letter in GREEK.items():
        line = line.replace(letter, word)
    return line


def coefficient(name: str) -> Label:
    """A coefficient's name: "b0" is b with 0 lowered, "b0_1" the same of section 1, "b0_low_1" of section 1 to the output low.

    "alpha1" is the Greek letter with 1 lowered. What is no such name is kept as it is.
    """
    found = COEFFICIENT.fullmatch(name) or TO_AN_OUTPUT.fullmatch(name)
    if found is None:
        return (Run(name),)
    sign, letters, *numbers = found.groups()
    letters = GREEK.get(letters, letters)
    below = [number for number in numbers if number]
    subscript = ("" if all(len(number) == 1 for number in below) else ",").join(below)
    runs = [Run(MINUS)] if sign else []
    runs.append(Run(letters, italic=len(letters) == 1))
    return (*runs, *(lowered(subscript) if subscript else ()))


def lowered(subscript: str) -> Label:
    """A subscript: a letter for a number in italics, all else upright."""
    return tuple(Run(piece, piece.isalpha() and len(piece) == 1, -1)
                 for piece in re.findall(r"[A-Za-z]+|[^A-Za-z]+", subscript))


def sentence(words: str) -> Label:
    """A sentence in which x_i is x with i lowered, and letters that stand for something are in italics."""
    runs: list[Run] = []
    for piece in re.split(r"\b([a-z]_[\w+]+|[ikNxy]\b)", words):
        name, _, below = piece.partition("_")
        runs += [Run(name, italic=len(name) == 1 and name.isalpha()), *lowered(below)] if piece else []
    return tuple(runs)


def equation(words: str) -> Label:
    """A difference equation on one line, in which x[n-1] is x in italics, [n-1] with a real minus."""
    runs: list[Run] = []
    for piece in re.split(r"([A-Za-z]\w*\[n[^\]]*\])", words):
        name, bracket, age = piece.partition("[n")
        if bracket:
            runs += [*coefficient(name), Run("["), Run("n", italic=True), Run(age.replace("-", MINUS))]
        elif piece:
            runs.append(Run(piece.replace("-", MINUS)))
    return tuple(runs)


def signal(name: str) -> Label:
    """x[n], y_1[n]."""
    return (*coefficient(name), Run("["), Run("n", italic=True), Run("]"))


def delay(frames: int) -> Label:
    """z to the power of -n."""
    return Run("z", italic=True), Run(f"{MINUS}{frames}", level=1)


def power_of_two(k: int) -> Label:
    return (Run("2"),) if k == 1 else (Run("2"), Run(str(k).replace("-", MINUS), level=1))


def short_number(value: float) -> Label:
    """A number in at most SHORT characters, with as many digits as fit; none where three do not."""
    for digits in (5, 4, 3):
        written = f"{value:.{digits}g}"
        if len(written) <= SHORT:
            return (Run(written.replace("-", MINUS)),)
    return ()


def tap_names(name: str, taps: int) -> Label:
    """What stands in a tapped line drawn as one block: its first and its last tap."""
    first = (Run(name, italic=len(name) == 1), Run("0", level=-1))
    if taps == 1:
        return first
    return (*first, Run(f" {DOTS} "), Run(name, italic=len(name) == 1), Run(str(taps - 1), level=-1))
