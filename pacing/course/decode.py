"""An XML document in UTF-8, whatever it was written in."""

from __future__ import annotations

import codecs
import re
from pathlib import Path

from pacing.errors import UnusableInputError

_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_NO_DOCUMENTS = ("punycode", "idna", "undefined", "unicode_escape", "raw_unicode_escape")


def as_utf8(data: bytes, file: Path) -> tuple[bytes, int]:
    """The document in UTF-8, and how many lines of white space before it were cut off.

    The encoding is that of the byte-order mark, else the declared one, else UTF-8; what does not
    decode so is read byte by byte (Latin-1). Raises UnusableInputError for an unknown encoding.
    """
    encoding = _encoding(data)
    try:
        if codecs.lookup(encoding).name.replace("-", "_") in _NO_DOCUMENTS:
            raise LookupError(encoding)
        decoded = data.decode(encoding)
    except LookupError:
        raise UnusableInputError(
            f"unknown encoding '{encoding}'", file=file, line=1, mend="save the file as UTF-8"
        ) from None
    except UnicodeDecodeError:
        # Names saved in an old single-byte encoding: the numbers are plain ASCII all the same.
        decoded = data.decode("latin-1")
    decoded = decoded.removeprefix("\ufeff")
    stripped = decoded.lstrip()
    return stripped.encode("utf-8", "replace"), decoded[: len(decoded) - len(stripped)].count("\n")


def _encoding(data: bytes) -> str:
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            return encoding
    declared = re.match(rb"\s*<\?xml[^>]*?encoding\s*=\s*[\"']([\w.:-]+)[\"']", data[:400])
    if not declared:
        return {b"<\0": "utf-16-le", b"\0<": "utf-16-be"}.get(data[:2], "utf-8")
    encoding = declared.group(1).decode("ascii")
    # A declaration that can be read byte by byte is not in these, whatever it says.
    return "utf-8" if encoding.lower()[:6] in ("utf-16", "utf-32", "utf_16") else encoding
