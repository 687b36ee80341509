"""The control page of a running host: served on this machine only, to whoever has its key.

`sitting.py` says what a page needs of a host; nothing here knows whether a clock or a sound card drives it.
"""

from streamhost.page.on_clock import ClockSitting
from streamhost.page.serving import Page
from streamhost.page.sitting import Sitting

__all__ = ["ClockSitting", "Page", "Sitting"]
