"""One file of the folder to a RawTable: csv, xlsx or parquet by its suffix, with errors that say what to do."""

from audiokit.core.errors import CohortError
from audiokit.io.raw import RawTable
from audiokit.io.settings import SUFFIXES, SourceFile

_ZIP, _OLE, _PARQUET = b"PK\x03\x04", b"\xd0\xcf\x11\xe0", b"PAR1"
_OWN_SUFFIX = "give it its own suffix"
_SIGNS = {
    _ZIP: ("an Excel workbook (or another zip archive)", _OWN_SUFFIX),
    _OLE: ("an old or password-protected Excel workbook", "save it without password as .xlsx, or export it as .csv"),
    _PARQUET: ("a parquet file", _OWN_SUFFIX),
    b"\x1f\x8b": ("packed with gzip", "unpack it"),
    b"%PDF": ("a PDF document", "export the table itself as .csv or .xlsx"),
    b"\x89PNG": ("a picture", "export the table itself as .csv or .xlsx"),
}
"""First bytes of a file -> what it is, and the mend where it should be something else."""


def _read_bytes(source: SourceFile) -> bytes:
    try:
        if source.path.exists() and not (source.path.is_file() or source.path.is_dir()):
            raise CohortError(f"{source.name}: this is a pipe or a device, not a file", "name the table itself")
        return source.path.read_bytes()
    except FileNotFoundError:
        if source.path.is_symlink():
            raise CohortError(f"{source.name}: a link to a file that is not there", "mend the link") from None
        raise CohortError(
            f"{source.name}: there is no such file in the folder", "check [files] in cohort.toml"
        ) from None
    except IsADirectoryError:
        raise CohortError(f"{source.name}: this is a folder, not a file", "name the table itself") from None
    except OSError as error:
        raise CohortError(
            f"{source.name}: the file cannot be read ({error.strerror})",
            "close it elsewhere, or ask for the right to it",
        ) from error


def _check_sign(data: bytes, suffix: str, file: str) -> None:
    """A file whose first bytes belong to another kind of file is refused, whatever its name says."""
    expected = {".csv": None, ".xlsx": _ZIP, ".parquet": _PARQUET}[suffix]
    for sign, (what, mend) in _SIGNS.items():
        if data.startswith(sign) and sign != expected:
            raise CohortError(f"{file}: the file is {what}, whatever its name says", mend)


def read_table(source: SourceFile) -> RawTable:
    """The raw table of one file.

    Raises CohortError where the file is missing, of another kind than its name says, damaged, or empty.
    """
    suffix = source.path.suffix.lower()
    if suffix not in SUFFIXES:
        raise CohortError(
            f"{source.name}: files that end in {suffix or 'nothing'} are not read",
            f"save it as one of {', '.join(SUFFIXES)}",
        )
    data = _read_bytes(source)
    if not data:
        raise CohortError(f"{source.name}: the file is empty", "export the table again")
    settings = source.settings
    all_different = {settings.columns.get("test_id", "test_id")}
    _check_sign(data, suffix, source.name)
    if suffix == ".csv":
        from audiokit.io.csv_reader import read_csv

        return read_csv(
            data,
            source.name,
            encoding=settings.encoding,
            delimiter=settings.delimiter,
            header_row=settings.header_row,
            all_different=all_different,
        )
    if suffix == ".xlsx":
        from audiokit.io.xlsx_reader import read_xlsx

        return read_xlsx(data, source.name, sheet=settings.sheet, header_row=settings.header_row)
    from audiokit.io.parquet_reader import read_parquet

    return read_parquet(data, source.name, all_different=all_different)
