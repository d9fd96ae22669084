"""Compares a review's Parquet file with the records of `tautline assess`, value by value, by pyarrow and by DuckDB.

    pip install pyarrow duckdb
    tautline assess --config config/demo.toml replay-data/demo-day.jsonl.zst > records.jsonl
    tautline review --config config/demo.toml replay-data/demo-day.jsonl.zst --parquet rows
    python tests/review/read_parquet.py records.jsonl rows/2031-03-14.parquet

It says how many rows and values agree, and fails at the first that does not.
"""

import json
import sys
from datetime import datetime, timezone

import duckdb
import pyarrow.parquet as pq

PLAIN = """corridor state exporter transfer_mw bus_angle_deg internal_angle_deg swing_angle_deg headroom_mw headroom_sd_mw
    minutes_to_thin minutes_to_spent thin_mw""".split()
OF_OUTAGE = "angle_margin_deg swing_peak_deg area_margin critical_ms loading_pct".split()
OF_SOURCE = "r_ohm x_ohm r_sd x_sd basis steps".split()


def expected(record):
    """The row of a record."""
    row = {column: record[column] for column in PLAIN}
    row["time"] = datetime.fromisoformat(record["time"].replace("Z", "+00:00")).astimezone(timezone.utc)
    binding = record["binding"] or {"outage": None, "criterion": None}
    row["binding_outage"], row["binding_criterion"] = binding["outage"], binding["criterion"]
    outage = next((o for o in record["outages"] if o["name"] == binding["outage"]), {})
    row |= {f"binding_{column}": outage.get(column) for column in OF_OUTAGE}
    for side, (bus, source) in zip(("from", "to"), record["sources"].items()):
        row[f"{side}_bus"] = bus
        row |= {f"{side}_{column}": source[column] for column in OF_SOURCE}
    fit = record["fit"]
    row |= {"fit_chi2": fit["chi2"], "fit_dof": fit["dof"], "fit_limit": fit["limit"]}
    row |= {column: fit[column] for column in ("suspects", "missing", "assumed")}
    row["peak_mw"] = record["intact"]["peak_mw"] if record["intact"] else None
    return row


def main(records, rows):
    by_pyarrow = {(row["corridor"], row["time"]): row for row in pq.read_table(rows).to_pylist()}
    values = 0
    with open(records, encoding="utf-8") as lines:
        count = 0
        for line in lines:
            row = expected(json.loads(line))
            found = by_pyarrow.pop((row["corridor"], row["time"]))
            assert set(row) <= set(found), set(row) - set(found)
            for column, value in row.items():
                assert found[column] == value, (row["corridor"], row["time"], column, value, found[column])
            count, values = count + 1, values + len(row)
    assert not by_pyarrow, f"{len(by_pyarrow)} rows without a record"
    print(f"pyarrow: {count} rows, {values} values, all as in the records")

    connection = duckdb.connect()
    table = connection.read_parquet(rows)
    least, total, blind = table.aggregate("min(headroom_mw), count(*), count(*) - count(headroom_mw)").fetchall()[0]
    with open(records, encoding="utf-8") as lines:
        headrooms = [json.loads(line)["headroom_mw"] for line in lines]
    assert total == len(headrooms) and blind == headrooms.count(None), (total, blind)
    assert least == min(mw for mw in headrooms if mw is not None), least
    print(f"DuckDB: {total} rows, least headroom {least} MW, {blind} blind")


if __name__ == "__main__":
    main(*sys.argv[1:])
