"""
From bytes to UTF-8 bytes, or to the word for what they are instead of text.

Large files stay bytes: they are checked and recoded in pieces, and a file that is UTF-8 already
is not copied at all.
"""

from __future__ import annotations

import codecs
import io
import re

from backveer.io.readers.errors import NotATable

_PIECE = 8 << 20

# First bytes of files that are sent in place of text, and what to do instead.
_SIGNATURES = (
    (b"%PDF", "a PDF document", "Ask for the data as text"),
    (b"CDF\x01", "a netCDF file", "Export its profiles as CSV"),
    (b"CDF\x02", "a netCDF file", "Export its profiles as CSV"),
    (b"CDF\x05", "a netCDF file", "Export its profiles as CSV"),
    (b"\x89HDF", "a netCDF-4 or HDF5 file", "Export its profiles as CSV"),
    (b"BUFR", "a BUFR message", "Decode it to CSV first"),
    (b"GRIB", "a GRIB message", "Decode it to CSV first"),
    (b"PAR1", "a Parquet file", "Export it as CSV"),
    (b"ARROW1", "an Arrow file", "Export it as CSV"),
    (b"SQLite format 3", "an SQLite data base", "Export the table as CSV"),
    (b"PK\x03\x04", "a zip archive", "Unpack it first"),
    (b"\x1f\x8b", "gzip data, compressed twice", "Unpack it first"),
    (b"\xd0\xcf\x11\xe0", "an old office document", "Save the sheet as CSV"),
    (b"\x89PNG", "a picture", "Name the file with the numbers"),
    (b"\xff\xd8\xff", "a picture", "Name the file with the numbers"),
    (b"GIF8", "a picture", "Name the file with the numbers"),
)

_MARKUP = (
    (re.compile(r"<(!doctype\s+html|html|head|body|table)\b", re.I), "an HTML page"),
    (re.compile(r"<(\?xml|!--|!doctype|[a-z_][\w:.-]*[\s/>])", re.I), "an XML document"),
    (re.compile(r'\{\s*["}]|\[\s*(\{|\[|"[^"\n]*"\s*[,\]:]|-?\d[\d.eE+-]*\s*,)'), "JSON"),
)

# Controls that texts hold: tab, line ends, form feed, DOS's end of file, bulletin marks.
_NOT_TEXT = bytes(sorted(set(range(32)) - {1, 3, 9, 10, 11, 12, 13, 26, 27}))


def to_utf8(data: bytes) -> tuple[bytes, str]:
    """
    Text as UTF-8 without byte order mark, and the name of the encoding that it had.

    UTF-8 with or without byte order mark, UTF-16 with one or recognised by the zeros of its
    ASCII letters, and whatever else as Windows-1252 where its bytes are used, or Latin-1.
    A file cut off within its last character loses that character. The Unicode minus becomes a
    hyphen; a NUL at the end of the file, DOS's end-of-file mark and trailing blanks go.

    Raises
    ------
    NotATable
        Empty, binary, or another kind of file, which is named.
    """
    head = data[:4096]
    for magic, what, remedy in _SIGNATURES:
        if head.startswith(magic):
            raise NotATable(f"is {what}, not a text table", remedy)
    if b"BUFR" in head and any(byte in head for byte in _NOT_TEXT):
        raise NotATable("is a BUFR message, not a text table", "Decode it to CSV first")
    text, encoding = _decoded(data, head)
    start = text[:4096].decode("utf-8", "ignore").lstrip()
    if not start and not text.strip():
        raise NotATable("is empty", "Check that the file was written or fetched to its end")
    for pattern, what in _MARKUP:
        if pattern.match(start):
            raise NotATable(
                f"holds {what}, not a text table", "Fetch the data themselves, as CSV or text"
            )
    return text, encoding


def _decoded(data: bytes, head: bytes) -> tuple[bytes, str]:
    if data.startswith(codecs.BOM_UTF8):
        encoding, start = "utf-8-sig", 3
    elif data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        encoding, start = ("utf-16-le" if data[0] == 0xFF else "utf-16-be"), 2
    else:
        encoding, start = _utf16_without_mark(head) or "utf-8", 0
    if encoding.startswith("utf-16"):
        try:
            text = _recoded(data, start, encoding)
        except UnicodeDecodeError as error:
            raise NotATable(
                f"looks like UTF-16 and is not ({error.reason})", "Save it as UTF-8"
            ) from error
    else:
        text = data[start:] if start else data  # the whole of bytes is not copied
        if not text.isascii() and not _is_utf8(text):
            windows = any(byte in text for byte in range(0x80, 0xA0))
            encoding = "cp1252" if windows else "latin-1"
            text = _recoded(text, 0, encoding)
    if b"\0" in text[-512:] or b"\x1a" in text[-512:]:
        text = text.rstrip(b"\0\x1a \t\r\n")
    if b"\0" in text or _share_of_controls(text[:4096]) > 0.01:
        raise NotATable("is binary, not a text table", "Export the data as CSV or text")
    if not text.isascii() and "\u2212".encode() in text:
        text = text.replace("\u2212".encode(), b"-")
    return text, encoding


def _utf16_without_mark(head: bytes) -> str | None:
    pairs = len(head) // 2
    if pairs < 2:
        return None
    even, odd = head[0 : 2 * pairs : 2].count(0), head[1 : 2 * pairs : 2].count(0)
    if odd > 0.7 * pairs and even < 0.05 * pairs:
        return "utf-16-le"
    if even > 0.7 * pairs and odd < 0.05 * pairs:
        return "utf-16-be"
    return None


def _share_of_controls(piece: bytes) -> float:
    return (len(piece) - len(piece.translate(None, _NOT_TEXT))) / max(len(piece), 1)


def _is_utf8(data: bytes) -> bool:
    check = codecs.getincrementaldecoder("utf-8")()
    view = memoryview(data)
    try:
        for start in range(0, len(view), _PIECE):
            check.decode(view[start : start + _PIECE])  # final=False: the end may be cut off
    except UnicodeDecodeError:
        return False
    return True


def _recoded(data: bytes, start: int, encoding: str) -> bytes:
    # What Windows-1252 leaves undefined must not stop the reading.
    errors = "replace" if encoding == "cp1252" else "strict"
    decoder = codecs.getincrementaldecoder(encoding)(errors)
    view = memoryview(data)
    whole = io.BytesIO()
    for position in range(start, len(view), _PIECE):
        piece = decoder.decode(view[position : position + _PIECE])
        whole.write(piece.encode("utf-8", "replace"))
    return whole.getvalue()
