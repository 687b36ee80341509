"""The host on a sound card: an engine process that holds the stream and the kernels, and the card that watches over it.

The parent prepares and compiles; the engine takes machine code from the kernel cache by its text and compiles nothing.
Commands go through a pipe, settings and meters through memory that both map, which holds no addresses.

`card.py` is what its users hold; `controls.py` what an engineer does with it; `start.py`, `engine.py` run in the engine.
"""
