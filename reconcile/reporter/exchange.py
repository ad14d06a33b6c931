"""Two folders change places in one system call, where the platform has such a call."""

from __future__ import annotations

import ctypes
import errno
import os
import sys
from collections.abc import Callable
from functools import cache
from pathlib import Path

AT_FDCWD = -100
SWAP = 2
"""RENAME_EXCHANGE of Linux (renameat2(2), since 3.15) and RENAME_SWAP of macOS (renamex_np(2), since 10.12)."""
_NOT_HERE = frozenset({errno.ENOSYS, errno.EINVAL, errno.ENOTSUP, errno.EOPNOTSUPP})
"""What the call says where the kernel or the file system does not know it."""


@cache
def _system_call() -> Callable[[bytes, bytes], int] | None:
    if sys.platform not in ("linux", "darwin"):
        return None
    library = ctypes.CDLL(None, use_errno=True)
    if hasattr(library, "renameat2"):
        linux = library.renameat2
        linux.argtypes = [ctypes.c_int, ctypes.c_char_p, ctypes.c_int, ctypes.c_char_p, ctypes.c_uint]
        return lambda one, other: int(linux(AT_FDCWD, one, AT_FDCWD, other, SWAP))
    if hasattr(library, "renamex_np"):
        mac = library.renamex_np
        mac.argtypes = [ctypes.c_char_p, ctypes.c_char_p, ctypes.c_uint]
        return lambda one, other: int(mac(one, other, SWAP))
    return None


def exchange(one: Path, other: Path) -> bool:
    """Let two folders of one file system change places; False where that cannot be done in one call.

    Raises OSError where it could, but failed; then both stand where they stood.
    """
    call = _system_call()
    if call is None:
        return False
    if call(os.fsencode(one), os.fsencode(other)) == 0:
        return True
    code = ctypes.get_errno()
    if code in _NOT_HERE:
        return False
    raise OSError(code, os.strerror(code), str(other))
