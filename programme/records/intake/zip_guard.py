"""What an XLSX file may unpack to: first by what it declares, then by what it holds."""

import copy
import struct
import zipfile
import zlib
from collections.abc import Iterator

from programme.records.intake.limits import (
    MAX_MEMBERS,
    MAX_RATIO,
    MAX_UNPACKED_BYTES,
    CannotRead,
    megabytes,
)

_NOT_AS_DECLARED = (
    "File: a part inside is damaged or does not have the size it declares; save it again."
)
# What reading a broken archive may raise.
DAMAGE = (
    zipfile.BadZipFile, zlib.error, struct.error, EOFError, NotImplementedError, OSError,
    OverflowError, ValueError,
)  # fmt: skip
CHUNK_BYTES = 64 * 1024
# Below this nothing is gained by a bomb, and small sheets pack well.
_SMALL_BYTES = 5 * 1024 * 1024


def check_declared(book: zipfile.ZipFile) -> None:
    """Refuse by the directory alone, before anything is unpacked.

    Raises:
        CannotRead: too many members, too large, packed too tight, encrypted, or an odd name.
    """
    members = book.infolist()
    if len(members) > MAX_MEMBERS:
        raise CannotRead(f"File: {len(members)} parts inside; at most {MAX_MEMBERS} are allowed.")
    unpacked = sum(member.file_size for member in members)
    if unpacked > MAX_UNPACKED_BYTES:
        raise CannotRead(
            f"File: it unpacks to {megabytes(unpacked)}; "
            f"at most {megabytes(MAX_UNPACKED_BYTES)} are allowed."
        )
    packed = max(1, sum(member.compress_size for member in members))
    if unpacked > _SMALL_BYTES and unpacked / packed > MAX_RATIO:
        raise CannotRead(
            f"File: it unpacks to {unpacked / packed:.0f} times its size; "
            f"at most {MAX_RATIO} times is allowed."
        )
    for member in members:
        name = member.filename.replace("\\", "/")
        if name.startswith("/") or ".." in name.split("/") or ":" in name:
            raise CannotRead("File: a part inside has a name that leads outside; it is not read.")
        if member.compress_type not in {zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED}:
            raise CannotRead("File: it is packed in a way workbooks are not; save it again.")
        if member.flag_bits & 0x1:
            raise CannotRead("File: it is protected by a password; save it without one.")


def chunks(book: zipfile.ZipFile, member: zipfile.ZipInfo) -> Iterator[bytes]:
    """The member's bytes; stops as soon as it holds more than it declares, since headers lie.

    Raises:
        CannotRead: more or fewer bytes than declared, or damaged.
    """
    # Reading stops at the size in the entry, so ask for one byte more than it promises.
    asked = copy.copy(member)
    asked.file_size = member.file_size + 1
    counted = 0
    try:
        with book.open(asked) as part:
            while chunk := part.read(CHUNK_BYTES):
                counted += len(chunk)
                if counted > member.file_size:
                    break
                yield chunk
    except DAMAGE as error:
        raise CannotRead(_NOT_AS_DECLARED) from error
    if counted != member.file_size:
        raise CannotRead(_NOT_AS_DECLARED)


def check_held(book: zipfile.ZipFile) -> None:
    """Unpack every member once, keeping nothing, and count.

    Raises:
        CannotRead: as `chunks`.
    """
    for member in book.infolist():
        for _ in chunks(book, member):
            pass
