"""The way out of a damaged record, as its message names it."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace

import pytest

from studies.cli.main import main
from studies.record import Record, RecordDamagedError


def test_the_command_of_the_message_saves_what_is_whole(tmp_path: Path, study: SimpleNamespace,
                                                        capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        for number in range(1, 11):
            record.add(study.variant(number), study.outcome(number))
    data = bytearray(path.read_bytes())
    data[data.index(b"no mesh at 7")] ^= 1
    path.write_bytes(data)
    with pytest.raises(RecordDamagedError) as found:
        Record.open(path)
    command = str(found.value).split("haunch ")[1].split(",")[0].split()
    assert main(command) == 0
    assert capsys.readouterr().out.startswith(f"9 variants are in {command[2]}; 1 had been changed")
    with Record.open(command[2]) as record:
        assert [row["status"] for row in record.table()].count("waiting") == 1
    assert main(command) == 3
    assert "exists already" in capsys.readouterr().err
