"""What Python's csv module and pandas read from table_names.csv.

Writes table_names.json. The table is made by a test in tests/report/table.rs, which says
where it lies; where columns have changed it is copied here first:

    cargo test --test report other_readers
    cp target/tmp/table_names.csv tests/reference/
    python3 tests/reference/read_table.py

Last run with Python 3.11.7 and pandas 3.1.1.
"""
import csv
import json
import pathlib

import pandas

here = pathlib.Path(__file__).parent
table = here / "table_names.csv"

with open(table, newline="", encoding="utf-8") as file:
    rows = list(csv.DictReader(file, strict=True))
by_csv = {"path": [row["path"] for row in rows], "before_dbfs": [float(row["before_dbfs"]) for row in rows]}

frame = pandas.read_csv(table)
by_pandas = {"path": frame["path"].tolist(), "before_dbfs": frame["before_dbfs"].tolist()}

text = json.dumps({"csv": by_csv, "pandas": by_pandas}, indent=1)
(here / "table_names.json").write_text(text + "\n", encoding="utf-8")
