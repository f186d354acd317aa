"""What a path means: a file or store, on this disk or behind a URL, and perhaps a group in it.

`ocean.nc#model/tracers` is the group `model/tracers` of the file `ocean.nc`; without the sign, the top level. A URL is
opened by fsspec, whose own configuration holds servers and keys: a recipe never does.
"""

from __future__ import annotations

import contextlib
import os
import re
from collections.abc import Iterator
from typing import Any
from urllib.parse import unquote

import fsspec

from gridcarb.errors import InputError

_URL = re.compile(r"[A-Za-z][A-Za-z0-9+.-]+://")
_WITH_SECRET = re.compile(r"[A-Za-z][A-Za-z0-9+.-]+://[^/@]*:[^/@]*@")


def split(path: str) -> tuple[str, str]:
    """The file or store, and the group in it ('' for the top level); a name that has the sign itself is left whole."""
    store, sign, group = path.rpartition("#")
    if not sign or (not is_url(path) and os.path.exists(path)):
        return path, ""
    return store, group.strip("/")


def join(store: str, group: str) -> str:
    """The inverse of `split`."""
    return f"{store}#{group}" if group else store


def is_url(store: str) -> bool:
    """Whether fsspec must open it."""
    return bool(_URL.match(store))


def localised(pattern: str) -> str:
    """A `file://` URL as a path of this disk; anything else as it is."""
    return unquote(pattern.removeprefix("file://")) if pattern.startswith("file://") else pattern


@contextlib.contextmanager
def reached(url: str) -> Iterator[tuple[Any, str]]:
    """The file system behind a URL and the place in it.

    Raises
    ------
    InputError : no library for this kind of URL, or its server does not answer or let us in.
    """
    if _WITH_SECRET.match(url):
        raise InputError("the URL holds a password", where=re.sub(r"//[^/]*@", "//...@", url),
                         mend="keep servers and keys in the configuration of fsspec, never in a recipe")
    try:
        yield fsspec.core.url_to_fs(url)
    except InputError:
        raise
    except ImportError as error:
        raise InputError(f"this kind of URL needs a library that is not here ({error})", where=url,
                         mend="install it (for s3:// the extra `gridcarb[s3]`)") from None
    except FileNotFoundError:
        raise InputError("there is no such file", where=url, mend="correct `inputs: files` in the recipe") from None
    except Exception as error:
        # Every kind of file system has its own classes of errors.
        raise InputError(
            f"the place cannot be reached ({type(error).__name__}: {error})", where=url,
            mend="check the address; servers and keys belong in the configuration of fsspec",
        ) from error
