"""Writing a result: the old file or the new one, whole, whatever happens on the way."""

import errno
import os
import resource
import signal
import stat
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import pytest

from soiltemp import netcdf, sealed_netcdf, whole_file
from soiltemp.errors import DataFileError, InputError
from soiltemp.netcdf import open_result, save
from tests.helpers.results import bare_result

ROOT = Path(__file__).parent.parent


@pytest.fixture(scope="module")
def result():
    return bare_result()


def leftovers(folder):
    return sorted(entry.name for entry in folder.iterdir() if entry.name.endswith(".part"))


@pytest.fixture
def old_file(result, tmp_path):
    path = tmp_path / "result.nc"
    save(result.assign_attrs(run="old"), path)
    return path


@pytest.mark.parametrize("stage", ["write", "fsync", "replace"])
@pytest.mark.parametrize("code", [errno.ENOSPC, errno.EIO, errno.EACCES])
def test_a_failure_leaves_the_old_file_and_no_litter(result, old_file, monkeypatch, stage, code):
    before = old_file.read_bytes()

    def fail(*_arguments):
        raise OSError(code, os.strerror(code))

    if stage == "write":
        real = open

        def opened(place, mode):
            file = real(place, mode)
            file.write(b"half")
            file.close()
            return fail()

        monkeypatch.setattr(whole_file, "open", opened, raising=False)
    else:
        monkeypatch.setattr(whole_file.os, stage, fail)
    with pytest.raises(DataFileError) as caught:
        save(result, old_file)
    monkeypatch.undo()
    assert str(caught.value).startswith(f'path "{old_file}": found {os.strerror(code).lower()} (the file needs 0.')
    assert str(caught.value).endswith("choose another folder; a file of that name is as it was.")
    assert old_file.read_bytes() == before
    assert sorted(old_file.parent.iterdir()) == [old_file]


def test_interrupt_leaves_the_old_file_and_no_litter(result, old_file, monkeypatch):
    def interrupt(_handle):
        raise KeyboardInterrupt

    before = old_file.read_bytes()
    monkeypatch.setattr(whole_file.os, "fsync", interrupt)
    with pytest.raises(KeyboardInterrupt):
        save(result, old_file)
    assert old_file.read_bytes() == before
    assert sorted(old_file.parent.iterdir()) == [old_file]


def test_data_are_on_the_disk_before_the_rename_and_the_rename_after_it(result, tmp_path, monkeypatch):
    calls = []
    sync, replace = os.fsync, os.replace
    kinds = {True: "folder", False: "file"}

    def watched_sync(handle):
        calls.append(f"sync {kinds[stat.S_ISDIR(os.fstat(handle).st_mode)]}")
        sync(handle)

    def watched_replace(source, target):
        calls.append("replace")
        assert os.path.getsize(source) > 10_000
        assert Path(source).parent == Path(target).parent
        replace(source, target)

    monkeypatch.setattr(whole_file.os, "fsync", watched_sync)
    monkeypatch.setattr(whole_file.os, "replace", watched_replace)
    save(result, tmp_path / "a.nc")
    assert calls == ["sync file", "replace", "sync folder"]


@pytest.mark.parametrize("mask", [0o022, 0o077, 0o002])
def test_permissions_follow_the_umask(result, tmp_path, mask):
    before = os.umask(mask)
    try:
        save(result, tmp_path / "a.nc")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "a.nc").stat().st_mode) == 0o666 & ~mask


def test_a_link_is_followed(result, tmp_path):
    store = tmp_path / "store"
    store.mkdir()
    (tmp_path / "link.nc").symlink_to(store / "real.nc")
    save(result, tmp_path / "link.nc")
    assert (tmp_path / "link.nc").is_symlink()
    assert not (store / "real.nc").is_symlink()
    assert open_result(store / "real.nc").attrs == result.attrs


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("folder.nc", "found a folder"),
        ("result.txt", 'found the ending ".txt"'),
        ("result", 'found the ending ""'),
        ("missing/result.nc", "found no folder"),
        ("pipe.nc", "found a device or pipe"),
        ("a\0b.nc", "the path of a file"),
    ],
)
def test_places_that_are_none(result, tmp_path, name, words):
    (tmp_path / "folder.nc").mkdir()
    os.mkfifo(tmp_path / "pipe.nc")
    with pytest.raises(InputError) as caught:
        save(result, f"{tmp_path}/{name}")
    assert words in str(caught.value)
    assert str(caught.value).endswith(".")
    assert leftovers(tmp_path) == []


