"""HITRANonline, asked through hapi: one question at a time, with patience, and with every failure told in a sentence.

hapi forms the request, downloads and unpacks. It knows no time limit, does not notice an answer that ends early, and
leaves its tables in the working directory; so it is given a stand-in for ``urllib.request`` that watches over the
download, and a temporary folder.
"""

from __future__ import annotations

import contextlib
import http.client
import io
import sys
import tempfile
import time
import urllib.error
import urllib.request
import warnings
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from planner import __version__
from planner.errors import LineDataError
from planner.spectroscopy.molecules import quiet_hapi

__all__ = ["LineService"]

_TABLE = "answer"
_MOST_SECONDS_TO_WAIT = 120.0
_LATER = "run the same command again later; what has come is kept"


class _Failure(Exception):
    """One request that did not succeed."""

    def __init__(self, sentence: str, *, again: bool = True, wait_s: float = 0.0) -> None:
        super().__init__(sentence)
        self.again = again
        self.wait_s = wait_s


class _NothingThere(Exception):
    """The service says that it has nothing at this address (404)."""


class LineService:
    """The HITRAN line-by-line service.

    Parameters
    ----------
    address : str, optional
        Where it is, such as ``"http://127.0.0.1:8000"``; by default hapi's own.
    timeout_s : float
        How long to wait for the next bytes.
    tries : int
        How often one question is asked before giving up.
    pause_s : float
        Rest between two questions; after a failure it doubles each time.
    sleep : callable
        Does the waiting.
    """

    def __init__(
        self,
        address: str | None = None,
        *,
        timeout_s: float = 60.0,
        tries: int = 4,
        pause_s: float = 1.0,
        sleep: Callable[[float], None] = time.sleep,
    ) -> None:
        self.address = (address or str(quiet_hapi().VARIABLES["GLOBAL_HOST"])).rstrip("/")
        self._timeout_s = timeout_s
        self._tries = tries
        self._pause_s = pause_s
        self._sleep = sleep
        self._asked = False

    @property
    def description(self) -> str:
        """The service and the way to it, for the record."""
        return f"{self.address} through hapi {quiet_hapi().HAPI_VERSION}"

    def records(
        self,
        isotopologues: Sequence[tuple[int, int]],
        from_per_cm: float,
        to_per_cm: float,
        *,
        parameters: Sequence[str],
        check: Callable[[bytes], None],
    ) -> bytes | None:
        """Line records of some isotopologues in a range, with more parameters behind a comma each.

        Parameters
        ----------
        isotopologues : sequence of (molecule, isotopologue)
            HITRAN numbers.
        from_per_cm, to_per_cm : float
        parameters : sequence of str
            Names of HITRAN parameters beyond the record.
        check : callable
            Raises LineDataError if an answer is not what was asked for; it is then asked for again.

        Returns
        -------
        bytes or None
            None if the service answers that it has nothing.

        Raises
        ------
        LineDataError
            If no attempt succeeds.
        """
        where = f"{self.address}, {from_per_cm:g}-{to_per_cm:g} per cm"
        for attempt in range(1, self._tries + 1):
            if self._asked:
                self._sleep(self._pause_s)
            self._asked = True
            try:
                body = self._ask(isotopologues, from_per_cm, to_per_cm, parameters)
                check(body)
                return body
            except _NothingThere:
                return None
            except (_Failure, LineDataError) as error:
                failure = error if isinstance(error, _Failure) else _Failure(f"not line records: {error}")
            if not failure.again:
                raise LineDataError(f"{where}: {failure}; {_LATER}")
            if attempt < self._tries:
                self._sleep(max(self._pause_s * 2**attempt, min(failure.wait_s, _MOST_SECONDS_TO_WAIT)))
        raise LineDataError(f"{where}: {failure} ({self._tries} tries); {_LATER}")

    def _ask(
        self, isotopologues: Sequence[tuple[int, int]], low: float, high: float, parameters: Sequence[str]
    ) -> bytes:
        """One request, made by hapi."""
        hapi = quiet_hapi()
        ids = [hapi.ISO[pair][hapi.ISO_INDEX["id"]] for pair in isotopologues]
        with _hapi_confined(self.address, self._timeout_s) as (folder, watch):
            try:
                hapi.fetch_by_ids(
                    _TABLE, ids, low, high, ParameterGroups=["160-char"] if parameters else [], Parameters=[*parameters]
                )
            except Exception as error:  # hapi raises plain exceptions; what matters was noted by the watch
                if watch.failure is None and not watch.complete:
                    watch.failure = _Failure(f"hapi failed: {error}")
            if watch.failure is not None:
                raise watch.failure
            return (folder / f"{_TABLE}.data").read_bytes()


