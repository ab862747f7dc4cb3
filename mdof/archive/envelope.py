"""The outer shell of a run file: a user block that holds the SHA-256 of every byte after it.

An HDF5 file may begin with a block that HDF5 itself ignores. Here it holds three lines of ASCII text, padded with
zeros: what the file is, the digest, and the number of bytes the digest covers. Any tool can check a run without HDF5:
skip the first 512 bytes and hash the rest.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from mdof.errors import DamagedArchiveError, OutputError

__all__ = ["BLOCK_SIZE", "LAYOUT_VERSION", "check", "probe_folder", "publish", "seal", "temporary_beside"]

BLOCK_SIZE = 512
LAYOUT_VERSION = 1
_FIRST_LINE = b"mdof run, layout "
_HDF5_SIGNATURE = b"\x89HDF\r\n\x1a\n"
_CHUNK = 1 << 20


def _digest_after_block(path: Path) -> tuple[str, int]:
    digest, count = hashlib.sha256(), 0
    with open(path, "rb") as stream:
        stream.seek(BLOCK_SIZE)
        while chunk := stream.read(_CHUNK):
            digest.update(chunk)
            count += len(chunk)
    return digest.hexdigest(), count


def seal(path: Path) -> str:
    """Fill the user block of a finished HDF5 file and flush the file to disk; returns the digest (hex)."""
    digest, count = _digest_after_block(path)
    block = b"%s%d\nsha256:%s\nbytes:%d\n" % (_FIRST_LINE, LAYOUT_VERSION, digest.encode(), count)
    with open(path, "r+b") as stream:
        stream.write(block.ljust(BLOCK_SIZE, b"\0"))
        stream.flush()
        os.fsync(stream.fileno())
    return digest


def check(path: Path) -> str:
    """Verify the digest of a run file before anything else reads it; returns the digest (hex).

    Raises
    ------
    DamagedArchiveError
        If the file is not a run, was cut short, lengthened or changed, or has a newer layout than this version reads.
    """
    try:
        with open(path, "rb") as stream:
            block = stream.read(BLOCK_SIZE)
            signature = stream.read(len(_HDF5_SIGNATURE))
        found, count = _digest_after_block(path)
    except OSError as error:
        raise DamagedArchiveError(f"{path}: cannot be read: {error.strerror or error}") from error
    lines = block.rstrip(b"\0").split(b"\n")
    if not block.startswith(_FIRST_LINE):
        kind = "an empty file" if not block else "not a run written by mdof"
        if block.startswith(_HDF5_SIGNATURE):
            kind = "an HDF5 file, but not a run written by mdof (it has no mdof user block)"
        raise DamagedArchiveError(f"{path}: {kind}")
    version = lines[0].removeprefix(_FIRST_LINE)
    if not version.isdigit() or int(version) < 1:
        raise DamagedArchiveError(f"{path}: damaged: the user block states no layout version")
    if int(version) > LAYOUT_VERSION:
        raise DamagedArchiveError(
            f"{path}: layout {int(version)} is newer than this version of mdof reads ({LAYOUT_VERSION}); update mdof"
        )
    if len(lines) != 4 or not lines[1].startswith(b"sha256:") or not lines[2].startswith(b"bytes:"):
        raise DamagedArchiveError(f"{path}: damaged: the user block does not state the digest")
    stated = lines[2].removeprefix(b"bytes:")
    if not stated.isdigit():
        raise DamagedArchiveError(f"{path}: damaged: the user block does not state the length")
    if int(stated) != count:
        change = "cut short" if count < int(stated) else "lengthened"
        raise DamagedArchiveError(f"{path}: damaged: {change}, {count} bytes where {int(stated)} were written")
    if lines[1] != b"sha256:" + found.encode():
        raise DamagedArchiveError(f"{path}: damaged: its bytes no longer have the SHA-256 it was written with")
    if signature != _HDF5_SIGNATURE:
        raise DamagedArchiveError(f"{path}: damaged: no HDF5 data after the user block")
    return found


def probe_folder(folder: str | os.PathLike[str]) -> None:
    """Make sure that a file could be written into ``folder``, without leaving anything behind.

    The folder itself may be missing; then its nearest existing parent is tried. A real file is made and removed,
    because permission bits say nothing on read-only and network file systems or to an administrator.

    Raises
    ------
    OutputError
        If nothing can be written there.
    """
    path = Path(folder)
    existing = path
    while not os.path.lexists(existing) and existing != existing.parent:
        existing = existing.parent
    if not existing.is_dir():
        raise OutputError(f"{path}: cannot be written: {existing} is not a folder")
    probe = existing / f".mdof-probe-{os.getpid()}"
    try:
        os.close(os.open(probe, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o600))
    except FileExistsError:
        return
    except OSError as error:
        raise OutputError(f"{path}: cannot be written: {error.strerror or error}") from error
    with suppress(OSError):
        os.unlink(probe)


@contextmanager
def temporary_beside(folder: Path, suffix: str) -> Iterator[Path]:
    """A free hidden name in ``folder``, removed at the end if the file is still there."""
    path = folder / f".mdof-{os.getpid()}-{os.urandom(4).hex()}{suffix}"
    try:
        yield path
    finally:
        with suppress(OSError):
            path.unlink(missing_ok=True)


def publish(temporary: Path, folder: Path, stem: str, suffix: str) -> Path:
    """Give a finished file its lasting name, never over an existing one; a counter is added where the name is taken."""
    number = 1
    while True:
        target = folder / (f"{stem}{suffix}" if number == 1 else f"{stem}-{number}{suffix}")
        try:
            _move_without_overwriting(temporary, target)
        except FileExistsError:
            number += 1
            continue
        _flush_folder(folder)
        return target


def _move_without_overwriting(source: Path, target: Path) -> None:
    if os.name == "nt":
        os.rename(source, target)  # refuses an existing target there
        return
    try:
        os.link(source, target)
    except FileExistsError:
        raise
    except OSError:
        # File systems without hard links: claim the name first, then replace the empty claim.
        os.close(os.open(target, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o600))
        os.replace(source, target)
        return
    os.unlink(source)


def _flush_folder(folder: Path) -> None:
    """Make the new name survive a power cut; not every system can flush a folder."""
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
