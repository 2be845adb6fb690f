"""What a person is told when a cluster cannot be used: in words, soon, and without a record being touched."""

from __future__ import annotations

import os
import re
import socket
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest
from small_cluster import ROOT, Cluster, told, until

from geometry.problem import SpecError
from studies.cli import main
from studies.record import Record
from studies.vary.cluster import Tls, cluster
from studies.vary.run import vary


def _free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as server:
        return int(server.getsockname()[1])


@pytest.fixture
def room(small, tmp_path, monkeypatch) -> Path:
    small.make_plan(tmp_path)
    (tmp_path / "bars.toml").write_text('title = "Bars"\npart = "bar.toml"\n[vary]\nwidth = ["18 mm", "22 mm"]\n'
                                        '[aim]\nleast = "mass"\n')
    monkeypatch.chdir(tmp_path)
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        monkeypatch.setenv(name, "1")
    return tmp_path


def test_connection_refused(room, capfd, monkeypatch):
    address = f"tcp://127.0.0.1:{_free_port()}"
    words = ["vary", "bars.toml", "--on", address, "--quiet"]
    monkeypatch.setattr(sys, "argv", ["haunch", *words])
    assert main(words) == 3
    out, err = capfd.readouterr()
    assert out == "" and re.fullmatch(
        f"haunch: nothing listens at {address} \\(connection refused\\): is the scheduler running there\\? It prints "
        r"its address when it starts. 0 points are done and in \S*bars.study; the same command goes on where this one "
        f"stopped:\n  haunch vary bars.toml --on {address} --quiet\n", err), err
    with Record.open(room / "bars.study") as record:
        assert record.progress().finished == 0


def test_no_machine_of_that_name(room):
    said = told(lambda: cluster("tcp://no-such-machine.invalid:8786")(lambda text: None))
    assert said.startswith("no machine of the name 'no-such-machine.invalid' is known here")


@pytest.mark.parametrize("address", ["", "127.0.0.1:8786", "http://127.0.0.1:8786", "tcp://127.0.0.1", "tcp://:8786",
                                     "tcp://127.0.0.1:0", "tcp://127.0.0.1:99999", "tcp://127.0.0.1:x",
                                     "tcp://127.0.0.1:8786/status", "tcp://me@127.0.0.1:8786"])
def test_what_is_no_address_is_a_mistake_of_the_command_line(address):
    with pytest.raises(SpecError) as error:
        cluster(address)
    assert [problem.path for problem in error.value.problems] == ["--on"]
    assert "tcp://HOST:PORT" in error.value.problems[0].allowed


def test_mistakes_are_told_before_there_is_a_record(room, capsys):
    assert main(["vary", "bars.toml", "--on", "tcp://127.0.0.1:8786", "--tls-ca", "none.pem"]) == 2
    said = capsys.readouterr().err
    assert "3 mistakes in the command line" in said and "none.pem" in said
    assert "Give --tls-cert too" in said and "Write tls://127.0.0.1:8786" in said
    assert not (room / "bars.study").exists()


def test_missing_package(room):
    """In a process in which dask and distributed are not there."""
    block = ("import sys\n"
             "class Missing:\n"
             "    def find_spec(self, name, path=None, target=None):\n"
             "        if name.partition('.')[0] in ('dask', 'distributed'):\n"
             "            raise ModuleNotFoundError(f'No module named {name!r}', name=name)\n"
             "sys.meta_path.insert(0, Missing())\n"
             "from studies.cli import main\n"
             "sys.exit(main(sys.argv[1:]))")
    done = subprocess.run([sys.executable, "-c", block, "vary", "bars.toml", "--on", "tcp://127.0.0.1:8786"], cwd=room,
                          env={**os.environ, "PYTHONPATH": str(ROOT)}, capture_output=True, text=True, timeout=60)
    assert (done.returncode, done.stdout) == (3, "")
    assert done.stderr == ("haunch: a study on a cluster needs the package dask.distributed, which is not installed "
                           f"(Haunch's extra `cluster`): {sys.executable} -m pip install 'distributed>=2025.1'\n")
    assert not (room / "bars.study").exists()


