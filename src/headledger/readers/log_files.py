"""Log files as bytes: opened, unpacked, brought to one line ending and cut into blocks of whole lines.

Cells are looked at as bytes of an ASCII-compatible encoding; only a file in UTF-16, or one whose encoding was stated,
is decoded as a whole.
"""

from __future__ import annotations

import codecs
import gzip
import hashlib
import threading
import zlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import BinaryIO

from headledger.errors import JobError, Problem

BLOCK_BYTES = 4 * 1024 * 1024
"""Read at a time: some 20,000 to 100,000 rows; bounds the memory of a pass. [B]"""
SAMPLE_BYTES = 128 * 1024
"""Enough to see encoding and shape. [B]"""
MOST_LINE_BYTES = 32 * 1024 * 1024
"""A longer line is not a line of a log. [B]"""

_LATER_KINDS = {".zst": "Zstandard", ".xlsx": "Excel", ".xls": "Excel", ".parquet": "Parquet"}
_MAGIC = {b"\x28\xb5\x2f\xfd": "Zstandard", b"PK\x03\x04": "a ZIP archive or Excel workbook", b"PAR1": "Parquet"}


def file_sha256(path: Path) -> str:
    """SHA-256 of a file's bytes, in hexadecimal."""
    digest = hashlib.sha256()
    with path.open("rb") as file:
        while block := file.read(1 << 20):
            digest.update(block)
    return digest.hexdigest()


def sha256_in_background(path: Path) -> Callable[[], str]:
    """What waits for a file's SHA-256, which is read meanwhile; raises what the reading raised."""
    found: list[str | OSError] = []

    def read() -> None:
        try:
            found.append(file_sha256(path))
        except OSError as error:
            found.append(error)

    # a daemon: whoever quits the screen does not wait for a hash that nobody asked for
    thread = threading.Thread(target=read, daemon=True)
    thread.start()

    def value() -> str:
        thread.join()
        if isinstance(found[0], OSError):
            raise found[0]
        return found[0]

    return value


def text_of(raw: bytes) -> str:
    """Text of a cell: UTF-8 where it is that, else Latin-1."""
    try:
        return raw.decode("utf-8")
    except UnicodeDecodeError:
        return raw.decode("latin-1")


