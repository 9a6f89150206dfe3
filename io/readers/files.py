"""
From what the user names to bytes.

A name is a path, a glob pattern, or ``-`` for standard input. What is compressed is recognised
by its first bytes, not by its suffix, and a zip gives one input a member, named
``archive.zip!member``. Inputs come one after the other, so that only one is in memory; one that
cannot be read is handed on as a ``ReadError`` and stops no other.
"""

from __future__ import annotations

import bz2
import errno
import glob
import gzip
import io
import lzma
import os
import re
import stat
import sys
import zipfile
import zlib
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import IO, NamedTuple, cast

from backveer.io.readers.errors import Damaged, NotATable, NotFound, ReadError

DECOMPRESSED_CEILING = 2 * 1024**3
"""Most bytes that one compressed input (or a pipe) may unfold to, unless the caller raises it."""

# Text of numbers shrinks 3 to 20 times, seldom beyond 100 (common practice, no source), deflate
# reaches 1032; an archive of many members may unfold to more than the ceiling, but not by this.
ARCHIVE_RATIO = 200

_PIECE = 1 << 20
_XZ_MEMORY = 512 * 1024**2  # a forged header may ask for a dictionary of 4 GB
_ZSTD_WINDOW = 128 * 1024**2  # the window that zstd's own command accepts by default

_ZIP_MAGIC = (b"PK\x03\x04", b"PK\x05\x06", b"PK\x07\x08")
_GLOB = re.compile(r"[*?\[]")
# What a desktop adds to an archive that a person packs: nobody means it as an input.
_DESKTOP_LITTER = re.compile(r"(^|/)(__MACOSX/|\._|\.DS_Store$|Thumbs\.db$|desktop\.ini$)")


class Input(NamedTuple):
    """One input: its name, and its bytes, unfolded."""

    source: str
    data: bytes


def open_inputs(
    names: Iterable[str], *, ceiling: int = DECOMPRESSED_CEILING, stdin: IO[bytes] | None = None
) -> Iterator[Input | ReadError]:
    """
    Give the inputs that the names stand for, one at a time.

    Parameters
    ----------
    names
        Paths, glob patterns (``**`` reaches into folders) and ``-`` for standard input, in the
        order wanted. A pattern gives its files in natural order (``p2.csv`` before ``p10.csv``);
        where a file of exactly that name exists, it is meant.
    ceiling
        Most bytes that one compressed input, or a pipe, may unfold to. The members of a zip
        together may reach the ceiling or 200 times the size of the archive, whichever is more.
        A plain file has no ceiling.
    stdin
        What to read for ``-``; the process's own standard input where not given.

    Yields
    ------
    Input or ReadError
        An error (``NotFound``, ``Damaged``, ``NotATable``) stands in the place of its input,
        with ``source`` set. In a zip, folders and a desktop's litter (``__MACOSX/``,
        ``.DS_Store``) are passed over.
    """
    stdin_read = False
    for name in names:
        if name == "-":
            if stdin_read:
                yield NotFound("was read already", "Name it once", "standard input")
                continue
            stdin_read = True
            yield from _from_stdin(stdin, ceiling)
            continue
        try:
            paths = _expand(name)
        except ReadError as error:
            yield error
            continue
        for path in paths:
            yield from _from_path(path, ceiling)


def natural_order(name: str) -> list[tuple[int, int, str]]:
    """
    Sorting key with numbers by value; names that differ only in leading zeros stay apart.

    Examples
    --------
    >>> sorted(["p10.csv", "p2.csv", "P1.csv"], key=natural_order)
    ['P1.csv', 'p2.csv', 'p10.csv']
    """
    key = [
        (0, int(piece), "") if piece.isdecimal() and len(piece) < 40 else (1, 0, piece.casefold())
        for piece in re.split(r"([0-9]+)", name)
        if piece
    ]
    return [*key, (2, 0, name)]


def _expand(name: str) -> list[str]:
    """Paths of a name: itself, or what the pattern matches."""
    if not name or "\0" in name:
        raise NotFound("no file can have this name", "Name a file", repr(name))
    if not _GLOB.search(name) or os.path.lexists(name):
        return [name]
    # Path.glob takes no pattern with a root; the user's may have one.
    found = sorted(glob.glob(name, recursive=True), key=natural_order)  # noqa: PTH207
    files = [path for path in found if not Path(path).is_dir()]
    if found and not files:
        raise NotFound(
            "the pattern matches only folders",
            f"Name the files in them, for example {name.rstrip('/')}/*.csv",
            name,
        )
    if not files:
        raise NotFound("the pattern matches no file", "Check the folder and the pattern", name)
    return files


