"""Where compiled code is kept between runs.

numba keeps machine code on disk but watches only the file of the cached function: an edit in a function that it
calls, in another file, would silently return old numbers. So the folder carries a digest of every file with
compiled code. numba would also put the cache beside the source and fail where that is read-only and there is no
home; here the first writable place of a list is taken.
"""

import hashlib
import os
import tempfile
from functools import cache
from pathlib import Path

_COMPILED = (
    *("rows.py", "vector_math.py", "coalescing.py", "half_spaces.py", "kernels.py"),
    *("port_rows.py", "lanes.py", "matrices.py", "slices.py", "port_state.py", "ports.py"),
)


def use_cache_folder() -> Path:
    """Tell numba where to keep compiled code; called once, before the first compiled function."""
    import numba

    folder = cache_folder()
    numba.config.CACHE_DIR = str(folder)
    return folder


@cache
def cache_folder() -> Path:
    """The folder that this run uses."""
    return _writable(_candidates()) / _digest()


def is_compiled(entry: str) -> bool:
    """Whether an earlier run left the code of an entry point, "solve" or "solve_ports"; else it is compiled first."""
    return any(cache_folder().glob(f"**/*.{entry}-*.nbc"))


def _candidates() -> list[Path]:
    named = [Path(os.environ[name]) for name in ("NUMBA_CACHE_DIR", "XDG_CACHE_HOME") if os.environ.get(name)]
    home = Path(os.path.expanduser("~"))
    return [*named, home / ".cache"] if home.is_absolute() else named


def _writable(candidates: list[Path]) -> Path:
    """First place that takes a file; else a private temporary folder, which lasts for this run only."""
    for candidate in candidates:
        folder = candidate / "slabsim"
        try:
            folder.mkdir(parents=True, exist_ok=True)
            with tempfile.TemporaryFile(dir=folder):
                return folder
        except OSError:
            continue
    return Path(tempfile.mkdtemp(prefix="slabsim-"))


def _digest() -> str:
    digest = hashlib.sha256()
    for name in _COMPILED:
        digest.update((Path(__file__).parent / name).read_bytes())
    return digest.hexdigest()[:16]
