"""Places for the symbols of a diagram whose maker said none: layers from left to right, feedback turned round.

The steps are those of layered drawing (Sugiyama, Tagawa and Toda, 1981): chains.py decides what runs forwards, layers.py
gives every symbol its column, order.py the order within a column, heights.py its row.
"""

from streamhost.drawing.placer.placing import placed

__all__ = ["placed"]
