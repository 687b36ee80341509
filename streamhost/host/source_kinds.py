"""The kinds of source, by number, as the compiled step and Python both know them."""

KINDS = ("device", "silence", "loop", "sine", "sweep", "white", "pink", "impulses", "dc", "tones")
NUMBERS = {kind: number for number, kind in enumerate(KINDS)}
