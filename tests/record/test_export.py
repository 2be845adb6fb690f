"""The table for other programs, read back equal."""

from __future__ import annotations

import dataclasses
import sqlite3
from pathlib import Path
from types import SimpleNamespace

import pandas
import pandas.testing
import pyarrow.parquet
import pytest

from studies.record import Record, RecordError
from studies.record.export import export_csv, export_parquet, frame


@pytest.fixture
def record(tmp_path: Path, study: SimpleNamespace) -> Record:
    with Record.create(tmp_path / "arm.study", study.plan()) as writer:
        writer.set_points(map(study.variant, range(1, 31)))
        for number in range(1, 29):
            outcome = study.outcome(number)
            if number == 7:
                outcome = dataclasses.replace(outcome, reason='no "mesh",\nat é; =1+1')
            writer.add(study.variant(number), outcome)
    return Record.open(tmp_path / "arm.study")


def test_parquet_is_read_back_equal(tmp_path: Path, record: Record) -> None:
    assert export_parquet(record, tmp_path / "arm.parquet") == 30
    back = pandas.read_parquet(tmp_path / "arm.parquet", dtype_backend="numpy_nullable")
    pandas.testing.assert_frame_equal(back, frame(record), check_exact=True)
    kinds = {field.name: str(field.type) for field in pyarrow.parquet.read_schema(tmp_path / "arm.parquet")}
    assert (kinds["number"], kinds["fine"], kinds["mass"]) == ("int64", "bool", "double")
    assert "string" in kinds["hold"]


def test_csv_is_read_back_equal(tmp_path: Path, record: Record) -> None:
    assert export_csv(record, tmp_path / "arm.csv") == 30
    wanted = frame(record)
    back = pandas.read_csv(tmp_path / "arm.csv", keep_default_na=False, na_values=[""],
                           dtype=wanted.dtypes.to_dict())
    text = [name for name in wanted if wanted[name].dtype == "string"]
    back[text] = back[text].fillna("")
    wanted[text] = wanted[text].fillna("")  # in CSV a text that is not there is an empty one
    pandas.testing.assert_frame_equal(back, wanted, check_exact=True)
    assert (tmp_path / "arm.csv").read_bytes().startswith(b"study,number,status,judgement,fine,")


def test_the_table_is_that_of_the_database(tmp_path: Path, record: Record, study: SimpleNamespace) -> None:
    db = sqlite3.connect(record.path)
    direct = pandas.read_sql("select * from results", db)
    db.close()
    table = frame(record)
    assert list(direct) == list(table)
    for name in direct:
        assert direct[name].isna().equals(table[name].isna())
        assert list(direct[name].dropna()) == list(table[name].dropna())
    assert table["mass"][2] == study.outcome(3).figures["mass"].solid


def test_a_study_without_points_has_a_table_without_rows(tmp_path: Path, study: SimpleNamespace) -> None:
    with Record.create(tmp_path / "empty.study", study.plan()) as record:
        assert export_csv(record, tmp_path / "empty.csv") == export_parquet(record, tmp_path / "empty.parquet") == 0
    header = (tmp_path / "empty.csv").read_text().strip()
    assert header.endswith(",key,hold,root_depth")
    assert header == ",".join(pandas.read_parquet(tmp_path / "empty.parquet"))


def test_an_existing_file_and_a_folder_that_cannot_be_written_in(tmp_path: Path, record: Record) -> None:
    there = tmp_path / "arm.csv"
    there.write_text("mine")
    for export in (export_csv, export_parquet):
        with pytest.raises(RecordError, match="exists already"):
            export(record, there)
        with pytest.raises(RecordError, match="cannot write"):
            export(record, tmp_path / "none" / "arm.csv")
        with pytest.raises(RecordError, match="exists already"):
            export(record, tmp_path, replace=True)
    assert there.read_text() == "mine"
    export_csv(record, there, replace=True)
    assert there.read_text().startswith("study,")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["arm.csv", "arm.study", "arm.study-shm", "arm.study-wal"]
