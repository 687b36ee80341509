"""The wheel carries what the program ships, and an installed copy finds it."""

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from streamhost import shipped

ROOT = Path(__file__).resolve().parent.parent
# folder in the repository -> folder in the wheel
CARRIED = {"presets": "streamhost/presets_shipped", "audio_samples": "streamhost/audio_samples"}


def run(*command: str, **options: object) -> str:
    done = subprocess.run([sys.executable, *command], capture_output=True, text=True, **options)  # type: ignore[call-overload]
    assert done.returncode == 0, done.stdout + done.stderr
    return str(done.stdout)


def files_below(folder: Path) -> set[str]:
    found = (path.relative_to(folder) for path in folder.rglob("*") if path.is_file())
    return {path.as_posix() for path in found if "__pycache__" not in path.parts}


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    run("-m", "build", "--wheel", "--no-isolation", "--outdir", str(folder), str(ROOT))
    (built,) = folder.glob("*.whl")
    return built


def test_wheel_carries_presets_samples_and_the_mark_of_types(wheel: Path) -> None:
    names = set(zipfile.ZipFile(wheel).namelist())
    assert "streamhost/py.typed" in names
    for source, target in CARRIED.items():
        inside = {name.removeprefix(f"{target}/") for name in names if name.startswith(f"{target}/")}
        assert inside == files_below(ROOT / source)
    assert any(name.endswith(".toml") for name in names)
    assert any(name.endswith(".wav") for name in names)


def test_wheel_carries_the_package_and_nothing_else(wheel: Path) -> None:
    names = set(zipfile.ZipFile(wheel).namelist())
    package = {name for name in names if not name.startswith((*CARRIED.values(), "streamhost-"))}
    assert package == {f"streamhost/{name}" for name in files_below(ROOT / "streamhost")}


def test_an_installed_copy_finds_what_it_ships(wheel: Path, tmp_path: Path) -> None:
    target = tmp_path / "installed"
    run("-m", "pip", "install", "--quiet", "--no-deps", "--no-index", "--target", str(target), str(wheel))
    code = (
        f"import sys; sys.path.insert(0, {str(target)!r}); from streamhost import shipped; "
        "print(shipped.folder('preset'), shipped.folder('sample'), sep='\\n')"
    )
    presets, samples = run("-c", code, cwd=tmp_path).splitlines()
    assert Path(presets) == target / "streamhost" / "presets_shipped"
    assert Path(samples) == target / "streamhost" / "audio_samples"
    assert files_below(Path(presets)) >= files_below(ROOT / "presets")
    assert files_below(Path(samples)) >= files_below(ROOT / "audio_samples")


def test_a_checkout_finds_what_it_ships() -> None:
    assert shipped.folder("preset") == ROOT / "presets"
    assert shipped.folder("sample") == ROOT / "audio_samples"
