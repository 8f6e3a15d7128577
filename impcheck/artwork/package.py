"""The files of a board as sent to a fab. In: a folder or a zip archive; out: their names and, when asked for, bytes. Nothing is written."""

from __future__ import annotations

import io
import os
import re
import stat
import struct
import zipfile
import zlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from impcheck.artwork.limits import Limits
from impcheck.artwork.names import did_you_mean
from impcheck.errors import InputError, Problem, Problems, Remark, RemarkKind

_DEFAULTS = Limits()
_SYSTEM = ("__macosx", "thumbs.db", "desktop.ini")
_ARCHIVES = (".zip", ".rar", ".7z", ".tar", ".gz", ".tgz", ".bz2", ".xz")


@dataclass(frozen=True)
class Package:
    """The files of a folder or an archive by their path in it, with `/` between folders, without hidden files and those of a system."""

    source: Path
    shown: str  # the folder or archive as shown to the user
    sizes: Mapping[str, int]  # path in the package -> bytes, unpacked, as stated
    limits: Limits
    archive: zipfile.ZipFile | None = None
    members: Mapping[str, zipfile.ZipInfo] = field(default_factory=dict)
    remarks: tuple[Remark, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        """Paths of all files, sorted."""
        return tuple(sorted(self.sizes))

    def read(self, name: str) -> bytes:
        """A file's bytes. Raises InputError where it is too large or cannot be read."""
        if self.sizes[name] > self.limits.file_bytes:
            raise InputError(Problem(name, 0, f"the file has {self.sizes[name]:,} bytes", f"limit file_bytes = {self.limits.file_bytes:,}"))
        return self._bytes(name, self.limits.file_bytes + 1)

    def head(self, name: str, size: int) -> bytes:
        """The first bytes of a file. Raises InputError where it cannot be read."""
        return self._bytes(name, size)

    def find(self, name: str) -> str | None:
        """The path of the file a person means: the path itself, else the one file of that name in any folder, else that but for case."""
        wanted = name.replace("\\", "/").removeprefix("./")
        if wanted in self.sizes:
            return wanted
        for same in (str, str.casefold):
            found = [path for path in self.names if same(path) == same(wanted) or same(path.rsplit("/", 1)[-1]) == same(wanted)]
            if len(found) == 1:
                return found[0]
        return None

    def like(self, name: str) -> str:
        """A remedy for a file that is not there."""
        return did_you_mean(name.rsplit("/", 1)[-1], (path.rsplit("/", 1)[-1] for path in self.names), f"'{self.shown}' holds no files")

    def close(self) -> None:
        """Closes the archive."""
        if self.archive is not None:
            self.archive.close()

    def _bytes(self, name: str, size: int) -> bytes:
        try:
            if self.archive is not None:
                with self.archive.open(self.members[name]) as file:
                    return file.read(size)
            with (self.source / name).open("rb") as file:
                return file.read(size)
        except (zipfile.BadZipFile, zlib.error, EOFError, NotImplementedError, RuntimeError, OSError, ValueError) as error:
            said = getattr(error, "strerror", None) or str(error) or type(error).__name__
            raise InputError(Problem(name, 0, f"the file cannot be read: {said}", "pack or copy the files again")) from None


def open_package(source: Path, shown: str, limits: Limits = _DEFAULTS, deep: bool = True) -> Package:
    """The files of a folder (with its subfolders where `deep`) or of a zip archive.

    `shown` is how the folder or archive is called in errors. Raises InputError with every reason not to read it: a path that leads out, a
    link, an encrypted member, more files or bytes than the limits allow, a member that is packed beyond belief.
    """
    if source.is_dir():
        return _folder(source, shown, limits, deep)
    if not source.is_file():
        raise InputError(Problem(shown, 0, "this is neither a folder nor a file", "name a folder or a .zip"))
    return _zip(source, shown, limits)


def hidden(path: str) -> bool:
    """True for files no fab reads: hidden ones and those an operating system leaves."""
    return any(part.startswith(".") or part.casefold() in _SYSTEM for part in path.split("/"))


def _folder(source: Path, shown: str, limits: Limits, deep: bool) -> Package:
    problems = Problems()
    sizes: dict[str, int] = {}
    waiting = [source]
    while waiting:
        folder = waiting.pop()
        try:
            entries = sorted(os.scandir(folder), key=lambda entry: entry.name)
        except OSError as error:
            problems.add(shown, 0, f"the folder '{folder.name}' cannot be read: {error.strerror}")
            continue
        for entry in entries:
            path = Path(entry.path).relative_to(source).as_posix()
            if hidden(path):
                continue
            if entry.is_symlink() and not _inside(Path(entry.path), source):
                if deep:
                    problems.add(shown, 0, f"'{path}' is a link that leads out of the folder", "put the file itself there")
            elif entry.is_dir():
                if deep and not entry.is_symlink():
                    waiting.append(Path(entry.path))
            elif entry.is_file():
                sizes[path] = entry.stat().st_size
            if len(sizes) > limits.package_files or len(waiting) > limits.package_files:
                said = f"the folder holds more than {limits.package_files:,} files"
                problems.add(shown, 0, said, f"limit package_files = {limits.package_files:,}")
                problems.raise_if_any()
    problems.raise_if_any()
    return Package(source, shown, sizes, limits, remarks=_nested(sizes))


def _inside(link: Path, folder: Path) -> bool:
    """True where a link leads to a regular file or folder below `folder`."""
    try:
        target = link.resolve(strict=True)
    except (OSError, RuntimeError):
        return False
    return target.is_relative_to(folder.resolve())


def _zip(source: Path, shown: str, limits: Limits) -> Package:
    try:
        with source.open("rb") as file:
            directory = _directory_bytes(file.seek(0, io.SEEK_END), file)
        if directory > limits.package_files * 4096:
            remedy = f"limit package_files = {limits.package_files:,}"
            raise InputError(Problem(shown, 0, "the archive's list of files is too long", remedy))
        archive = zipfile.ZipFile(source)
    except (zipfile.BadZipFile, OSError, ValueError, NotImplementedError, struct.error) as error:
        remedy = "only folders and .zip are read; unpack other archives" if source.suffix.lower() != ".zip" else "pack the files again"
        raise InputError(Problem(shown, 0, f"this is no zip archive: {error}", remedy)) from None
    problems = Problems()
    members: dict[str, zipfile.ZipInfo] = {}
    infos = archive.infolist()
    if len(infos) > limits.package_files:
        problems.add(shown, 0, f"the archive holds {len(infos):,} files", f"limit package_files = {limits.package_files:,}")
    total = sum(info.file_size for info in infos)
    if total > limits.package_bytes:
        problems.add(shown, 0, f"the archive holds {total:,} bytes unpacked", f"limit package_bytes = {limits.package_bytes:,}")
    for info in infos[: limits.package_files]:
        path = info.filename.replace("\\", "/")
        if _leads_out(path):
            said = f"the member '{info.filename}' has a path that leads out of the archive"
            problems.add(shown, 0, said, "pack the files with plain names")
        elif stat.S_ISLNK(info.external_attr >> 16):
            problems.add(shown, 0, f"the member '{info.filename}' is a link", "pack the file itself")
        elif info.is_dir() or hidden(path):
            continue
        elif info.flag_bits & 0x1:
            problems.add(shown, 0, f"the member '{info.filename}' is encrypted", "pack the files without a password")
        elif info.file_size > 1_000_000 and info.file_size > limits.compression_ratio * max(info.compress_size, 1):
            said = f"the member '{info.filename}' unpacks to {info.file_size / max(info.compress_size, 1):,.0f} times its size"
            problems.add(shown, 0, said, f"limit compression_ratio = {limits.compression_ratio:,}")
        elif path in members:
            problems.add(shown, 0, f"the archive holds two members '{path}'", "pack each file once")
        else:
            members[path] = info
    if problems.found:
        archive.close()
    problems.raise_if_any()
    sizes = {path: info.file_size for path, info in members.items()}
    return Package(source, shown, sizes, limits, archive, members, _nested(sizes))


def _leads_out(path: str) -> bool:
    return path.startswith("/") or ".." in path.split("/") or re.match(r"[A-Za-z]:", path) is not None


def _nested(sizes: Mapping[str, int]) -> tuple[Remark, ...]:
    inside = sorted(path for path in sizes if path.lower().endswith(_ARCHIVES))
    return tuple(Remark(RemarkKind.ODD, "an archive among the fabrication files; it was not opened", path) for path in inside)


def _directory_bytes(size: int, file: io.BufferedReader) -> int:
    """The length of a zip's central directory, read before the library loads all of it. 0 where there is none: the library says so."""
    span = min(size, 65_557 + 20)
    file.seek(size - span)
    tail = file.read(span)
    at = tail.rfind(b"PK\x05\x06")
    if at < 0 or at + 22 > len(tail):
        return 0
    length = int(struct.unpack_from("<I", tail, at + 12)[0])
    if length == 0xFFFFFFFF and at >= 20 and tail[at - 20 : at - 16] == b"PK\x06\x07":  # Zip64: the record named by the locator
        file.seek(struct.unpack_from("<Q", tail, at - 12)[0])
        record = file.read(56)
        return int(struct.unpack_from("<Q", record, 40)[0]) if record[:4] == b"PK\x06\x06" and len(record) == 56 else 0
    return length