@dataclass(frozen=True, slots=True, kw_only=True)
class LogFile:
    """A log that can be read from its start as often as needed.

    Parameters
    ----------
    path : Path
    name : str
        As it is named in messages.
    packed : bool
        Whether it is gzipped.
    encoding : str
        What was stated or found.
    decoded : bool
        Whether the bytes pass through a strict decoder.
    skip : int
        Bytes of a byte order mark at the start.
    bare_returns : bool
        Lines end in a carriage return alone.
    """

    path: Path
    name: str
    packed: bool = False
    encoding: str = "utf-8"
    decoded: bool = False
    skip: int = 0
    bare_returns: bool = False

    def sample(self) -> bytes:
        """Whole lines from the start of the file, enough to see its shape."""
        return next(self.blocks(size=SAMPLE_BYTES), b"")

    def blocks(
        self,
        *,
        size: int = BLOCK_BYTES,
        on_share: Callable[[float], None] | None = None,
        span: tuple[int, int] | None = None,
    ) -> Iterator[bytes]:
        """Blocks of whole lines, each line ended by one line feed.

        Parameters
        ----------
        size : int
            [B]
        span : (int, int), optional
            First byte and the one past the last, of whole lines of a file that is read as it stands. [B]
        on_share : callable, optional
            Told the fraction of the file that has been read. [-]

        Raises
        ------
        JobError
            Unreadable, cut short, or not in the stated encoding.
        """
        if span is not None or self.is_plain:
            yield from self._plain_blocks(size, on_share, span or (0, self.path.stat().st_size))
            return
        decoder = codecs.getincrementaldecoder(self.encoding)(errors="strict") if self.decoded else None
        whole = max(self.path.stat().st_size, 1)
        carry = b""
        with _opened(self.path, self.name, packed=self.packed) as (stream, bottom):
            stream.read(self.skip)
            raw = stream.read(size)
            while raw:
                # Known beforehand to be the last, a block takes a line without an end along.
                following = stream.read(size)
                plain = self._decode(decoder, raw, final=not following) if decoder else raw
                carry += plain.replace(b"\r", b"\n") if self.bare_returns else plain
                if not following and not carry.endswith(b"\n"):
                    carry += b"\n"
                cut = carry.rfind(b"\n") + 1
                if cut:
                    yield _one_line_ending(carry[:cut])
                    carry = carry[cut:]
                elif len(carry) > MOST_LINE_BYTES:
                    raise JobError([Problem(self.name, "holds a line too long for a log", f"{len(carry)} bytes", "")])
                if on_share:
                    on_share(min(bottom.tell() / whole, 1.0))
                raw = following

    @property
    def is_plain(self) -> bool:
        """Whether its bytes are read as they stand."""
        return not (self.packed or self.decoded or self.bare_returns)

    def _plain_blocks(
        self, size: int, on_share: Callable[[float], None] | None, span: tuple[int, int]
    ) -> Iterator[bytes]:
        """The same of a file that is read as it stands."""
        with _opened(self.path, self.name, packed=False) as (stream, _):
            stream.seek(max(span[0], self.skip))
            left = span[1] - stream.tell()
            while left > 0:
                block = stream.read(min(size, left))
                left -= len(block)
                if not block.endswith(b"\n"):
                    rest = stream.readline(MOST_LINE_BYTES)
                    left -= len(rest)
                    if len(rest) >= MOST_LINE_BYTES:
                        raise JobError(
                            [Problem(self.name, "holds a line too long for a log", f"{len(rest)} bytes", "")]
                        )
                    block += rest if rest.endswith(b"\n") else rest + b"\n"
                yield _one_line_ending(block)
                if on_share:
                    on_share(min(1.0 - left / max(span[1] - span[0], 1), 1.0))

    def _decode(self, decoder: codecs.IncrementalDecoder, raw: bytes, *, final: bool) -> bytes:
        """Bytes in UTF-8 of bytes in the file's encoding."""
        try:
            return decoder.decode(raw, final).removeprefix("\ufeff").encode("utf-8", errors="replace")
        except UnicodeError as error:
            found = (
                repr(error.object[error.start : error.start + 4])
                if isinstance(error, UnicodeDecodeError)
                else str(error)
            )
            raise JobError([_wrong_encoding(self.name, self.encoding, found)]) from None


