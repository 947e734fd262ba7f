"""Bytes of a delimited text to UTF-8, with errors that name the line."""

from audiokit.core.errors import CohortError

_UTF8_NAMES = ("utf-8", "utf8", "utf-8-sig")


def decode(data: bytes, file: str, encoding: str | None) -> bytes:
    """The file's text as UTF-8 without byte-order mark; UTF-16 is recognised by its mark, anything else is named.

    Raises CohortError where the bytes are no text of that encoding, naming byte and line.
    """
    name = (encoding or "utf-8").lower().replace("_", "-")
    if encoding is None and data[:2] in (b"\xff\xfe", b"\xfe\xff"):
        name = "utf-16"
    if name in _UTF8_NAMES:
        name = "utf-8"
        data = data.removeprefix(b"\xef\xbb\xbf")
        if data.isascii():
            return _without_zeros(data, file)
    try:
        text = data.decode(name)
        encoded = data if name == "utf-8" else text.removeprefix("\ufeff").encode()
    except UnicodeDecodeError as error:
        _without_zeros(data[: error.start], file)
        line = data.count(b"\n", 0, error.start) + 1
        raise CohortError(
            f"{file}, line {line}: byte {error.start + 1} (0x{data[error.start]:02X}) is not text in {name}",
            'save the file as "CSV UTF-8", or name its encoding for this file in cohort.toml, '
            'for example encoding = "cp1252"',
        ) from None
    except UnicodeError as error:
        raise CohortError(f"{file}: this is not text in {name} ({error})", "correct encoding in cohort.toml") from None
    return _without_zeros(encoded, file)


def _without_zeros(data: bytes, file: str) -> bytes:
    at = data.find(b"\0")
    if at < 0:
        return data
    line = data.count(b"\n", 0, at) + 1
    raise CohortError(
        f"{file}, line {line}: a zero byte; this is not the text of a table",
        "export the table as CSV again; for UTF-16 without a byte-order mark set encoding in cohort.toml, "
        'for example encoding = "utf-16-le"',
    )
