"""transposed-1: direct-1 with every arrow turned round.

    v[n]  = x[n] + s1[n-1]
    sk[n] = -ak v[n] + s(k+1)[n-1],   k = 1 ... N, no s beyond sN
    y[n]  = b0 v[n] + t1[n-1]
    tk[n] = bk v[n] + t(k+1)[n-1],    k = 1 ... M, no t beyond tM

drawn for a second-order section:

    x --->(+)------------v---+---b0--->(+)---> y
           ^                 |          ^
          z^-1               |         z^-1
           |                 |          |
       s1 (+)<---- -a1 ------+---b1--->(+) t1
           ^                 |          ^
          z^-1               |         z^-1
           |                 |          |
       s2  +------ -a2 ------+---b2-----+  t2

Nodes are evaluated in the order v, s1, s2, ..., y, t1, t2, ...; each sum as it is written above. The delay of sk is
labelled dsk, that of tk dtk.

Source: Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 6, transposition of direct form I.

Counts: M + N + 1 multiplications, M + N additions, M + N words of memory; a second-order section 5, 4, 4. In fixed
point five roundings a section (s1, s2, t1, t2 and y); v is an exact sum of what is stored. A gain in front (scaling
l2) makes v of the first section a sum with a product, which is rounded too.

Good at: comparison with transposed-2. The zeros work on v with a delay line of their own, so no product of one half
waits for the other.

Fails: v is the input through 1 / A, as w is in direct-2, and clips where it is multiplied: scale it (scaling l2) or
give the signal more integer bits. A second-order section has five roundings, where direct-1 has one, and four words of
memory, where transposed-2 has two.

Arithmetic: floating point. In fixed point every stored sum is rounded, and the pre-sum v needs a longer operand.

Carries: any numerator and denominator of any length, as a section or whole. Without recursion v is x itself.
"""

from streamhost.diagram.builder import Ref, Signed
from streamhost.structures.form import Draft, Form

PITCH = 1.25


def build_section(draft: Draft, x: Ref) -> Ref:
    if draft.lies:
        return draft.sums_in_rows("dt", "t", x)
    b, a = draft.section.b, draft.section.a
    ds = draft.separate("ds", len(a) - 1, column=0, pitch=PITCH)
    dt = draft.separate("dt", len(b) - 1, column=3.5, pitch=PITCH)
    v = draft.add("v", [x, *ds[:1]], at=(0, 0))
    draft.trunk(v, (1.75, 0), (1.75, PITCH * (max(len(a), len(b)) - 1)))
    for k in range(1, len(a)):
        s: list[Ref | Signed] = [draft.a(k, v, at=(0.875, k * PITCH)), *ds[k : k + 1]]
        ds[k - 1].takes(draft.add(f"s{k}", s, at=(0, k * PITCH), face="N"))
    y = draft.add("y", [draft.b(0, v, at=(2.625, 0)), *dt[:1]], at=(3.5, 0))
    for k in range(1, len(b)):
        t = [draft.b(k, v, at=(2.625, k * PITCH)), *dt[k : k + 1]]
        dt[k - 1].takes(draft.add(f"t{k}", t, at=(3.5, k * PITCH), face="N"))
    return y


FORM = Form(
    name="transposed-1",
    summary="direct-1 with every arrow turned round: sums are stored instead of signals",
    begins_with="recursion",
    build_section=build_section,
    docs=__doc__,
    width=3.5,
    pitch=PITCH,
)
