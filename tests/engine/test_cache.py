import os
import re
import subprocess
import sys
from pathlib import Path

from slabsim.engine import cache

READ = "from slabsim.engine.cache import cache_folder; print(cache_folder())"


def folder_with(**environment) -> Path:
    """Cache folder of a fresh process with this environment."""
    kept = {k: v for k, v in os.environ.items() if k not in ("HOME", "NUMBA_CACHE_DIR", "XDG_CACHE_HOME")}
    done = subprocess.run(
        [sys.executable, "-c", READ], env=kept | environment, capture_output=True, text=True, check=True
    )
    return Path(done.stdout.strip())


def test_the_first_writable_place_is_taken(tmp_path):
    blocked = tmp_path / "file"
    blocked.write_text("in the way")
    home = tmp_path / "home"
    assert folder_with(NUMBA_CACHE_DIR=str(tmp_path / "a"), HOME=str(home)).parts[:-2] == (tmp_path / "a").parts
    found = folder_with(NUMBA_CACHE_DIR=str(blocked), HOME=str(home))
    assert found.parent == home / ".cache" / "slabsim"


def test_without_any_writable_place_a_temporary_folder_serves(tmp_path):
    blocked = tmp_path / "file"
    blocked.write_text("in the way")
    found = folder_with(NUMBA_CACHE_DIR=str(blocked), HOME=str(blocked), TMPDIR=str(tmp_path))
    assert found.parent.parent == tmp_path


def test_the_folder_follows_every_file_with_compiled_code(monkeypatch, tmp_path):
    before = cache._digest()
    for name in cache._COMPILED:
        (tmp_path / name).write_bytes((Path(cache.__file__).parent / name).read_bytes())
    monkeypatch.setattr(cache, "__file__", str(tmp_path / "cache.py"))
    assert cache._digest() == before
    (tmp_path / "coalescing.py").write_text("# edited")
    assert cache._digest() != before


def test_every_file_that_imports_numba_counts():
    folder = Path(cache.__file__).parent
    mark = re.compile(r"from numba|import .*\bkernel\b")
    compiled = {path.name for path in folder.glob("*.py") if mark.search(path.read_text())}
    assert compiled | {"rows.py", "port_rows.py"} == set(cache._COMPILED)