def test_a_path_that_is_no_text(result):
    with pytest.raises(InputError, match="path: found 3; allowed: the path of a file"):
        save(result, 3)


@pytest.fixture
def ordinary_user():
    """Root may write anywhere: become somebody else for the length of a test."""
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)


def test_a_folder_without_permission(result, request):
    with tempfile.TemporaryDirectory() as name:
        Path(name).chmod(0o555)
        request.getfixturevalue("ordinary_user")
        with pytest.raises(DataFileError, match="found permission denied"):
            save(result, f"{name}/a.nc")
        assert list(Path(name).iterdir()) == []
        if os.getuid() == 0:
            os.seteuid(0)


def test_a_write_protected_file_is_not_replaced(result, request):
    with tempfile.TemporaryDirectory() as name:
        Path(name).chmod(0o777)
        path = Path(name, "a.nc")
        path.write_bytes(b"kept")
        path.chmod(0o444)
        if os.geteuid() == 0:
            # access(2) asks for the real user: let the check see what it sees for another one
            request.getfixturevalue("monkeypatch").setattr(whole_file.os, "access", lambda *_: False)
        with pytest.raises(InputError, match="found a write-protected file"):
            save(result, path)
        assert path.read_bytes() == b"kept"


def _limited(limit, path):
    """Save under a limit of the size of a file, which fails as a full disk does, in another process."""
    script = (
        "import signal, sys; signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "from soiltemp.netcdf import save\n"
        "from soiltemp.errors import DataFileError\n"
        "from tests.helpers.results import bare_result\n"
        "import resource\n"
        "result = bare_result()\n"
        f"resource.setrlimit(resource.RLIMIT_FSIZE, ({limit}, resource.RLIM_INFINITY))\n"
        "try:\n"
        f"    save(result, {str(path)!r})\n"
        "except DataFileError as error:\n"
        "    print(error)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], cwd=ROOT, capture_output=True, text=True, timeout=120, check=False
    )
    assert done.returncode == 0, done.stderr
    return done.stdout.strip()


