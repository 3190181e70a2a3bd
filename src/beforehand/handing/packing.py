"""Files to the bytes of a bundle: the same files give the same bytes, wherever and whenever."""

from __future__ import annotations

import io
import zipfile
import zlib
from collections.abc import Mapping

from beforehand.handing.limits import HIGHEST_RATIO

# The first moment that the format can hold: the day of packing is not part of what is packed.
_MOMENT = (1980, 1, 1, 0, 0, 0)

# A regular file that its owner may change and all may read, as a Unix system writes it.
_PERMISSIONS = 0o100644 << 16
_UNIX = 3

_LEVEL = 6


def packed(files: Mapping[str, bytes]) -> bytes:
    """The bytes of a bundle.

    Parameters
    ----------
    files : mapping of str to bytes
        Content by member name; their order does not matter.
    """
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w") as bundle:
        for name in sorted(files):
            info = zipfile.ZipInfo(name, date_time=_MOMENT)
            info.create_system = _UNIX
            info.external_attr = _PERMISSIONS
            content = files[name]
            kind = zipfile.ZIP_DEFLATED if _may_be_deflated(content) else zipfile.ZIP_STORED
            bundle.writestr(info, content, compress_type=kind, compresslevel=_LEVEL)
    return written.getvalue()


def _may_be_deflated(content: bytes) -> bool:
    """Whether a member stays below the ratio above which a recipient takes it for a trap."""
    made = zlib.compressobj(_LEVEL, zlib.DEFLATED, -zlib.MAX_WBITS)
    size = len(made.compress(content)) + len(made.flush())
    return 0 < size < len(content) <= size * HIGHEST_RATIO
