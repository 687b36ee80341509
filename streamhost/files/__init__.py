"""Audio files in and out, and the one way by which any file of ours reaches the disk.

Reading refuses what is not whole: every container accepted here states how much audio it holds, and that is compared
with what is there. Writing is all or nothing. `soundfile` is loaded on first use.
"""

from streamhost.files.atomic import same_file, write_bytes_atomic, write_text_atomic
from streamhost.files.codes import quantize
from streamhost.files.probing import AudioInfo, probe
from streamhost.files.reading import read_all, read_blocks
from streamhost.files.writing import AudioWriter, choose_container

__all__ = [
    "AudioInfo",
    "AudioWriter",
    "choose_container",
    "probe",
    "quantize",
    "read_all",
    "read_blocks",
    "same_file",
    "write_bytes_atomic",
    "write_text_atomic",
]