def _from_path(name: str, ceiling: int) -> Iterator[Input | ReadError]:
    try:
        with Path(name).open("rb") as file:
            # A pipe such as <(command) has no size that could be trusted beforehand.
            regular = stat.S_ISREG(os.fstat(file.fileno()).st_mode)
            data = file.read() if regular else _read_all(file, name, ceiling)
    except ReadError as error:
        yield error
    except (OSError, ValueError, MemoryError) as error:
        yield _not_opened(name, error)
    else:
        yield from unfold(name, data, ceiling)


def _from_stdin(stdin: IO[bytes] | None, ceiling: int) -> Iterator[Input | ReadError]:
    name = "standard input"
    try:
        if stdin is None:
            if sys.stdin is None:
                raise NotFound("is closed", "Name a file, or send the data through a pipe", name)
            stdin = sys.stdin.buffer
        data = _read_all(stdin, name, ceiling)
    except ReadError as error:
        yield error
    except (OSError, ValueError) as error:
        yield NotFound(f"cannot be read ({error})", "Send the data through a pipe", name)
    else:
        yield from unfold(name, data, ceiling)


def _not_opened(name: str, error: Exception) -> ReadError:
    path = Path(name)
    if isinstance(error, MemoryError):
        return Damaged("is larger than the memory", "Split it into smaller files", name)
    if isinstance(error, IsADirectoryError):
        return NotFound(
            "is a folder", f"Name the files in it, for example {name.rstrip('/')}/*.csv", name
        )
    if isinstance(error, PermissionError):
        return NotFound("may not be read by you", "Ask its owner for permission to read it", name)
    if isinstance(error, FileNotFoundError):
        if path.is_symlink():
            return NotFound(
                f"is a link to {path.readlink()}, which does not exist",
                "Restore the target or name another file",
                name,
            )
        return NotFound("no such file", "Check the name and the folder", name)
    if isinstance(error, OSError) and error.errno == errno.ELOOP:
        return NotFound("is a link that leads back to itself", "Name another file", name)
    reason = getattr(error, "strerror", None) or str(error)
    return NotFound(f"cannot be opened ({reason})", "Check the name and the folder", name)


def unfold(
    name: str, data: bytes, ceiling: int = DECOMPRESSED_CEILING
) -> Iterator[Input | ReadError]:
    """Give the inputs in the bytes of one file, decompressed."""
    if data.startswith(_ZIP_MAGIC):
        yield from _members(name, data, ceiling)
        return
    try:
        unfolded = decompress(name, data, ceiling)
    except ReadError as error:
        yield error
    else:
        yield Input(name, unfolded)


def decompress(name: str, data: bytes, ceiling: int = DECOMPRESSED_CEILING) -> bytes:
    """
    Bytes without their gzip, bzip2, xz or zstandard dress; as they are, if they wear none.

    Raises
    ------
    Damaged
        Truncated or corrupt, or larger than the ceiling.
    """
    kind = _compression(data)
    if kind is None:
        return data
    try:
        with _stream(kind, data) as stream:
            return _read_all(stream, name, ceiling)
    except EOFError as error:
        raise _cut_off(kind, name) from error
    except (OSError, zlib.error, lzma.LZMAError, ValueError) as error:
        raise Damaged(
            f"its {kind} compression is damaged ({error})",
            "Fetch it again or restore a sound copy",
            name,
        ) from error


def _cut_off(kind: str, name: str) -> Damaged:
    return Damaged(
        f"its {kind} compression ends too early, the file was cut off", "Fetch it again", name
    )


def _compression(data: bytes) -> str | None:
    if data.startswith(b"\x1f\x8b"):
        return "gzip"
    # "BZh" alone could begin a text: the level, then a block or the end of an empty stream.
    if re.match(rb"BZh[1-9](1AY&SY|\x17rE8P\x90|.{0,5}\Z)", data, re.DOTALL):
        return "bzip2"
    if data.startswith(b"\xfd7zXZ\x00"):
        return "xz"
    if data.startswith(b"\x28\xb5\x2f\xfd"):
        return "zstandard"
    return None


def _stream(kind: str, data: bytes) -> IO[bytes]:
    source = io.BytesIO(data)
    if kind == "gzip":
        return cast(IO[bytes], gzip.GzipFile(fileobj=source))
    if kind == "bzip2":
        return bz2.BZ2File(source)
    if kind == "xz":
        return io.BufferedReader(_Pieces(_xz_pieces(source)))
    return io.BufferedReader(_Pieces(_zstd_pieces(source)))


class _Pieces(io.RawIOBase):
    """A raw stream over an iterator of bytes."""

    def __init__(self, pieces: Iterator[bytes]) -> None:
        self._pieces = pieces
        self._rest = memoryview(b"")

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: bytearray | memoryview) -> int:  # type: ignore[override]
        while not self._rest:
            piece = next(self._pieces, None)
            if piece is None:
                return 0
            self._rest = memoryview(piece)
        count = min(len(buffer), len(self._rest))
        buffer[:count] = self._rest[:count]
        self._rest = self._rest[count:]
        return count