@pytest.fixture
def mute() -> Iterator[str]:
    """A port at which something listens that never says a word."""
    with socket.create_server(("127.0.0.1", 0)) as server:
        held: list[socket.socket] = []

        def accept() -> None:
            try:
                while True:
                    held.append(server.accept()[0])
            except OSError:
                pass

        threading.Thread(target=accept, daemon=True).start()
        yield f"tcp://127.0.0.1:{server.getsockname()[1]}"
        for line in held:
            line.close()


@pytest.mark.heavy
def test_what_listens_is_no_scheduler(mute, capfd):
    import distributed  # noqa: F401 - loading it is not what is timed

    said = told(lambda: cluster(mute)(lambda text: None))
    assert said.startswith(f"something listens at {mute}, but it does not answer as a Dask scheduler does")
    assert capfd.readouterr() == ("", "")


@pytest.mark.heavy
def test_nothing_of_dask_on_the_terminal():
    """Whatever its parts log, after `be_quiet`; before, the same is shown."""
    log = ("import logging, sys, distributed\n"
           "from studies.vary.cluster.quiet import be_quiet\n"
           "def log(text):\n"
           "    for name in ('distributed.client', 'distributed.comm.tcp', 'distributed', 'tornado.application',\n"
           "                 'asyncio'):\n"
           "        logging.getLogger(name).error('%s of %s', text, name)\n"
           "log('loud')\nbe_quiet()\nlog('quiet')")
    done = subprocess.run([sys.executable, "-c", log], env={**os.environ, "PYTHONPATH": str(ROOT)}, timeout=60,
                          capture_output=True, text=True)
    assert done.returncode == 0 and done.stderr.count("loud of") == 5 and "quiet" not in done.stderr + done.stdout


def _certificates(room: Path, name: str) -> Tls:
    """A certificate of a fresh authority of that name."""
    room.mkdir()

    def openssl(*words: str) -> None:
        subprocess.run(["openssl", *words], cwd=room, check=True, capture_output=True, timeout=30)

    new = ["req", "-newkey", "ec", "-pkeyopt", "ec_paramgen_curve:P-256", "-nodes"]
    openssl(*new, "-x509", "-days", "2", "-subj", f"/CN={name}", "-keyout", "ca.key", "-out", "ca.pem")
    openssl(*new, "-subj", "/CN=bars", "-keyout", "key.pem", "-out", "request.pem")
    openssl("x509", "-req", "-in", "request.pem", "-CA", "ca.pem", "-CAkey", "ca.key", "-CAcreateserial", "-days", "2",
            "-out", "cert.pem")
    return Tls(*(str(room / f"{file}.pem") for file in ("ca", "cert", "key")))


@pytest.mark.heavy
def test_tls(small, tmp_path, capfd, monkeypatch):
    """A study over TLS, with files given and with Dask's own configuration; and each way in which the two sides do not
    agree, in words."""
    ours, other = _certificates(tmp_path / "ours", "ours"), _certificates(tmp_path / "other", "other")
    words = ("--tls-ca-file", ours.ca, "--tls-cert", ours.cert, "--tls-key", ours.key)
    room = tmp_path / "room"
    with Cluster(room, *words) as secure:
        assert secure.address.startswith("tls://")
        secure.worker("bars")

        def make(tls: Tls | None, address: str = secure.address) -> str:
            return told(lambda: cluster(address, tls)(lambda text: None))

        assert "is not signed by one of --tls-ca" in make(Tls(other.ca, ours.cert, ours.key))
        assert "does not accept the certificate of --tls-cert" in make(Tls(ours.ca, other.cert, other.key))
        assert "the key must be that of the certificate" in make(Tls(ours.ca, ours.cert, other.key))
        assert "wants certificates: give --tls-ca" in make(None)
        assert "Was it started for tls://?" in make(None, secure.address.replace("tls", "tcp"))
        plan = small.make_plan(room)
        assert vary(plan, room / "bars.study", on=secure.address, tls=ours).done == 12
        import dask

        with dask.config.set({"distributed.comm.tls.ca-file": ours.ca, "distributed.comm.tls.client.cert": ours.cert,
                              "distributed.comm.tls.client.key": ours.key}):
            assert vary(plan, room / "more.study", on=secure.address).done == 12
    with Cluster(tmp_path / "plain") as plain:
        said = told(lambda: cluster(plain.address.replace("tcp", "tls"), ours)(lambda text: None))
        assert "it does not speak TLS. Was the scheduler started without?" in said
    assert capfd.readouterr().err == ""


