"""A difference equation as text: y[n] = 0.5 x[n] + 0.5 x[n-1] + 0.9 y[n-1].

    equation := sum "=" sum
    sum      := signs term { sign signs term }
    term     := factor { ("*" | "/") signs factor | signal | group }
    factor   := number | signal | group
    signal   := ("x" | "y") ("[" time "]" | "(" time ")")
    time     := "n" [ "-" whole number ]
    group    := "(" sum ")"

Terms stand on either side. A number is a decimal, with or without exponent; 1/3 is a quotient of two. Products and
quotients are taken from left to right, so that 1/3 x[n] is a third of x[n]. Line breaks are blanks; what follows # on
a line is a comment. Everything is exact until the coefficients are divided by that of y[n].
"""

from streamhost.filters.equation.grammar import coefficients

__all__ = ["coefficients"]
