"""Folders and archives: what is found in them, and that hostile ones are refused with the limit named, nothing written, in bounded time."""

from __future__ import annotations

import io
import os
import stat
import struct
import zipfile

import pytest

from impcheck.artwork.limits import Limits
from impcheck.artwork.package import open_package
from impcheck.errors import InputError


def zipped(tmp_path, members, name="fab.zip"):
    path = tmp_path / name
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for member, content in members:
            archive.writestr(member, content)
    return path


def problems(path, limits=None):
    with pytest.raises(InputError) as refused:
        open_package(path, path.name, limits or Limits()).read("a.gbr")
    return [str(problem) for problem in refused.value.problems]


def test_a_folder(tmp_path):
    (tmp_path / "sub").mkdir()
    (tmp_path / "sub" / "b.gbr").write_bytes(b"bottom")
    for name in ("a.gbr", ".hidden", ".DS_Store", "Thumbs.db"):
        (tmp_path / name).write_bytes(b"top")
    package = open_package(tmp_path, "fab")
    assert package.names == ("a.gbr", "sub/b.gbr")
    assert package.read("sub/b.gbr") == b"bottom"
    assert package.head("a.gbr", 2) == b"to"
    assert open_package(tmp_path, "fab", deep=False).names == ("a.gbr",)


def test_a_zip_reads_like_a_folder(tmp_path):
    path = zipped(
        tmp_path, [("out/a.gbr", "top"), ("out/__MACOSX/._a.gbr", "x"), ("out/.DS_Store", "x"), ("empty/", ""), ("out\\b.gbr", "bottom")]
    )
    package = open_package(path, "fab.zip")
    assert package.names == ("out/a.gbr", "out/b.gbr")
    assert package.read("out/a.gbr") == b"top"
    assert package.read("out/b.gbr") == b"bottom"
    assert package.head("out/b.gbr", 3) == b"bot"
    package.close()
    assert sorted(p.name for p in tmp_path.iterdir()) == ["fab.zip"]


def test_finding_a_file_a_person_names(tmp_path):
    path = zipped(tmp_path, [("out/Top.GTL", "t"), ("out/x.gbr", "1"), ("other/x.gbr", "2")])
    package = open_package(path, "fab.zip")
    assert (
        package.find("out/Top.GTL") == package.find("Top.GTL") == package.find("top.gtl") == package.find("./OUT/top.gtl") == "out/Top.GTL"
    )
    assert package.find("x.gbr") is None  # two of them: the folder has to be named
    assert package.find("other\\x.gbr") == "other/x.gbr"
    assert package.like("Top.GBL") == "did you mean 'Top.GTL'?"


def test_an_archive_inside_is_told(tmp_path):
    package = open_package(zipped(tmp_path, [("a.gbr", "t"), ("old/fab.zip", "PK")]), "fab.zip")
    assert [str(remark) for remark in package.remarks] == ["old/fab.zip: an archive among the fabrication files; it was not opened"]


@pytest.mark.parametrize("member", ["../a.gbr", "x/../../a.gbr", "/etc/a.gbr", "C:/a.gbr", "..\\a.gbr", "\\\\host\\a.gbr"])
def test_paths_that_lead_out(tmp_path, member):
    found = problems(zipped(tmp_path, [(member, "t"), ("b.gbr", "t")]))
    assert found == [f"fab.zip: the member '{member}' has a path that leads out of the archive (pack the files with plain names)"]


def test_a_link_in_an_archive(tmp_path):
    link = zipfile.ZipInfo("a.gbr")
    link.create_system = 3
    link.external_attr = (stat.S_IFLNK | 0o777) << 16
    assert problems(zipped(tmp_path, [(link, "/etc/passwd")])) == ["fab.zip: the member 'a.gbr' is a link (pack the file itself)"]


def test_a_link_out_of_a_folder(tmp_path):
    folder = tmp_path / "fab"
    folder.mkdir()
    (tmp_path / "secret").write_text("s")
    (folder / "a.gbr").symlink_to(tmp_path / "secret")
    (folder / "b.gbr").symlink_to(tmp_path / "nowhere")
    (folder / "loop").symlink_to(folder)
    (folder / "real.gbr").write_text("r")
    (folder / "same.gbr").symlink_to(folder / "real.gbr")
    assert problems(folder) == [
        "fab: 'a.gbr' is a link that leads out of the folder (put the file itself there)",
        "fab: 'b.gbr' is a link that leads out of the folder (put the file itself there)",
    ]
    (folder / "a.gbr").unlink()
    (folder / "b.gbr").unlink()
    assert open_package(folder, "fab").names == ("real.gbr", "same.gbr")


