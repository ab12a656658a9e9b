"""Builds by a Dask cluster of real processes: the same bytes, and a clear word where it fails."""

from __future__ import annotations

import json
import os
import re
import signal
import socket
import subprocess
import sys
import threading
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

import etl
from etl.session import cluster as cluster_module
from tests.cluster.local_cluster import PATIENCE_S, LocalCluster, until
from tests.end_to_end.building import copied_sample, tables_of
from tests.end_to_end.running import command, environment, run
from tests.pseudonyms.searching import ask_for_pseudonyms
from tests.simulator import write_bulk_study

pytest.importorskip("distributed", reason="the libraries of trialwright[cluster] are not installed")
pytestmark = [
    pytest.mark.slow,
    # Dask's own: what it does in its threads is none of our warnings.
    pytest.mark.filterwarnings("default"),
]


@pytest.fixture(scope="module")
def cluster(tmp_path_factory: pytest.TempPathFactory) -> Iterator[LocalCluster]:
    """A cluster of two workers, which no test harms."""
    with LocalCluster(tmp_path_factory.mktemp("shared") / "cluster") as made:
        yield made


@pytest.fixture
def study_file(tmp_path: Path) -> Path:
    """A small study of eight logs."""
    made = write_bulk_study(tmp_path / "lab", readers=8, trials=5, fixations=9, regions=4)
    return made.study_file


def build(study_file: Path, into: Path, **options: object) -> dict[str, bytes]:
    """Build, and give every file; how long it took is no part of it."""
    folder = etl.build(etl.load_study(study_file), into=into, **options).folder  # type: ignore[arg-type]
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    del record["elapsed_s"]
    for name in [name for name in record["sha256"] if name.endswith("run.json")]:
        del record["sha256"][name]
    return {**tables_of(folder), "run.json": json.dumps(record).encode()}


def refused(study_file: Path, address: str) -> str:
    """What a build says that the cluster cannot do; nothing may be left by it."""
    before = sorted(study_file.parent.iterdir())
    with pytest.raises(etl.ClusterError) as told:
        etl.build(etl.load_study(study_file), scheduler=address)
    assert sorted(study_file.parent.iterdir()) == before
    return str(told.value)


class Meanwhile:
    """A build in a thread of its own."""

    def __init__(self, work: Callable[[], object]) -> None:
        self.result: object = None
        self._work = work
        self._thread = threading.Thread(target=self._run)
        self._thread.start()

    def _run(self) -> None:
        try:
            self.result = self._work()
        except Exception as error:
            self.result = error

    def ended(self) -> object:
        """What became of it."""
        self._thread.join(PATIENCE_S)
        assert not self._thread.is_alive()
        if isinstance(self.result, Exception) and not isinstance(self.result, etl.InputError):
            raise self.result
        return self.result


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_cluster_writes_the_same_bytes(name: str, cluster: LocalCluster, tmp_path: Path) -> None:
    """What one process writes, also when it finds what that one kept."""
    study_file = copied_sample(name, tmp_path, rules=None)
    alone = build(study_file, tmp_path / "alone", keep=False)
    assert build(study_file, tmp_path / "made", scheduler=cluster.address) == alone
    assert len(cluster.did()) == 2
    # Once more, from what it kept itself; and one process from what the cluster kept.
    assert build(study_file, tmp_path / "made", scheduler=cluster.address) == alone
    assert build(study_file, tmp_path / "made") == alone
    assert cluster.left() == []


def test_pseudonyms_by_a_cluster(cluster: LocalCluster, tmp_path: Path) -> None:
    """Readers with pseudonyms: the same bytes, and the same file that says whose they are."""
    study_file = ask_for_pseudonyms(copied_sample("orchard", tmp_path))
    alone = build(study_file, tmp_path / "alone", keep=False)
    keys = {path.name: path.read_bytes() for path in study_file.parent.glob("*_pseudonyms.csv")}
    assert len(keys) == 1
    assert build(study_file, tmp_path / "made", scheduler=cluster.address) == alone
    for name, data in keys.items():
        assert (study_file.parent / name).read_bytes() == data
    # No id of a reader stands in what the workers and the scheduler write down for themselves.
    for path in cluster.folder.glob("*.log"):
        assert not re.search(rb"\bP\d\d\b", path.read_bytes()), path.name


def test_two_builds_on_one_cluster(cluster: LocalCluster, study_file: Path, tmp_path: Path) -> None:
    """Neither disturbs the other."""
    alone = build(study_file, tmp_path / "alone", keep=False)
    address = cluster.address
    one, other = (
        Meanwhile(lambda name=name: build(study_file, tmp_path / name, scheduler=address))  # type: ignore[misc]
        for name in ("one", "other")
    )
    assert one.ended() == alone
    assert other.ended() == alone
    assert cluster.left() == []


