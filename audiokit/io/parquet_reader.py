"""Parquet to a RawTable: numbers and dates keep their types, texts come by their distinct values."""

from collections.abc import Collection

import numpy as np
import pyarrow as pa
import pyarrow.parquet
from pyarrow import types

from audiokit.core.errors import CohortError
from audiokit.io.headings import clean_headings
from audiokit.io.raw import RawTable
from audiokit.io.texts import is_readable_type, is_text_type


def _check_schema(schema: pa.Schema, file: str) -> None:
    for place, name in enumerate(schema.names):
        if name in schema.names[:place]:
            first = schema.names.index(name) + 1
            raise CohortError(
                f"{file}: columns {first} and {place + 1} have the same heading {name!r}",
                "give every column its own heading",
            )
    for field in schema:
        kind = field.type.value_type if types.is_dictionary(field.type) else field.type
        if not is_readable_type(kind):
            raise CohortError(
                f"{file}: the column {field.name!r} holds {kind}, which is no text, number, date or yes/no",
                "store it as text, or leave it out",
            )


def read_parquet(data: bytes, file: str, *, all_different: Collection[str] = ()) -> RawTable:
    """A parquet file. The first row has number 2, as in a table with one row of headings.

    all_different : headings of columns whose texts are likely to be all different
    Raises CohortError where the file is damaged, holds nested columns, or has no rows.
    """
    try:
        schema = pyarrow.parquet.read_schema(pa.BufferReader(data))
        _check_schema(schema, file)
        texts = [field.name for field in schema if is_text_type(field.type) and field.name not in all_different]
        table = pyarrow.parquet.read_table(pa.BufferReader(data), read_dictionary=texts)
        table.validate(full=True)  # a damaged file can hold bytes that are no text
    except (pa.ArrowException, OSError) as error:
        raise CohortError(
            f"{file}: the parquet file is damaged ({str(error).splitlines()[0]})", "export it again"
        ) from None
    headings, columns = clean_headings(table.column_names, table.columns, file)
    return RawTable(file, headings, columns, np.arange(2, len(table) + 2), typed=True)
