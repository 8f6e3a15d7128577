"""Real boards for tests, fetched by package name. In: a name from SOURCES; out: the folder they were unpacked into, or None and why.

Nothing of it is committed: it lands in the ignored folder .cache/open-data, once. Run as a program it fetches all of it (CI does).

- tracespace: npm package @tracespace/fixtures (MIT; each board names its own licence), eight two-layer boards and single-feature files.
- pygerber: wheel pygerber 2.4.3 (MIT), a two-layer example with nets in X2 attributes, and examples of the Gerber specification.
- gerbv: Debian package gerbv (GPL-2; only its example data are unpacked and read), many old files, and a set of malformed ones.
"""

from __future__ import annotations

import functools
import shutil
import subprocess
import sys
import tarfile
import tempfile
import zipfile
from collections.abc import Callable
from pathlib import Path

CACHE = Path(__file__).resolve().parent.parent / ".cache" / "open-data"
_SECONDS = 120


def _run(*command: str, folder: Path) -> None:
    subprocess.run(command, cwd=folder, check=True, capture_output=True, timeout=_SECONDS)


def _npm(folder: Path) -> None:
    _run("npm", "pack", "@tracespace/fixtures@4.2.7", folder=folder)
    with tarfile.open(next(folder.glob("*.tgz"))) as archive:
        archive.extractall(folder, filter="data")


def _pip(folder: Path) -> None:
    _run(sys.executable, "-m", "pip", "download", "--quiet", "--no-deps", "pygerber==2.4.3", folder=folder)
    with zipfile.ZipFile(next(folder.glob("*.whl"))) as archive:
        archive.extractall(folder, [name for name in archive.namelist() if "/examples/" in name])


def _apt(folder: Path) -> None:
    _run("apt-get", "download", "gerbv", folder=folder)
    _run("dpkg-deb", "-x", next(folder.glob("*.deb")).name, "unpacked", folder=folder)
    (folder / "unpacked/usr/share/doc/gerbv/examples").rename(folder / "examples")
    shutil.rmtree(folder / "unpacked")


SOURCES: dict[str, Callable[[Path], None]] = {"tracespace": _npm, "pygerber": _pip, "gerbv": _apt}
reasons: dict[str, str] = {}


@functools.cache
def fetch(name: str) -> Path | None:
    """The folder with the unpacked package; None where it cannot be had, `reasons[name]` then says why."""
    target = CACHE / name
    if target.is_dir():
        return target
    CACHE.mkdir(parents=True, exist_ok=True)
    folder = Path(tempfile.mkdtemp(dir=CACHE))
    try:
        SOURCES[name](folder)
        for archive in (*folder.glob("*.tgz"), *folder.glob("*.whl"), *folder.glob("*.deb")):
            archive.unlink()
        folder.chmod(0o755)
        # Another test process may have been faster; then its copy is as good.
        try:
            folder.rename(target)
        except OSError:
            if not target.is_dir():
                raise
    except (OSError, subprocess.SubprocessError, StopIteration, tarfile.TarError, zipfile.BadZipFile) as error:
        detail = getattr(error, "stderr", b"") or b""
        reasons[name] = f"open data '{name}' is not there: {error} {detail.decode(errors='replace').strip()[-200:]}".strip()
        return None
    finally:
        shutil.rmtree(folder, ignore_errors=True)
    return target


if __name__ == "__main__":
    for wanted in SOURCES:
        print(fetch(wanted) or reasons[wanted])