@contextmanager
def _hapi_confined(address: str, timeout_s: float) -> Iterator[tuple[Path, _Watch]]:
    """Hapi with another address, a folder of its own and its download watched; all put back afterwards."""
    hapi = quiet_hapi()
    downloading: Any = sys.modules[hapi.queryHITRAN.__module__]  # where hapi looks its urllib up
    watch = _Watch(timeout_s)
    before = {name: hapi.VARIABLES.get(name) for name in ("GLOBAL_HOST", "BACKEND_DATABASE_NAME")}
    with (
        tempfile.TemporaryDirectory(prefix="limbcast-") as folder,
        contextlib.redirect_stdout(io.StringIO()),
        warnings.catch_warnings(),
    ):
        warnings.simplefilter("ignore")  # hapi leaves files open where an answer is not what it expects
        hapi.VARIABLES.update(GLOBAL_HOST=address, BACKEND_DATABASE_NAME=folder)
        downloading.urllib2 = watch
        try:
            yield Path(folder), watch
        finally:
            downloading.urllib2 = urllib.request
            watch.close()
            hapi.VARIABLES.update(before)
            table = hapi.LOCAL_TABLE_CACHE.pop(_TABLE, {})
            if table.get("filehandler") is not None:
                table["filehandler"].close()


class _Watch:
    """Stands in for ``urllib.request`` inside hapi: sets the time limit and notes what goes wrong."""

    def __init__(self, timeout_s: float) -> None:
        self.failure: Exception | None = None
        self.complete = False
        self._timeout_s = timeout_s
        self._response: Any = None

    def __getattr__(self, name: str) -> Any:
        return getattr(urllib.request, name)

    def urlopen(self, url: str) -> _Watch:
        request = urllib.request.Request(url, headers={"User-Agent": f"limbcast/{__version__} (hapi)"})
        with self._noted():
            self._response = urllib.request.urlopen(request, timeout=self._timeout_s)
        self._expected = self._response.headers.get("Content-Length")
        self._received = 0
        return self

    def read(self, size: int) -> bytes:
        """The next piece of the answer, as hapi asks for it."""
        with self._noted():
            piece: bytes = self._response.read(size)
            self._received += len(piece)
            if not piece:
                if self._expected is not None and self._received < int(self._expected):
                    raise _Failure(f"the answer ended early, after {self._received} of {self._expected} bytes")
                self.complete = True
        return piece

    def close(self) -> None:
        """Let go of the connection, whatever came."""
        if self._response is not None:
            self._response.close()

    @contextmanager
    def _noted(self) -> Iterator[None]:
        """What goes wrong inside, kept as a sentence."""
        try:
            yield
        except urllib.error.HTTPError as error:
            error.close()
            self.failure = _of_status(error)
            raise
        except (OSError, http.client.HTTPException, _Failure) as error:
            self.failure = self._of_connection(error)
            raise

    def _of_connection(self, error: Exception) -> Exception:
        reason = error.reason if isinstance(error, urllib.error.URLError) else error
        if isinstance(reason, _Failure):
            return reason
        if isinstance(reason, TimeoutError):
            return _Failure(f"no answer within {self._timeout_s:g} s")
        if isinstance(reason, http.client.IncompleteRead):
            return _Failure(f"the answer ended early, after {self._received + len(reason.partial)} bytes")
        if isinstance(reason, ConnectionRefusedError):
            return _Failure("cannot be reached: connection refused")
        return _Failure(f"cannot be reached: {getattr(reason, 'strerror', None) or str(reason) or repr(reason)}")


def _of_status(error: urllib.error.HTTPError) -> Exception:
    """What a status of the answer means."""
    if error.code == 404:
        return _NothingThere()
    if error.code == 403:
        return _Failure("refused (403): the daily limit of queries may be reached", again=False)
    retry = str(error.headers.get("Retry-After") or "0")
    wait_s = float(retry) if retry.isdigit() else 0.0
    again = error.code == 429 or error.code >= 500
    return _Failure(f"answered {error.code} {error.reason}", again=again, wait_s=wait_s)
