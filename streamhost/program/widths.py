"""Which word every value has, and at how many fraction bits every sum is made, before any node is visited.

Words of registers follow from the format alone. The fraction of an accumulator follows from what enters it: sums joined
without a register share one, and a shift by k < 0 on the way counts as -k more fraction bits.
"""

from dataclasses import dataclass
from functools import cached_property

from streamhost.diagram.diagram import Diagram
from streamhost.diagram.nodes import Delay, Gain, Input, Residue, Round, Shift, Sum, Taps
from streamhost.errors import DiagramError, FormatError
from streamhost.formats import Fixed, Quantizer, Word
from streamhost.program.roles import Roles


@dataclass(frozen=True)
class Operand:
    """What a multiplier reads: its fraction bits, and the quantizer before it (None: the value is read whole)."""

    fraction: int
    quantizer: Quantizer | None


class Widths:
    """Words and fractions of one diagram in one format; coefficient words are those of its slots."""

    def __init__(self, diagram: Diagram, roles: Roles, format: Fixed, coefficient_words: tuple[Word, ...]) -> None:
        self.diagram, self.roles, self.format = diagram, roles, format
        self.coefficient_words = coefficient_words
        self._known: dict[tuple[str, int], int] = {}
        self._words: dict[int, Word] = {}

    def quantizer(self, index: int) -> Quantizer:
        """The quantizer of a register or a `round`."""
        node = self.diagram.nodes[index]
        if isinstance(node, Round) and node.quantizer is not None:
            return node.quantizer
        if isinstance(node, Sum) and node.grow is not None:
            signal = self.format.signal
            return Quantizer(signal.word.widened(node.grow), signal.rounding, "wrap", signal.dither)
        return self.format.state if self.roles.delayed[index] else self.format.signal

    def base(self, index: int) -> tuple[int, int]:
        """The node behind shifts that are part of a term, and their sum."""
        shift = 0
        while isinstance(node := self.diagram.nodes[index], Shift) and not self.roles.register[index]:
            shift += node.k
            index = node.source
        return index, shift

    @cached_property
    def drivers(self) -> tuple[int, ...]:
        """For each node, what stands before it and the delays behind it: itself unless it is a delay."""
        found = list(range(len(self.diagram.nodes)))
        for start, first in enumerate(self.diagram.nodes):
            index, path = start, {start}
            node = first
            while isinstance(node, Delay):
                index = node.source
                node = self.diagram.nodes[index]
                if index in path:
                    raise DiagramError(
                        f'The delays around "{first.label}" drive each other and nothing drives them: such a '
                        f"loop has no word."
                    )
                path.add(index)
            found[start] = index
        return tuple(found)

    def word(self, index: int) -> Word:
        """The word of a stored value: an input, a register, a round, or a delay of one.

        A round of what its word holds already leaves it in its own.
        """
        index = self.drivers[index]
        node = self.diagram.nodes[index]
        if isinstance(node, Input):
            return self.format.input.word
        if index not in self._words:
            word = self._words[index] = self.quantizer(index).word
            before = self.stored_word(node.source) if isinstance(node, Round) and not self.residue_asked(index) else None
            self._words[index] = before if before is not None and word.holds(before) else word
        return self._words[index]

    def residue_asked(self, index: int) -> bool:
        """Whether anything reads what a register drops."""
        return any(isinstance(self.diagram.nodes[reader], Residue) for reader in self.diagram.readers[index])

    def stored_word(self, index: int) -> Word | None:
        """The word of a value that stands in one or needs one; None for what is still in an accumulator, and a residue."""
        node = self.diagram.nodes[index]
        if self.roles.residual[index]:
            return None
        if self.roles.pre_sum[index]:
            assert isinstance(node, Sum), "only a sum is a pre-sum"
            words = [(self.word(base), shift) for base, shift in (self.base(t.source) for t in node.terms)]
            integer = max(word.integer + shift for word, shift in words) + self.pre_sum_growth(index)
            return Word(integer, max(word.fraction + max(0, -shift) for word, shift in words))
        if self.roles.register[index] or isinstance(node, Input | Delay | Round):
            return self.word(index)
        return None

    def operand(self, source: int) -> Operand:
        """What a multiplier that reads `source` sees."""
        if self.roles.whole[source]:
            return Operand(self.seen(source), None)
        place = self.format.operand
        if self._is_operand(source):
            return Operand(place.word.fraction, None)
        if self.roles.pre_sum[source] and self.format.pre_sum == "exact":
            extra = self.pre_sum_growth(source)
            return Operand(place.word.fraction, place.with_word(place.word.widened(extra)))
        return Operand(place.word.fraction, place)

    def _is_operand(self, index: int) -> bool:
        """In a program: the rounding that made the operand of a pre-sum."""
        node = self.diagram.nodes[index]
        if not isinstance(node, Round) or node.quantizer is None:
            return False
        source = self.diagram.nodes[node.source]
        return isinstance(source, Sum) and source.exact

    def pre_sum_growth(self, index: int) -> int:
        """How many integer bits a pre-sum needs beyond the longest of its terms."""
        node = self.diagram.nodes[index]
        assert isinstance(node, Sum), "only a sum is a pre-sum"
        terms = []
        for term in node.terms:
            base, shift = self.base(term.source)
            terms.append((term.sign, self.word(base), shift))
        return growth(terms)

    def seen(self, index: int) -> int:
        """Fraction bits of a node as sums and rounds read it."""
        return self._resolve(("seen", index))

    def raw(self, index: int) -> int:
        """Fraction bits of a node before its register."""
        return self._resolve(("raw", index))

    def product(self, gain: Gain) -> int:
        """Fraction bits of an exact product."""
        return self.operand(gain.source).fraction + self.coefficient_words[gain.coefficient].fraction

    def _resolve(self, goal: tuple[str, int]) -> int:
        stack, pending = [goal], set()
        while stack:
            top = stack[-1]
            if top in self._known:
                stack.pop()
                continue
            missing = [need for need in self._needs(top) if need not in self._known]
            if not missing:
                self._known[top] = self._compute(top)
                pending.discard(top)
                stack.pop()
                continue
            if top in pending:
                label = self.diagram.nodes[top[1]].label
                raise FormatError(
                    f'The values around "{label}" form a loop that no register closes, so that their length has '
                    f"no end. State a word for the accumulator, or put a round into the loop."
                )
            pending.add(top)
            stack.extend(missing)
        return self._known[goal]

    def _needs(self, goal: tuple[str, int]) -> list[tuple[str, int]]:
        kind, index = goal
        node = self.diagram.nodes[index]
        if kind == "seen":
            if self.roles.register[index] or isinstance(node, Input | Round):
                return []
            if isinstance(node, Delay):
                return [("seen", node.source)]
            return [("raw", node.source if isinstance(node, Residue) else index)]
        if isinstance(node, Sum | Taps):
            return self._needs_of_sum(index)
        if isinstance(node, Gain):
            return [("seen", node.source)] if self.roles.whole[node.source] else []
        return [("seen", node.reads[0])]

    def _compute(self, goal: tuple[str, int]) -> int:
        kind, index = goal
        node = self.diagram.nodes[index]
        if kind == "seen":
            if self.roles.register[index] or isinstance(node, Input | Round):
                return self.word(index).fraction
            if isinstance(node, Delay):
                return self._known["seen", node.source]
            return self._known["raw", node.source if isinstance(node, Residue) else index]
        if isinstance(node, Sum | Taps):
            return self._fraction_of_sum(index)
        if isinstance(node, Gain):
            return self.product(node)
        assert isinstance(node, Shift | Round), "a fraction was asked of what has none"
        return self._known["seen", node.source] + (max(0, -node.k) if isinstance(node, Shift) else 0)

    # sums joined without a register

    @cached_property
    def _clusters(self) -> dict[int, list[int]]:
        """For each sum or tapped line, all that share its accumulator, in order of creation."""
        nodes = self.diagram.nodes
        parent = {i: i for i, node in enumerate(nodes) if isinstance(node, Sum | Taps) and not self.roles.pre_sum[i]}

        def find(i: int) -> int:
            while parent[i] != i:
                parent[i] = parent[parent[i]]
                i = parent[i]
            return i

        for index in parent:
            for source in nodes[index].reads if isinstance(nodes[index], Sum) else ():
                base, _ = self.base(source)
                if self.joins(base):
                    parent[find(base)] = find(index)
        groups: dict[int, list[int]] = {}
        for index in parent:
            groups.setdefault(find(index), []).append(index)
        return {index: group for group in groups.values() for index in group}

    def joins(self, index: int) -> bool:
        """Whether a node is a sum that stays in the accumulator of the sum that reads it."""
        return (
            isinstance(self.diagram.nodes[index], Sum | Taps)
            and not self.roles.register[index]
            and not self.roles.pre_sum[index]
        )

    @cached_property
    def _extra(self) -> dict[int, int]:
        """For each sum, the shifts right that its value meets before it leaves the accumulator."""
        extra: dict[int, int] = {}
        for index in reversed(self.diagram.order):
            node = self.diagram.nodes[index]
            if not isinstance(node, Sum) or self.roles.pre_sum[index]:
                continue
            for term in node.terms:
                base, shift = self.base(term.source)
                if self.joins(base):
                    extra[base] = max(extra.get(base, 0), extra.get(index, 0) + max(0, -shift))
        return extra

    def _needs_of_sum(self, index: int) -> list[tuple[str, int]]:
        if self.roles.pre_sum[index]:
            return [("seen", self.base(s)[0]) for s in self.diagram.nodes[index].reads]
        if self.format.accumulator.word is not None:
            return []
        leaves = self._leaves(index)
        chosen = [leaf for leaf in leaves if not self._residual(leaf[0])] or leaves
        lines = [
            node.source for member in self._clusters[index] if isinstance(node := self.diagram.nodes[member], Taps)
        ]
        return [("raw" if self.is_product(base) else "seen", base) for base, _ in chosen] + [
            ("seen", source) for source in lines if self.roles.whole[source]
        ]

    def is_product(self, index: int) -> bool:
        """Whether a node is a product that enters an accumulator as one, and no register."""
        return isinstance(self.diagram.nodes[index], Gain) and not self.roles.register[index]

    def _leaves(self, index: int) -> list[tuple[int, int]]:
        """What enters the accumulator of a sum from outside, with the shifts right that it meets."""
        found = []
        for member in self._clusters[index]:
            node, extra = self.diagram.nodes[member], self._extra.get(member, 0)
            if isinstance(node, Sum):
                for term in node.terms:
                    base, shift = self.base(term.source)
                    if not self.joins(base):
                        found.append((base, extra + max(0, -shift)))
        return found

    def _residual(self, index: int) -> bool:
        node = self.diagram.nodes[index]
        return self.roles.residual[node.source if isinstance(node, Gain) else index]

    def _fraction_of_sum(self, index: int) -> int:
        rule = self.format.accumulator
        if self.roles.pre_sum[index]:
            node = self.diagram.nodes[index]
            bases = [self.base(source) for source in node.reads]
            return max(self._known["seen", base] + max(0, -shift) for base, shift in bases)
        if rule.word is not None:
            return rule.word.fraction
        products, others = self._entering(index)
        if rule.full:
            kept = self.format.product.fraction
            limited = [fraction if kept is None else min(fraction, kept) for fraction, _ in products]
            return max([fraction + extra for fraction, (_, extra) in zip(limited, products, strict=True)] + others)
        assert rule.bits is not None, "an accumulator is full, a word or so many bits"
        exact = [fraction + extra for fraction, extra in products]
        fraction = max(exact or others) - rule.drop
        if rule.bits - fraction < 1:
            raise FormatError(
                f"An accumulator of {rule.bits} bits has no room for {fraction} fraction bits and a sign, which "
                f"the products of this filter need. Give it more bits, a larger drop, or shorter coefficients."
            )
        return fraction

    def _entering(self, index: int) -> tuple[list[tuple[int, int]], list[int]]:
        """(fraction, extra) of the products and fraction of the other terms; residues only where nothing else enters."""
        leaves = self._leaves(index)
        chosen = [leaf for leaf in leaves if not self._residual(leaf[0])] or leaves
        products, others = self._tap_products(index), []
        for base, extra in chosen:
            if self.is_product(base):
                products.append((self._known["raw", base], extra))
            else:
                others.append(self._known["seen", base] + extra)
        return products, others

    def _tap_products(self, index: int) -> list[tuple[int, int]]:
        return [
            (self.operand(node.source).fraction + self.coefficient_words[slot].fraction, self._extra.get(member, 0))
            for member in self._clusters[index]
            if isinstance(node := self.diagram.nodes[member], Taps)
            for slot in node.coefficients
        ]


def growth(terms: list[tuple[int, Word, int]]) -> int:
    """Integer bits that the exact sum of (sign, word, shift) terms needs beyond the longest term's."""
    fraction = max(word.fraction + max(0, -shift) for _, word, shift in terms)
    low = high = 0
    for sign, word, shift in terms:
        scale = fraction - word.fraction + shift
        ends = (sign * (word.low << scale), sign * (word.high << scale))
        low, high = low + min(ends), high + max(ends)
    longest = max(word.integer + shift for _, word, shift in terms)
    bits = max((-low - 1).bit_length(), high.bit_length()) + 1
    return max(0, bits - fraction - longest)