def test_a_disk_that_takes_no_more(result, old_file):
    assert resource.getrlimit(resource.RLIMIT_FSIZE)[0] == resource.RLIM_INFINITY
    before = old_file.read_bytes()
    # the limit holds for the temporary file too, which the library writes: room for most of it
    text = _limited(len(before) // 2, old_file)
    assert text.startswith("folder for temporary files: found that it takes no file (")
    assert text.endswith("set TMPDIR to another folder.")
    # one byte less than the file with its checksum: the temporary file fits, the last write fails
    text = _limited(len(before) - 1, old_file.with_name("new.nc"))
    assert "found file too large (the file needs 0." in text
    assert old_file.read_bytes() == before
    assert sorted(old_file.parent.iterdir()) == [old_file]


def test_room_for_the_temporary_file_is_looked_at_first(result, tmp_path, monkeypatch):
    usage = sealed_netcdf.shutil.disk_usage(tmp_path)
    monkeypatch.setattr(sealed_netcdf.shutil, "disk_usage", lambda _: usage._replace(free=3_000_000))
    monkeypatch.setattr(netcdf, "_write_file", lambda *_: pytest.fail("the library was asked"))
    with pytest.raises(DataFileError, match=r"takes no file \(3 MB are free, 4 MB may be needed\)"):
        save(result, tmp_path / "a.nc")


# ---- what killed writes leave --------------------------------------------------------------------------------


def test_leftovers_are_swept(result, tmp_path):
    path = tmp_path / "result.nc"
    host = whole_file._host()
    gone = subprocess.Popen([sys.executable, "-c", ""])
    gone.wait()
    names = {
        "of a process that is gone": f".result.nc.{host}-{gone.pid}-0a.part",
        "of a running process": f".result.nc.{host}-{os.getppid()}-0b.part",
        "of a running process, old": f".result.nc.{host}-{os.getppid()}-0c.part",
        "of another machine": f".result.nc.00000000-{gone.pid}-0d.part",
        "of another machine, old": f".result.nc.00000000-{gone.pid}-0e.part",
        "of another result": f".result2.nc.{host}-{gone.pid}-0f.part",
        "of another program": ".result.nc.part",
    }
    for what, name in names.items():
        (tmp_path / name).write_bytes(b"half")
        if what.endswith(", old"):
            os.utime(tmp_path / name, (time.time() - 3700, time.time() - 3700))
    save(result, path)
    kept = {what for what, name in names.items() if (tmp_path / name).exists()}
    assert kept == {"of a running process", "of another machine", "of another result", "of another program"}


KILLED_AT = """
import os, signal, sys
from soiltemp import whole_file
from soiltemp.netcdf import open_result, save

stage, path = sys.argv[1:]
result = open_result(path).assign_attrs(run="new")

def die(*arguments):
    os.kill(os.getpid(), signal.SIGKILL)

if stage == "write":
    real = open
    class Half:
        def __init__(self, file): self.file = file
        def __enter__(self): return self
        def __exit__(self, *_): return None
        def write(self, content):
            self.file.write(content[: len(content) // 2])
            self.file.flush()
            die()
    whole_file.open = lambda place, mode: Half(real(place, mode))
elif stage == "after":
    whole_file._sync_folder = die
else:
    setattr(whole_file.os, stage, die)
save(result, path)
"""


@pytest.mark.parametrize(
    ("stage", "found", "litter"), [("write", "old", 1), ("fsync", "old", 1), ("replace", "old", 1), ("after", "new", 0)]
)
def test_killed_at_every_stage(result, old_file, stage, found, litter):
    done = subprocess.run(
        [sys.executable, "-c", KILLED_AT, stage, str(old_file)], cwd=ROOT, capture_output=True, timeout=120, check=False
    )
    assert done.returncode == -signal.SIGKILL, done.stderr
    assert open_result(old_file).attrs["run"] == found
    assert len(leftovers(old_file.parent)) == litter
    save(result.assign_attrs(run="next"), old_file)
    assert open_result(old_file).attrs["run"] == "next"
    assert leftovers(old_file.parent) == []


SAVES_FOR_EVER = """
import os, sys
from soiltemp.netcdf import open_result, save

path = sys.argv[1]
result = open_result(path)
for line in sys.stdin:  # a child for every line: to import anew would take longer than all the rest
    child = os.fork()
    if child == 0:
        number = 0
        while True:
            number += 1
            save(result.assign_attrs(run=number), path)
    print(child, flush=True)
    os.waitpid(child, 0)
"""


def test_killed_at_any_moment(old_file):
    saver = subprocess.Popen(
        [sys.executable, "-c", SAVES_FOR_EVER, str(old_file)],
        cwd=ROOT, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True,
    )  # fmt: skip
    seen = set()
    child = None
    try:
        for kill in range(12):
            saver.stdin.write("\n")
            saver.stdin.flush()
            child = int(saver.stdout.readline())
            time.sleep(0.03 + 0.017 * kill)
            # a reader beside the writer sees a whole file too
            seen.add(open_result(old_file).attrs["run"])
            os.kill(child, signal.SIGKILL)
            child = None
            opened = open_result(old_file)
            assert opened.sizes == {"time": 366, "depth": 5}
            seen.add(opened.attrs["run"])
    finally:
        if child is not None:
            os.kill(child, signal.SIGKILL)
        saver.stdin.close()
        saver.wait(timeout=30)
    assert len(seen) > 2, "no save was finished between the kills: the test shows nothing"
    save(opened, old_file)
    assert leftovers(old_file.parent) == []
