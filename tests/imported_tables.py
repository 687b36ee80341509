"""What the tests of import share: a table in two sections, and fixtures that import a file and take down a refusal."""

import pytest

from streamhost.errors import RequestError
from streamhost.filters import Filter
from streamhost.presets.importing import import_filter

RATE = 48000.0
# The poles of the first have the radius 0.95: its feedback is stable subtracted only, and decides for both.
ROWS = [[0.5, 1.0, 0.5, 1.0, -1.8, 0.9025], [1.0, -2.0, 1.0, 1.0, 0.1, 0.2]]
SECTIONS = Filter.from_sections(ROWS, rate=RATE)


@pytest.fixture
def imported(tmp_path):
    """Imports what a file with this content states."""

    def take(content, **asked):
        file = tmp_path / "table"
        file.write_bytes(content if isinstance(content, bytes) else content.encode())
        return import_filter(file, rate=RATE, **asked)

    return take


@pytest.fixture
def refusal(imported, tmp_path):
    """What is said of a file that is refused, without the name of the file, which begins it."""

    def take(content, **asked):
        with pytest.raises(RequestError) as caught:
            imported(content, **asked)
        name, text = f"{tmp_path / 'table'}: ", str(caught.value)
        assert text.startswith(name)
        assert text.isprintable()
        return text.removeprefix(name)

    return take
