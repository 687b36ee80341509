"""From the words of an equation to exact coefficients."""

from fractions import Fraction

from streamhost.errors import FilterError, nearest
from streamhost.filters.equation.linear import Linear, Signal, bits
from streamhost.filters.equation.refusal import refused, shortened
from streamhost.filters.equation.solving import Coefficients, solved
from streamhost.filters.equation.tokens import Token, number, tokens

MOST_CHARACTERS = 1_000_000
MOST_AGE = 10_000
MOST_DIGITS_OF_AGE = 20
MOST_BITS = 4096
DEEPEST = 16
CLOSING = {"[": "]", "(": ")"}
EXAMPLE = "y[n] = 0.5 x[n] + 0.9 y[n-1]"


def coefficients(text: object) -> Coefficients:
    """(b, a) of the equation in ascending powers of z^-1, exact, divided by the coefficient of y[n], so that a[0] is 1.

    a has the transfer function's sign: 0.9 y[n-1] on the right gives -0.9. Every coefficient is within the range of
    float64. FilterError where the text is no linear difference equation of x and y; it marks the column.
    """
    if not isinstance(text, str):
        raise FilterError(f"equation is of type {type(text).__name__}; it is a text, for instance {EXAMPLE}.")
    if len(text) > MOST_CHARACTERS:
        raise FilterError(f"equation has {len(text)} characters; at most {MOST_CHARACTERS} are read.")
    reader = _Reader(text)
    return solved(text, reader.equation().terms, reader.places)


class _Reader:
    """Goes over the words once, one method for each rule. `places` is where each signal was met first."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.words = list(tokens(text))
        self.next = 0
        self.depth = 0
        self.places: dict[Signal, int] = {}

    @property
    def word(self) -> Token:
        return self.words[self.next]

    def take(self) -> Token:
        self.next += 1
        return self.words[self.next - 1]

    def refuse(self, message: str, token: Token | None = None) -> FilterError:
        return refused(self.text, (token or self.word).position, message)

    def equation(self) -> Linear:
        """What is left of = less what is right of it."""
        if self.word.kind == "end":
            raise FilterError(f"equation is empty; it is written like {EXAMPLE}.")
        total = self.sum()
        if self.word.kind != "=":
            raise self.misplaced("a = is missing here; an equation is written like " + EXAMPLE + ".")
        self.take()
        total.add(self.sum(), -1)
        if self.word.kind != "end":
            raise self.misplaced("this is a second =; an equation has one.")
        return total

    def misplaced(self, message: str) -> FilterError:
        """What to say of a word that cannot follow a side: `message`, unless the word is a bracket."""
        if self.word.kind == ")":
            return self.refuse("this ) closes nothing; no ( is open here.")
        if self.word.kind in ("[", "]"):
            return self.refuse("[ ] follow x or y and hold a time, as in x[n-1].")
        return self.refuse(message)

    def sum(self) -> Linear:
        total = Linear()
        while True:
            sign, place = self.signs(), self.word
            term = self.term()
            if term.constant and not self.depth:
                raise self.refuse("a filter adds no constant; every term is a number times x[n-k] or y[n-k].", place)
            total.add(term, sign)
            self.check_length(total.bits(term.terms), place)
            if self.word.kind not in ("+", "-"):
                return total

    def signs(self) -> int:
        sign = 1
        while self.word.kind in ("+", "-"):
            sign = -sign if self.take().kind == "-" else sign
        return sign

    def term(self) -> Linear:
        """Numbers are gathered and multiplied in once, so that a long product costs no more than its length."""
        start, scale, signals, operator = self.word, Fraction(1), None, "*"
        while operator:
            sign, place = self.signs(), self.word
            factor = self.factor()
            if not factor.terms:
                scale *= sign * self.multiplier(factor.constant, operator, place)
                self.check_length(bits(scale), place)
            elif operator == "/":
                raise self.refuse("a division by a signal is not linear; only numbers divide.", place)
            elif signals:
                raise self.refuse("a product of two signals is not linear; perhaps a + or - is missing before it.", place)
            else:
                scale, signals = sign * scale, factor
            operator = self.operator()
        if signals is None:
            return Linear(constant=scale)
        signals.scale(scale)
        self.check_length(signals.bits(signals.terms), start)
        return signals

    def multiplier(self, value: Fraction, operator: str, place: Token) -> Fraction:
        if operator == "*":
            return value
        if value == 0:
            raise self.refuse("this divides by 0.", place)
        return 1 / value

    def operator(self) -> str:
        """What joins the next factor to those before it; empty where the term ends."""
        if self.word.kind in ("*", "/"):
            return self.take().kind
        if self.word.kind == "number":
            raise self.refuse("a number follows here without a sign; write * for a product, + or - for a sum.")
        return "*" if self.word.kind in ("name", "(") else ""

    def factor(self) -> Linear:
        if self.word.kind == "number":
            return Linear(constant=number(self.text, self.take()))
        if self.word.kind == "name":
            return self.signal()
        if self.word.kind == "(":
            return self.group()
        raise self.refuse("a term is missing here; a term is a number times x[n-k] or y[n-k].")

    def group(self) -> Linear:
        opening = self.take()
        self.depth += 1
        if self.depth > DEEPEST:
            raise self.refuse(f"this is more than {DEEPEST} brackets deep.", opening)
        total = self.sum()
        if self.word.kind != ")":
            raise self.refuse("a ) is missing here.")
        self.take()
        self.depth -= 1
        return total

    def signal(self) -> Linear:
        name = self.take()
        if name.text not in ("x", "y"):
            raise self.refuse(
                f"{shortened(name.text)} is not known; the signals are x and y, each with a time, as in x[n-1]."
                f"{nearest(name.text[:20], ('x', 'y'))}", name,
            )
        if self.word.kind not in CLOSING:
            raise self.refuse(f"{name.text} stands without a time; write {name.text}[n], {name.text}[n-1] and so on.", name)
        closing = CLOSING[self.take().kind]
        age = self.age(name)
        if self.word.kind != closing:
            raise self.refuse(f"a {closing} is missing here; a time is n, n-1, n-2 and so on.")
        self.take()
        self.places.setdefault((name.text, age), name.position)
        return Linear({(name.text, age): Fraction(1)})

    def age(self, name: Token) -> int:
        """The k of n-k."""
        if self.word.text != "n":
            raise self.refuse("a time begins with n; it is n, n-1, n-2 and so on.")
        self.take()
        if self.word.kind not in ("+", "-"):
            return 0
        ahead, age = self.take().kind == "+", self.take()
        if not age.text.isdecimal():
            raise self.refuse("a whole number is missing here; a time is n, n-1, n-2 and so on.", age)
        if ahead and age.text.strip("0"):
            raise self.refuse(
                f"{name.text}[n+{age.text[:MOST_DIGITS_OF_AGE]}] lies in the future, which a filter does not know; a time "
                "is n, n-1, n-2 and so on.", name,
            )
        if len(age.text) > MOST_DIGITS_OF_AGE or int(age.text) > MOST_AGE:
            raise self.refuse(f"this is too long ago; the oldest time is n-{MOST_AGE}.", age)
        return int(age.text)

    def check_length(self, length: int, place: Token) -> None:
        if length > MOST_BITS:
            raise self.refuse(
                f"the numbers of this term are too long to be kept exact; they take more than {MOST_BITS} bits.", place
            )