def line_ranges(file: LogFile, count: int) -> list[tuple[int, int]]:
    """The bytes of a file in so many parts of whole lines, about alike; fewer where lines are long. [B]"""
    whole = file.path.stat().st_size
    cuts = [0]
    with _opened(file.path, file.name, packed=False) as (stream, _):
        for number in range(1, count):
            stream.seek(whole * number // count)
            stream.readline()
            cuts.append(stream.tell())
    edges = sorted({*cuts, whole})
    return list(pairwise(edges))


def _wrong_encoding(name: str, encoding: str, found: str) -> Problem:
    """The problem of a file that is not in the encoding that was stated for it."""
    return Problem(
        name, f"is not written in {encoding}", found, "another encoding in [log], or none there to have it found"
    )


def _one_line_ending(block: bytes) -> bytes:
    """The block with line feeds alone."""
    return block.replace(b"\r\n", b"\n") if b"\r" in block else block


@contextmanager
def _opened(path: Path, name: str, *, packed: bool) -> Iterator[tuple[BinaryIO, BinaryIO]]:
    """The stream of a log's bytes and the file below it, whose faults become a `JobError`."""
    try:
        with path.open("rb") as bottom:
            if not packed:
                yield bottom, bottom
                return
            with gzip.GzipFile(fileobj=bottom) as stream:
                yield stream, bottom  # type: ignore[misc]  # a GzipFile reads like a BinaryIO
    except FileNotFoundError:
        raise JobError([Problem(name, "the log does not exist", "", "a file in the job folder")]) from None
    except (EOFError, zlib.error, gzip.BadGzipFile) as error:
        raise JobError([Problem(name, "the compressed log is damaged", str(error), "a whole .gz file")]) from None
    except OSError as error:
        fault = error.strerror or str(error)
        raise JobError([Problem(name, "the log cannot be read", fault, "a readable file")]) from None


def look_at_file(path: Path, name: str, encoding: str | None) -> LogFile:
    """The log with its packing and encoding known.

    Parameters
    ----------
    path : Path
    name : str
        As it is named in messages.
    encoding : str or None
        As stated in the job; None to have it found.

    Returns
    -------
    LogFile

    Raises
    ------
    JobError
        Missing, empty, binary, of a kind that is not read, or not in the stated encoding.
    """
    head = _head(path, name, packed=False)
    _refuse_other_kinds(path, name, head)
    packed = head[:2] == b"\x1f\x8b"
    if packed:
        head = _head(path, name, packed=True)
    if not head:
        raise JobError([Problem(name, "the log is empty", "0 bytes", "a header row and rows of readings")])
    found, decoded, skip = _encoding_of(head, name, encoding)
    file = LogFile(path=path, name=name, packed=packed, encoding=found, decoded=decoded, skip=skip)
    text = _head_text(file, head)
    returns, feeds = b"\r" in text, b"\n" in text
    if encoding and not (returns or feeds) and (b"\n" in head or b"\r" in head):
        raise JobError([_wrong_encoding(name, encoding, "text without a line end")])
    return replace(file, bare_returns=returns and not feeds)


def _head(path: Path, name: str, *, packed: bool) -> bytes:
    """First bytes of a log."""
    with _opened(path, name, packed=packed) as (stream, _):
        return stream.read(SAMPLE_BYTES)


def _head_text(file: LogFile, head: bytes) -> bytes:
    """First bytes of a log in an ASCII-compatible encoding."""
    if not file.decoded:
        return head
    return file._decode(codecs.getincrementaldecoder(file.encoding)(errors="strict"), head, final=False)


def _refuse_other_kinds(path: Path, name: str, head: bytes) -> None:
    """Raise for a kind of file that is known, but is no text."""
    kind = _LATER_KINDS.get(path.suffix.lower()) or next(
        (kind for magic, kind in _MAGIC.items() if head.startswith(magic)), ""
    )
    if kind:
        raise JobError([Problem(name, "this kind of log is not read yet", kind, "a CSV file, or one packed as .gz")])


def _encoding_of(head: bytes, name: str, stated: str | None) -> tuple[str, bool, int]:
    """Encoding, whether to decode by it, and the bytes to skip, of a file's first bytes."""
    if stated:
        try:
            codecs.lookup(stated)
            "a".encode(stated)
        except LookupError:
            place = "job.toml, [log] encoding"
            raise JobError([Problem(place, "unknown encoding", stated, "utf-8, utf-16, latin-1 or cp1252")]) from None
        return stated, True, 0
    if head.startswith(codecs.BOM_UTF8):
        return "utf-8", False, 3
    if head.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        return "utf-16", True, 0
    zeros = head.count(0)
    if zeros:
        for encoding, offset in (("utf-16-le", 1), ("utf-16-be", 0)):
            if head[offset::2].count(0) == zeros and zeros > 0.4 * len(head):
                return encoding, True, 0
        if 0 in head[:4096]:
            raise JobError([Problem(name, "the log is a binary file", "zero bytes", "a text file (CSV)")])
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head)
    except UnicodeDecodeError:
        return "latin-1", False, 0
    return "utf-8", False, 0