def _xz_pieces(source: io.BytesIO) -> Iterator[bytes]:
    """Of lzma's own file object the memory cannot be bounded, of its decompressor it can."""
    rest = source.getvalue()
    while rest:
        unfolder = lzma.LZMADecompressor(lzma.FORMAT_XZ, memlimit=_XZ_MEMORY)
        feed = rest
        while not unfolder.eof:
            if not feed and unfolder.needs_input:
                raise EOFError
            yield unfolder.decompress(feed, max_length=_PIECE)
            feed = b""
        rest = unfolder.unused_data.lstrip(b"\0")  # streams may be padded


def _zstd_pieces(source: io.BytesIO) -> Iterator[bytes]:
    import zstandard

    # The stream reader takes the end of the bytes for the end of the data, wherever it comes;
    # so each frame is unfolded by an object that knows whether it saw its own end.
    rest = memoryview(source.getvalue())
    while rest:
        unfolder = zstandard.ZstdDecompressor(max_window_size=_ZSTD_WINDOW).decompressobj()
        try:
            position = 0
            while not unfolder.eof:
                if position >= len(rest):
                    raise EOFError
                # One step unfolds all that it is fed: a small feed bounds what a bomb can do.
                feed = rest[position : position + 4096]
                position += len(feed)
                yield unfolder.decompress(feed)
        except zstandard.ZstdError as error:
            raise ValueError(str(error)) from error
        rest = rest[position - len(unfolder.unused_data) :]


def _read_all(stream: IO[bytes], name: str, ceiling: int) -> bytes:
    """All bytes of a stream; beyond the ceiling, an error."""
    whole = io.BytesIO()
    while piece := stream.read(_PIECE):
        if whole.tell() + len(piece) > ceiling:
            raise Damaged(
                f"unfolds to more than the ceiling of {ceiling:,} bytes",
                "If it is no trap, unpack it yourself and name the plain file",
                name,
            )
        whole.write(piece)
    return whole.getvalue()


def _members(name: str, data: bytes, ceiling: int) -> Iterator[Input | ReadError]:
    """Members of a zip, each an input of its own, in natural order."""
    try:
        archive = zipfile.ZipFile(io.BytesIO(data))
        listed = archive.infolist()
    except (zipfile.BadZipFile, EOFError, OSError, ValueError, NotImplementedError) as error:
        yield Damaged(
            f"its zip archive is damaged or cut off ({error})",
            "Fetch it again or restore a sound copy",
            name,
        )
        return
    names = {member.filename for member in listed}
    if "[Content_Types].xml" in names or {"mimetype", "content.xml"} <= names:
        yield NotATable(
            "is an office document, not a text file",
            "Save the sheet as CSV from the spreadsheet program",
            name,
        )
        return
    members = sorted(
        (m for m in listed if not m.is_dir() and not _DESKTOP_LITTER.search(m.filename)),
        key=lambda member: natural_order(member.filename),
    )
    if not members:
        yield NotATable("the zip archive holds no file", "Name another archive", name)
        return
    allowance = max(ceiling, ARCHIVE_RATIO * len(data))
    for member in members:
        source = f"{name}!{member.filename}"
        outcome: Input | ReadError
        try:
            outcome = Input(source, _member(archive, member, source, ceiling))
        except ReadError as error:
            outcome = error
        size = len(outcome.data) if isinstance(outcome, Input) else 0
        allowance -= max(size, min(member.file_size, ceiling))
        if allowance < 0:
            yield Damaged(
                f"its members unfold to more than {ARCHIVE_RATIO} times the archive's size",
                "If it is no trap, unpack it yourself and name the plain files",
                name,
            )
            return
        yield outcome


def _member(archive: zipfile.ZipFile, member: zipfile.ZipInfo, source: str, ceiling: int) -> bytes:
    if member.flag_bits & 0x1:
        raise Damaged("is encrypted", "Unpack the archive with its password first", source)
    try:
        with archive.open(member) as stream:
            data = _read_all(stream, source, ceiling)
    except EOFError as error:
        raise _cut_off("zip", source) from error
    except RuntimeError as error:
        raise Damaged(
            f"is packed in a way that cannot be read here ({error})",
            "Unpack the archive first",
            source,
        ) from error
    except (zipfile.BadZipFile, OSError, zlib.error, lzma.LZMAError, ValueError) as error:
        raise Damaged(
            f"this member of the archive is damaged ({error})",
            "Fetch it again or restore a sound copy",
            source,
        ) from error
    if data.startswith(_ZIP_MAGIC):
        raise NotATable("is an archive within an archive", "Unpack the outer one first", source)
    return decompress(source, data, ceiling)