def test_a_pipe_in_a_folder_is_no_file(tmp_path):
    os.mkfifo(tmp_path / "a.gbr")
    assert open_package(tmp_path, "fab").names == ()


def test_a_bomb(tmp_path):
    found = problems(zipped(tmp_path, [("a.gbr", b"0" * 20_000_000)]))
    assert len(found) == 1
    assert "the member 'a.gbr' unpacks to" in found[0]
    assert "limit compression_ratio = 200" in found[0]


def test_limits_are_named(tmp_path):
    path = zipped(tmp_path, [("a.gbr", os.urandom(3000)), ("b.gbr", os.urandom(3000))])
    assert problems(path, Limits(package_bytes=5000)) == ["fab.zip: the archive holds 6,000 bytes unpacked (limit package_bytes = 5,000)"]
    assert problems(path, Limits(package_files=1)) == ["fab.zip: the archive holds 2 files (limit package_files = 1)"]
    assert problems(path, Limits(file_bytes=2000)) == ["a.gbr: the file has 3,000 bytes (limit file_bytes = 2,000)"]
    folder = tmp_path / "many"
    folder.mkdir()
    for index in range(5):
        (folder / f"{index}.gbr").touch()
    assert problems(folder, Limits(package_files=3)) == ["many: the folder holds more than 3 files (limit package_files = 3)"]


def test_an_encrypted_member(tmp_path):
    path = zipped(tmp_path, [("a.gbr", "t")])
    data = bytearray(path.read_bytes())
    for mark, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):  # general purpose flag, bit 0 (APPNOTE 4.4.4)
        data[data.index(mark) + offset] |= 1
    path.write_bytes(data)
    assert problems(path) == ["fab.zip: the member 'a.gbr' is encrypted (pack the files without a password)"]


def test_a_size_that_lies(tmp_path):
    path = zipped(tmp_path, [("a.gbr", os.urandom(5000))])
    data = bytearray(path.read_bytes())
    struct.pack_into("<I", data, data.index(b"PK\x01\x02") + 24, 100)  # uncompressed size in the central directory (APPNOTE 4.3.12)
    path.write_bytes(data)
    assert "a.gbr: the file cannot be read" in problems(path)[0]


def test_broken_archives(tmp_path):
    good = zipped(tmp_path, [("a.gbr", os.urandom(500))]).read_bytes()
    for spoilt in (b"", b"no zip at all", good[:100], good[:-30], b"PK\x05\x06" + b"\xff" * 18):
        path = tmp_path / "bad.zip"
        path.write_bytes(spoilt)
        found = problems(path)
        assert len(found) == 1
        assert found[0].startswith("bad.zip: ")
    data = bytearray(good)
    data[60:70] = b"0123456789"
    (tmp_path / "crc.zip").write_bytes(data)
    assert "a.gbr: the file cannot be read" in problems(tmp_path / "crc.zip")[0]


def test_a_directory_without_end_is_not_loaded(tmp_path):
    data = io.BytesIO()
    with zipfile.ZipFile(data, "w") as archive:
        for index in range(3000):
            archive.writestr(f"{index:04d}" + "x" * 200, "")
    path = tmp_path / "long.zip"
    path.write_bytes(data.getvalue())
    assert problems(path, Limits(package_files=10)) == ["long.zip: the archive's list of files is too long (limit package_files = 10)"]


def test_a_member_twice(tmp_path):
    with pytest.warns(UserWarning, match="Duplicate name"):
        path = zipped(tmp_path, [("a.gbr", "1"), ("a.gbr", "2")])
    assert problems(path) == ["fab.zip: the archive holds two members 'a.gbr' (pack each file once)"]


def test_another_kind_of_archive(tmp_path):
    (tmp_path / "fab.tar.gz").write_bytes(b"\x1f\x8b" + b"x" * 100)
    assert "only folders and .zip are read" in problems(tmp_path / "fab.tar.gz")[0]
