"""From names to bytes: every dress, and everything that can be wrong with an input."""

from __future__ import annotations

import bz2
import gzip
import io
import lzma
import os
import struct
import zipfile
from pathlib import Path

import pytest
import zstandard
from hypothesis import given
from hypothesis import strategies as st

from backveer.io.readers.errors import Damaged, NotATable, NotFound, ReadError
from backveer.io.readers.files import Input, decompress, natural_order, open_inputs

# Numbers do not repeat like words do: what is packed stays longer than the packers' headers.
TEXT = "\n".join(f"{i * 7919 % 1000 / 10},{i * 104729 % 3600 / 10}" for i in range(900)).encode()

PACK = {
    "gzip": lambda data: gzip.compress(data, mtime=0),
    "bzip2": bz2.compress,
    "xz": lzma.compress,
    "zstandard": zstandard.ZstdCompressor().compress,
}


def zipped(**members: bytes) -> bytes:
    whole = io.BytesIO()
    with zipfile.ZipFile(whole, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in members.items():
            archive.writestr(name.replace("__", "/"), data)
    return whole.getvalue()


def all_of(*names: object, **settings: object) -> list[Input | ReadError]:
    return list(open_inputs([str(name) for name in names], **settings))  # type: ignore[arg-type]


def error_of(*names: object, **settings: object) -> ReadError:
    (error,) = all_of(*names, **settings)
    assert isinstance(error, ReadError), error
    assert error.source
    assert not error.problem.endswith(".")
    assert not error.remedy.endswith(".")
    assert "\n" not in str(error)
    return error


def test_a_plain_file_is_itself(tmp_path):
    path = tmp_path / "night.csv"
    path.write_bytes(TEXT)
    assert all_of(path) == [Input(str(path), TEXT)]


@pytest.mark.parametrize("kind", PACK)
@pytest.mark.parametrize("name", ["night.csv", "night.csv.gz"])
def test_compression_is_known_by_its_bytes(tmp_path, kind, name):
    path = tmp_path / name
    path.write_bytes(PACK[kind](TEXT))
    assert all_of(path) == [Input(str(path), TEXT)]


@pytest.mark.parametrize("kind", PACK)
def test_streams_one_after_the_other_are_one_input(kind):
    assert decompress("x", PACK[kind](TEXT) + PACK[kind](b"and more")) == TEXT + b"and more"


@pytest.mark.parametrize("kind", PACK)
def test_an_empty_stream_is_an_empty_input(kind):
    assert decompress("x", PACK[kind](b"")) == b""


@pytest.mark.parametrize("kind", PACK)
@pytest.mark.parametrize("share", [0.02, 0.3, 0.6, 0.95, 0.999])
def test_truncated_wherever(tmp_path, kind, share):
    packed = PACK[kind](TEXT)
    path = tmp_path / "night.csv.gz"
    path.write_bytes(packed[: max(8, int(len(packed) * share))])
    error = error_of(path)
    assert isinstance(error, Damaged)
    assert f"its {kind} compression ends too early, the file was cut off" in str(error)


@pytest.mark.parametrize("kind", PACK)
def test_corrupt_inside(tmp_path, kind):
    packed = bytearray(PACK[kind](TEXT))
    for place in range(len(packed) // 2, len(packed) // 2 + 16):
        packed[place] ^= 0xA5
    path = tmp_path / "night.csv.gz"
    path.write_bytes(packed)
    assert f"its {kind} compression" in str(error_of(path))


@pytest.mark.parametrize("kind", PACK)
def test_the_ceiling_holds_and_can_be_raised(tmp_path, kind):
    path = tmp_path / "bomb.gz"
    path.write_bytes(PACK[kind](bytes(3_000_000)))
    error = error_of(path, ceiling=2_999_999)
    assert isinstance(error, Damaged)
    assert "unfolds to more than the ceiling of 2,999,999 bytes" in str(error)
    assert all_of(path, ceiling=3_000_000) == [Input(str(path), bytes(3_000_000))]


def test_a_plain_file_has_no_ceiling(tmp_path):
    path = tmp_path / "plain.csv"
    path.write_bytes(TEXT)
    assert all_of(path, ceiling=10) == [Input(str(path), TEXT)]


def test_xz_may_not_ask_for_gigabytes_of_dictionary():
    packed = lzma.compress(
        TEXT, lzma.FORMAT_XZ, filters=[{"id": lzma.FILTER_LZMA2, "dict_size": 1 << 20}]
    )
    assert decompress("x", packed) == TEXT
    # Property byte of the block header: 0x28 stands for a dictionary of 4 GiB - 1 (xz format 1.0.4,
    # section 5.3.1); the header's CRC32 follows.
    import zlib

    size = (packed[12] + 1) * 4
    header = bytearray(packed[12 : 12 + size])
    header[4] = 0x28
    header[-4:] = struct.pack("<I", zlib.crc32(header[:-4]))
    with pytest.raises(Damaged, match="Memory usage limit exceeded"):
        decompress("x", packed[:12] + bytes(header) + packed[12 + size :])


def test_each_member_of_a_zip_is_an_input(tmp_path):
    path = tmp_path / "week.zip"
    path.write_bytes(
        zipped(
            **{
                "p10.csv": b"ten",
                "p2.csv": b"two",
                "deep__p1.csv.gz": gzip.compress(TEXT),
                "__MACOSX__._p2.csv": b"\0\0litter",
                ".DS_Store": b"\0litter",
                "empty.csv": b"",
            }
        )
    )
    assert all_of(path) == [
        Input(f"{path}!deep/p1.csv.gz", TEXT),
        Input(f"{path}!empty.csv", b""),
        Input(f"{path}!p2.csv", b"two"),
        Input(f"{path}!p10.csv", b"ten"),
    ]


def test_one_bad_member_stops_no_other(tmp_path):
    whole = bytearray(zipped(**{"a.csv": TEXT, "b.csv": TEXT[::-1], "c.csv": TEXT}))
    middle = whole.index(b"b.csv") + 400
    whole[middle : middle + 30] = bytes(30)
    path = tmp_path / "week.zip"
    path.write_bytes(whole)
    first, bad, last = all_of(path)
    assert first == Input(f"{path}!a.csv", TEXT)
    assert last == Input(f"{path}!c.csv", TEXT)
    assert isinstance(bad, Damaged)
    assert bad.source == f"{path}!b.csv"
    assert "this member of the archive is damaged" in str(bad)


def test_an_encrypted_member(tmp_path):
    whole = bytearray(zipped(**{"a.csv": TEXT}))
    for magic, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):  # general purpose flags, bit 0
        whole[whole.index(magic) + offset] |= 1
    path = tmp_path / "week.zip"
    path.write_bytes(whole)
    error = error_of(path)
    assert isinstance(error, Damaged)
    assert str(error).endswith("!a.csv: is encrypted. Unpack the archive with its password first.")


def test_a_truncated_zip(tmp_path):
    path = tmp_path / "week.zip"
    path.write_bytes(zipped(**{"a.csv": TEXT})[:300])
    assert "its zip archive is damaged or cut off" in str(error_of(path))


def test_a_packing_that_is_not_known(tmp_path):
    whole = bytearray(zipped(**{"a.csv": TEXT}))
    for magic, offset in ((b"PK\x03\x04", 8), (b"PK\x01\x02", 10)):
        whole[whole.index(magic) + offset] = 9  # deflate64
    path = tmp_path / "week.zip"
    path.write_bytes(whole)
    assert "is packed in a way that cannot be read here" in str(error_of(path))


@pytest.mark.parametrize(
    ("members", "words"),
    [
        ({}, "the zip archive holds no file"),
        ({"[Content_Types].xml": b"<x/>", "xl__a.xml": b"<x/>"}, "is an office document"),
        ({"mimetype": b"x", "content.xml": b"<x/>"}, "is an office document"),
        ({"inner.zip": zipped(a=b"1")}, "is an archive within an archive"),
    ],
)
def test_a_zip_that_is_no_set_of_tables(tmp_path, members, words):
    path = tmp_path / "week.zip"
    path.write_bytes(zipped(**members))
    error = error_of(path)
    assert isinstance(error, NotATable)
    assert words in str(error)


def test_a_zip_of_many_bombs_is_left_early(tmp_path):
    path = tmp_path / "bombs.zip"
    path.write_bytes(zipped(**{f"{i:02d}.csv": bytes(1_000_000) for i in range(40)}))
    ceiling = 1_000_000
    whole = 200 * path.stat().st_size
    assert ceiling < whole < 40_000_000
    *given_out, error = all_of(path, ceiling=ceiling)
    assert len(given_out) == whole // 1_000_000
    assert isinstance(error, Damaged)
    assert "its members unfold to more than 200 times the archive's size" in str(error)


def test_globs_come_in_natural_order(tmp_path):
    for name in ("p10.csv", "p2.csv", "p1.csv", "other.txt"):
        (tmp_path / name).write_text(name)
    (tmp_path / "folder.csv").mkdir()
    (tmp_path / "folder.csv" / "p3.csv").write_text("deep")
    assert [Path(i.source).name for i in all_of(tmp_path / "*.csv")] == [
        "p1.csv",
        "p2.csv",
        "p10.csv",
    ]
    assert len(all_of(tmp_path / "**" / "*.csv")) == 4


def test_natural_order_is_total():
    names = ["a01", "a1", "A1", "b", "a10", "a2", "1", "a1.5", "²", "a" + "9" * 5000]
    assert sorted(names, key=natural_order) == sorted(reversed(names), key=natural_order)


def test_a_file_named_like_a_pattern_is_itself(tmp_path):
    path = tmp_path / "night[1].csv"
    path.write_bytes(TEXT)
    (tmp_path / "night1.csv").write_bytes(b"another")
    assert all_of(path) == [Input(str(path), TEXT)]


def test_what_is_not_there(tmp_path):
    (tmp_path / "sub").mkdir()
    (tmp_path / "link.csv").symlink_to(tmp_path / "gone.csv")
    (tmp_path / "loop.csv").symlink_to(tmp_path / "loop.csv")
    (tmp_path / "file.csv").write_text("1")
    for name, words in {
        "none.csv": "no such file. Check the name and the folder",
        "none*.csv": "the pattern matches no file",
        "s*": "the pattern matches only folders",
        "sub": f"is a folder. Name the files in it, for example {tmp_path}/sub/*.csv",
        "link.csv": f"is a link to {tmp_path}/gone.csv, which does not exist",
        "loop.csv": "is a link that leads back to itself",
        "file.csv/inside": "cannot be opened (Not a directory)",
        "x" * 300: "cannot be opened (File name too long)",
        "nul\0.csv": "no file can have this name",
    }.items():
        error = error_of(tmp_path / name)
        assert isinstance(error, NotFound)
        assert words in str(error)
    assert "no file can have this name" in str(error_of(""))


def test_no_permission(tmp_path, monkeypatch):
    path = tmp_path / "night.csv"
    path.write_text("1")
    path.chmod(0)
    if os.geteuid() == 0:  # to whom nothing is forbidden

        def refuse(*_: object) -> None:
            raise PermissionError(13, "Permission denied")

        monkeypatch.setattr(Path, "open", refuse)
    error = error_of(path)
    assert isinstance(error, NotFound)
    assert "may not be read by you. Ask its owner for permission to read it" in str(error)


def test_a_failing_input_stops_no_other(tmp_path):
    good = tmp_path / "good.csv"
    good.write_bytes(TEXT)
    kinds = [type(i).__name__ for i in all_of(tmp_path / "none.csv", good, tmp_path, good)]
    assert kinds == ["NotFound", "Input", "NotFound", "Input"]


def test_inputs_are_read_only_when_asked_for(tmp_path):
    early, late = tmp_path / "early.csv", tmp_path / "late.csv"
    early.write_bytes(TEXT)
    inputs = open_inputs([str(early), str(late)])
    assert next(inputs) == Input(str(early), TEXT)
    late.write_bytes(b"written meanwhile")
    assert next(inputs) == Input(str(late), b"written meanwhile")


def test_standard_input():
    packed = io.BytesIO(gzip.compress(TEXT))
    once, twice = all_of("-", "-", stdin=packed)
    assert once == Input("standard input", TEXT)
    assert isinstance(twice, NotFound)
    assert str(twice) == "standard input: was read already. Name it once."
    error = error_of("-", stdin=io.BytesIO(TEXT), ceiling=99)
    assert "unfolds to more than the ceiling of 99 bytes" in str(error)


def test_a_closed_standard_input(monkeypatch):
    monkeypatch.setattr("sys.stdin", None)
    assert "standard input: is closed" in str(error_of("-"))


def test_a_pipe_that_does_not_end_meets_the_ceiling():
    assert "ceiling of 5,000,000 bytes" in str(error_of("/dev/zero", ceiling=5_000_000))


@given(
    kind=st.sampled_from([*PACK, "zip"]),
    cuts=st.lists(st.tuples(st.integers(0, 5000), st.binary(max_size=4)), max_size=4),
    length=st.integers(0, 6000),
)
def test_damage_of_any_kind_is_bytes_or_a_read_error(tmp_path_factory, kind, cuts, length):
    data = bytearray(zipped(a=TEXT[:2000], b=b"1") if kind == "zip" else PACK[kind](TEXT[:2000]))
    for place, patch in cuts:
        data[place % len(data) : place % len(data) + len(patch)] = patch
    path = tmp_path_factory.getbasetemp() / "damaged"
    path.write_bytes(data[:length])
    for outcome in all_of(path, ceiling=1_000_000):
        assert isinstance(outcome, Input | ReadError)
