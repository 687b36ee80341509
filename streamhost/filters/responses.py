"""Which band passes or stops: the words, and how many edges each has."""

from streamhost.filters.kind import Values
from streamhost.filters.parameters import Edges, Parameter, Word

RESPONSES = ("low-pass", "high-pass", "band-pass", "band-stop")
BANDS = ("band-pass", "band-stop")

RESPONSE = Parameter("response", "", "which band passes or stops", Word(RESPONSES))
EDGES = Parameter("frequency", "Hz", "edge of the pass-band, or two for a band", Edges())


def edge_conflicts(values: Values, name: str = "frequency") -> list[str]:
    """What is wrong with the number of edges that the parameter `name` gives for the response."""
    response, frequency = values["response"], values[name]
    wanted = 2 if response in BANDS else 1
    found = len(frequency) if isinstance(frequency, tuple) else 1
    if found == wanted:
        return []
    return [f"{name} gives {found} edge{'s' * (found > 1)}, and a {response} has {wanted}"]
