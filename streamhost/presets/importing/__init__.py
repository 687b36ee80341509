"""Coefficients from foreign files: read by what they hold, decided in the open, never by running anything.

`content` finds out which reader a file needs (`text`, `c_source`, `json_text`, `npz`); a reader gives what is `stated`;
`columns`, `codes` and `feedback` decide what the file leaves open, each with a note of what was decided and why.
"""

from streamhost.presets.importing.feedback import FEEDBACKS
from streamhost.presets.importing.importer import Imported, import_filter

__all__ = ["FEEDBACKS", "Imported", "import_filter"]