@pytest.mark.heavy
def test_workers_that_differ_are_refused(small, tmp_path, bare):
    """With what differs; and the study stops where there is no other. One that fits is used."""
    for preload in ("later_version", "without_haunch"):
        bare.worker(("bars", preload) if preload == "later_version" else preload)
    until(lambda: all("Registered to" in text for text in bare.said("worker")))
    plan = small.make_plan(tmp_path)
    began = time.monotonic()
    said = told(lambda: vary(plan, tmp_path / "bars.study", on=bare.address))
    assert time.monotonic() - began < 15.0
    assert "is refused: its numbers would not be comparable: the version of Haunch's results 99 there, 2 here." in said
    assert re.search(r"is refused: it cannot load Haunch \(ModuleNotFoundError.*No module named ..?studies", said), said
    assert "0 points are done" in said
    bare.worker("bars")
    until(lambda: all("Registered to" in text for text in bare.said("worker")))
    notes: list[str] = []
    summary = vary(plan, tmp_path / "bars.study", on=bare.address,
                   listener=lambda what: notes.append(getattr(what, "text", "")))
    assert summary.done == 12
    assert sum("is refused" in note for note in notes) == 2 and sum("takes part" in note for note in notes) == 1


@pytest.mark.heavy
def test_scheduler_without_haunch(small, tmp_path):
    """It reads what it passes on. No variant is blamed for it."""
    with Cluster(tmp_path, preload="without_haunch") as bare:
        bare.worker("bars")
        until(lambda: all("Registered to" in text for text in bare.said("worker")))
        said = told(lambda: vary(small.make_plan(tmp_path), tmp_path / "bars.study", on=bare.address))
    assert "does not pass the work on to its workers" in said and "Is Haunch installed where the scheduler" in said
    assert "0 points are done" in said


@pytest.mark.heavy
def test_nothing_is_evaluated_twice_whatever_dask_repeats(small, tmp_path):
    """A group is for one process of a worker, and is begun there once."""
    import json

    from distributed import Client

    from studies.vary.cluster import worker as remote
    from studies.vary.cluster.answers import write_group
    from studies.vary.work import Order

    order = Order(next(iter(small.make_plan(tmp_path).variants())))
    with Cluster(tmp_path) as one:
        one.worker("bars")
        until(lambda: all("Registered to" in text for text in one.said("worker")))
        with Client(one.address, set_as_default=False) as client:
            (process,) = client.run(remote.beat, "us").values()

            def ask(group: str, process: str) -> dict[str, object]:
                text = write_group([order], driver="us", group=group, process=process, threads="1")
                answer: dict[str, object] = json.loads(client.submit(remote.evaluate, text, pure=False).result(60))
                return answer

            assert "ends" in ask("first", process)
            assert ask("first", process) == {"refused": "the worker was given it twice"}
            assert ask("second", "another") == {"refused": "the worker's process has ended"}
            client.run(remote.stop, "us")
            ends = ask("third", process)["ends"]
            assert [end["ended"]["signal"] for end in ends] == ["closed"]
    assert (tmp_path / "started").read_text().count("\n") == 1