def test_wrong_input_is_told_as_by_one_process(cluster: LocalCluster, study_file: Path) -> None:
    """The same messages and the same status, and nothing left."""
    log = sorted((study_file.parent / "logs").iterdir())[3]
    lines = log.read_text(encoding="utf-8").splitlines()
    lines[4] = re.sub(r"\d+", "abc", lines[4])
    log.write_text("\n".join(lines) + "\n", encoding="utf-8")
    before = sorted(study_file.parent.iterdir())
    here = run("build", study_file, "--workers", "1")
    there = run("build", study_file, "--scheduler", cluster.address)
    assert (there.status, there.err, there.out) == (2, here.err, here.out)
    assert log.name in there.err
    assert sorted(study_file.parent.iterdir()) == before
    assert cluster.left() == []


def test_killed_worker_is_replaced_by_another(tmp_path: Path, study_file: Path) -> None:
    """What a worker had that is killed in the middle, another does; a late one helps."""
    alone = build(study_file, tmp_path / "alone", keep=False)
    with LocalCluster(tmp_path / "cluster") as cluster:
        cluster.hold()
        going = Meanwhile(lambda: build(study_file, tmp_path / "made", scheduler=cluster.address))
        until(lambda: len(cluster.held()) == 2)
        late = cluster.add_worker()
        until(lambda: len(cluster.workers_there()) == 3)
        for number in cluster.held():
            if number != late:
                cluster.kill(number)
        cluster.release()
        assert going.ended() == alone
        assert late in cluster.did()
        assert cluster.left() == []


def test_late_worker_that_is_not_fit_is_told_of(tmp_path: Path, study_file: Path) -> None:
    """A worker that joins in the middle must see the files too."""
    with LocalCluster(tmp_path / "cluster", 1) as cluster:
        cluster.hold()
        going = Meanwhile(lambda: build(study_file, tmp_path / "made", scheduler=cluster.address))
        until(cluster.held)
        cluster.add_worker('cluster_work.MARK = "not there"\n')
        until(lambda: len(cluster.workers_there()) == 2)
        for number in cluster.held():
            cluster.kill(number)
        cluster.release()
        told = going.ended()
    assert isinstance(told, etl.ClusterError)
    assert "the worker cannot read a file of this build (No such file or directory)" in str(told)
    assert not (tmp_path / "made").exists()


