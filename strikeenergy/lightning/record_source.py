"""A file or stream as blocks of whole lines of ASCII-compatible bytes, whatever its encoding and line ends are."""

from __future__ import annotations

import codecs
import os
import stat
from collections.abc import Iterator
from typing import IO, Any, cast

from strikeenergy.errors import InputError, Problem

__all__ = ["BLOCK", "LONGEST_LINE", "Source"]

BLOCK = 1 << 21
"""Bytes that are read at a time."""
LONGEST_LINE = 1 << 20
"""A longer line is no line of a table of samples."""


class Source:
    """A path, or an open stream of text or bytes, read once from front to back.

    Attributes:
        name: for messages.
        size: bytes of a file; 0 for a stream.

    Raises:
        InputError: no such file, a folder, not readable.
    """

    def __init__(self, path_or_stream: str | os.PathLike[str] | IO[str] | IO[bytes]) -> None:
        self.size = 0
        self._own = not hasattr(path_or_stream, "read")
        self._head = b""
        self._decoder: Any = None
        self._newline = b"\n"
        if self._own:
            path = os.fspath(cast("str | os.PathLike[str]", path_or_stream))
            self.name = str(path)
            self._stream: Any = self._open(path)
        else:
            self._stream = path_or_stream
            name = getattr(path_or_stream, "name", "")
            self.name = name if isinstance(name, str) and name else "<stream>"

    def _open(self, path: str) -> IO[bytes]:
        try:
            info = os.stat(path)
            if stat.S_ISDIR(info.st_mode):
                raise InputError(
                    [Problem("this is a folder", "give the file with the record", place=self.name)]
                )
            self.size = info.st_size if stat.S_ISREG(info.st_mode) else 0
            return open(path, "rb", buffering=0)
        except (OSError, ValueError) as error:
            what = f"the file cannot be read ({error})"
            if isinstance(error, FileNotFoundError):
                what = "there is no such file"
            elif isinstance(error, PermissionError):
                what = "the file may not be read"
            raise InputError([Problem(what, "check the path", place=self.name)]) from None

    def __enter__(self) -> Source:
        return self

    def __exit__(self, *_: object) -> None:
        if self._own:
            self._stream.close()

    def _read(self, size: int) -> bytes:
        try:
            data = self._stream.read(size)
        except (OSError, UnicodeDecodeError) as error:
            raise InputError(
                [Problem(f"reading failed: {error}", "check the file", place=self.name)]
            ) from None
        return data.encode("utf-8") if isinstance(data, str) else bytes(data or b"")

    def look(self, size: int) -> bytes:
        """Return the first bytes without using them up."""
        while len(self._head) < size and (data := self._read(size - len(self._head))):
            self._head += data
        return self._head

    def decode(self, encoding: str) -> None:
        """Set the encoding. From here on the bytes are UTF-8, or Latin-1 where the file is."""
        if encoding.startswith("utf-16"):
            self._decoder = codecs.getincrementaldecoder(encoding)(errors="replace")
        self._head = self._to_ascii(self._head.removeprefix(codecs.BOM_UTF8))
        self._text_encoding = "latin-1" if encoding == "latin-1" else "utf-8"
        if b"\n" not in self._head and b"\r" in self._head:
            self._newline = b"\r"
            self._head = self._head.replace(b"\r", b"\n")

    def _to_ascii(self, data: bytes) -> bytes:
        if self._decoder is not None:
            data = self._decoder.decode(data).encode("utf-8")
        return data.replace(b"\r", b"\n") if self._newline == b"\r" else data

    def first_lines(self) -> tuple[str, bool]:
        """Return the text of the first whole lines, and whether that is all there is.

        Raises:
            InputError: there is not one whole line in it.
        """
        more = self._to_ascii(self._read(1))
        head = self._head
        self._head += more
        if not more:
            return head.decode(self._text_encoding, "replace"), True
        if b"\n" not in head:
            raise self._long_line(len(head))
        return head[: head.rfind(b"\n") + 1].decode(self._text_encoding, "replace"), False

    def _long_line(self, size: int) -> InputError:
        what = f"a line is longer than {size} bytes: this is no table of samples"
        return InputError([Problem(what, "export one sample a line", place=self.name)])

    def expected_lines(self, text: str, first_line: int, whole: bool) -> int:
        """Return about how many lines of samples there are, from the size of the file and the length of the first ones."""
        lines = text.split("\n")[first_line - 1 :]
        used = sum(len(line) + 1 for line in lines)
        if whole or not self.size or not used:
            return len(lines)
        width = 2 if self._decoder is not None else 1
        return int((self.size / width - (len(text) - used)) / used * (len(lines) - 1)) + 1

    def blocks(self) -> Iterator[bytes]:
        """Yield blocks of whole lines, each ending with a line end.

        Raises:
            InputError: a line of more than ``LONGEST_LINE`` bytes.
        """
        rest, data = b"", self._head
        self._head = b""
        while data:
            data = rest + data
            cut = data.rfind(b"\n") + 1
            if len(data) - cut > LONGEST_LINE:
                raise self._long_line(LONGEST_LINE)
            if cut:
                yield data[:cut]
            rest = data[cut:]
            data = self._to_ascii(self._read(BLOCK))
        if rest.strip(b"\x1a \t\r\n\0"):
            yield rest + b"\n"
