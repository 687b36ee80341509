"""The host on a sound card: an engine process that holds the stream and the kernels, and the `Card` that watches over it.

The parent prepares and compiles; the engine takes machine code from the kernel cache by its text and compiles nothing.
Commands go through a pipe, settings and meters through memory that both map, which holds no addresses.
"""

from streamhost.live.card import Card
from streamhost.live.portaudio import Wanted
from streamhost.live.recipe import Input, LaneAsked, Planned, Recipe

__all__ = ["Card", "Input", "LaneAsked", "Planned", "Recipe", "Wanted"]
