"""Reads chain.parquet and chain.csv of a run directory with polars and compares them to the last digit.

Run by the test `parquet` where ODDWELL_PYTHON names a Python that has polars (1.0 or later); prints the number of
numbers compared.
"""

import json
import sys
from pathlib import Path

import polars as pl

run = Path(sys.argv[1])
columns = pl.read_parquet(run / "chain.parquet")
text = pl.read_csv(run / "chain.csv", infer_schema_length=None)
assert columns.columns == text.columns, (columns.columns, text.columns)
assert columns.height == text.height > 0
for name in columns.columns:
    one, other = columns[name].to_list(), text[name].to_list()
    # Doubles that are equal print the same shortest digits; -0.0 is not 0.0.
    assert list(map(repr, map(lambda x: x if x is None else float(x), one))) == list(
        map(repr, map(lambda x: x if x is None else float(x), other))
    ), name
metadata = pl.read_parquet_metadata(run / "chain.parquet")
units = json.loads(metadata["oddwell.units"])
descriptions = json.loads(metadata["oddwell.descriptions"])
assert set(descriptions) == set(columns.columns)
assert set(units) <= set(columns.columns)
print(columns.height * columns.width)