def test_all_workers_gone(
    tmp_path: Path, study_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A build does not wait for ever for workers."""
    monkeypatch.setattr(cluster_module, "_NO_WORKER_S", 1.0)
    with LocalCluster(tmp_path / "cluster", 1) as cluster:
        cluster.hold()
        before = sorted(study_file.parent.iterdir())
        going = Meanwhile(
            lambda: build(study_file, study_file.parent / "out", scheduler=cluster.address)
        )
        until(cluster.held)
        cluster.kill(cluster.held()[0])
        told = going.ended()
        assert isinstance(told, etl.ClusterError)
        assert str(told) == (
            f"{cluster.address}: all workers of the cluster have gone; expected one or more\n"
            "    fix: see why in their logs, start workers, and build again\n"
            "1 problem; nothing was written"
        )
        assert sorted(study_file.parent.iterdir()) == before
        assert cluster.left() == []
        monkeypatch.setattr(cluster_module, "_CONNECT_S", 3.0)
        assert "the cluster has no worker; expected one or more" in refused(
            study_file, cluster.address
        )


def test_scheduler_gone(tmp_path: Path, study_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Nor for a scheduler."""
    monkeypatch.setattr(cluster_module, "_CONNECT_S", 5.0)
    with LocalCluster(tmp_path / "cluster", 1) as cluster:
        cluster.hold()
        going = Meanwhile(lambda: build(study_file, tmp_path / "made", scheduler=cluster.address))
        until(cluster.held)
        cluster.kill(cluster.scheduler)
        told = going.ended()
    assert isinstance(told, etl.ClusterError)
    assert "the connection to the cluster was lost" in str(told)


def test_task_that_kills_its_workers(tmp_path: Path, study_file: Path) -> None:
    """What no worker survives ends with the name of the log."""
    dying = """
def dies(stage, task):
    if any(getattr(one, "number", 0) == 2 for one in task):
        os._exit(1)
    return do_task(stage, task)
cluster_work.do_task = dies
"""
    settings = {"DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "1"}
    with LocalCluster(tmp_path / "cluster", 3, dying, **settings) as cluster:
        told = refused(study_file, cluster.address)
    assert re.search(
        r"2 workers ended one after the other while they had the logs? logs/[^\n]+\n"
        r"    fix: see what their logs say\. Most often memory is too small",
        told,
    )


#: What is wrong with a worker, in Python before it begins, and how it is told.
UNFIT = {
    "files of the program": """
cluster_work.program_digest = lambda: "another"
""",
    "version": """
cluster_work.metadata = type("Old", (), {
    "version": lambda name: "1.2.3", "PackageNotFoundError": KeyError
})
""",
    "folder": """
cluster_work.MARK = "not there"
""",
    "study file": """
real_stat = Path.stat
def stat(self, **options):
    if self.name == "study.toml":
        raise PermissionError(13, "Permission denied")
    return real_stat(self, **options)
Path.stat = stat
""",
    "read-only": """
real_touch = Path.touch
def touch(self, **options):
    if self.name.startswith("cluster.mark"):
        raise OSError(30, "Read-only file system")
    real_touch(self, **options)
Path.touch = touch
""",
}
_OTHER = "the worker runs another version, and could write other bytes: "
TOLD = {
    "files of the program": _OTHER + "other files of trialwright under the same version; expected",
    "version": _OTHER + "trialwright 1.2.3; numpy 1.2.3; ",
    "folder": "the worker cannot read a file of this build (No such file or directory): /",
    "study file": "the worker cannot read a file of this build (Permission denied): /",
    "read-only": "the worker cannot write where the build works (Read-only file system): /",
}


@pytest.mark.parametrize("kind", UNFIT)
def test_unfit_worker_is_refused(tmp_path: Path, study_file: Path, kind: str) -> None:
    """One worker that cannot work for the build is named before anything is done."""
    with LocalCluster(tmp_path / "cluster", 1, UNFIT[kind]) as cluster:
        told = refused(study_file, cluster.address)
        assert cluster.did() == []
    place = rf"{re.escape(cluster.address)}: worker on \S+, process \d+: "
    assert re.match(place + re.escape(TOLD[kind]), told), told
    assert "\n    fix: " in told


def test_nothing_at_the_address(study_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Neither a closed door nor one behind which nobody speaks holds a build up."""
    monkeypatch.setattr(cluster_module, "_CONNECT_S", 2.0)
    with socket.socket() as mute:
        mute.bind(("127.0.0.1", 0))
        mute.listen()
        addresses = [
            "tcp://127.0.0.1:1",
            f"tcp://127.0.0.1:{mute.getsockname()[1]}",
            "nonsense://x",
        ]
        for address in addresses:
            told = refused(study_file, address)
            assert told.startswith(f"{address}: no Dask scheduler answers here ("), told
            assert "expected the address of one that runs" in told


def test_refused_address_leaves_no_word_of_others(study_file: Path) -> None:
    """What the libraries say while they give up stays out of the message."""
    ran = run("build", study_file, "--scheduler", "tls://127.0.0.1:1")
    assert ran.status == 2
    assert ran.err.startswith("tls://127.0.0.1:1: no Dask scheduler answers here (")
    assert ran.err.endswith("1 problem; nothing was written\n")
    assert len(ran.err.splitlines()) == 3


def test_library_is_not_installed(study_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The message says what to install."""
    monkeypatch.setitem(sys.modules, "distributed", None)
    told = refused(study_file, "tcp://127.0.0.1:1")
    assert 'fix: install it with: pip install "trialwright[cluster]"' in told


@pytest.mark.skipif(os.name != "posix", reason="signals are sent otherwise on this system")
def test_interrupted_build_leaves_nothing(tmp_path: Path, study_file: Path) -> None:
    """Neither files nor work on the cluster, which is of use afterwards."""
    alone = build(study_file, tmp_path / "alone", keep=False)
    with LocalCluster(tmp_path / "cluster") as cluster:
        before = sorted(study_file.parent.iterdir())
        cluster.hold()
        process = subprocess.Popen(
            command("build", study_file, "--scheduler", cluster.address),
            env=environment(),
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
        )
        until(lambda: len(cluster.held()) == 2)
        process.send_signal(signal.SIGINT)
        _, said = process.communicate(timeout=PATIENCE_S)
        assert process.returncode not in (0, 2)
        assert b"Traceback" not in said
        # What the workers were at comes too late now, and must find no place to write to.
        cluster.release()
        until(lambda: cluster.left() == [])
        assert sorted(study_file.parent.iterdir()) == before
        assert build(study_file, tmp_path / "made", scheduler=cluster.address) == alone
        assert sorted(study_file.parent.iterdir()) == before


def test_workers_and_scheduler_exclude_each_other(study_file: Path) -> None:
    """Who counts processes of this computer does not mean a cluster."""
    ran = run("build", study_file, "--workers", "2", "--scheduler", "tcp://127.0.0.1:1")
    assert ran.status == 2
    assert "leave one of them out" in ran.err
    with pytest.raises(ValueError, match="with a scheduler it starts none"):
        etl.build(etl.load_study(study_file), workers=2, scheduler="tcp://127.0.0.1:1")


def test_only_builds_on_a_cluster_load_what_speaks_to_it(study_file: Path) -> None:
    """Others do not pay for it."""
    code = (
        "import sys, etl\n"
        "etl.build(etl.load_study(sys.argv[1]))\n"
        "assert not {'distributed', 'dask', 'tornado'} & sys.modules.keys()\n"
    )
    subprocess.run([sys.executable, "-c", code, str(study_file)], env=environment(), check=True)
