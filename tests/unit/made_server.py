"""A folder served over HTTP on loopback, byte ranges included: what rasters behind URLs and in object stores are read from.

The server is a process of its own: GDAL holds the interpreter's lock while it waits for an answer.
"""

import email.utils
import http.server
import json
import re
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, ClassVar
from urllib.parse import unquote, urlsplit

S3_SETTINGS = {
    "AWS_HTTPS": "NO",
    "AWS_VIRTUAL_HOSTING": "FALSE",
    "AWS_NO_SIGN_REQUEST": "YES",
    "AWS_EC2_METADATA_DISABLED": "true",
}
"""What GDAL needs to read `s3://` from a server of one's own, beside AWS_S3_ENDPOINT."""


_ERROR = {
    404: b'<?xml version="1.0"?><Error><Code>NoSuchKey</Code><Message>The specified key does not exist.</Message></Error>',
    403: b'<?xml version="1.0"?><Error><Code>AccessDenied</Code><Message>Access Denied</Message></Error>',
}
"""As an object store puts it."""


@dataclass(frozen=True, slots=True)
class Served:
    """A running server of `folder`; its notes lie in a folder of their own."""

    folder: Path
    notes: Path
    port: int

    def url(self, name: str) -> str:
        return f"http://127.0.0.1:{self.port}/{name}"

    def s3_settings(self) -> dict[str, str]:
        """Environment in which `s3://FOLDER/NAME` comes from this server."""
        return {**S3_SETTINGS, "AWS_S3_ENDPOINT": f"127.0.0.1:{self.port}"}

    def behave(self, *, ranges: bool = True, marks: bool = True, faults: dict[str, list[int]] | None = None) -> None:
        """Whether to answer with parts of files and with ETag and date, and status codes to give instead of files, by path.

        `faults` are for the requests of a path in turn, 0 for the file itself; a negative one is given for ever.
        """
        data = {"ranges": ranges, "marks": marks, "faults": faults or {}}
        (self.notes / "behaviour.json").write_text(json.dumps(data), encoding="utf-8")

    def asked(self) -> list[tuple[str, str, int, int]]:
        """Method, path, status and bytes sent of every request so far."""
        log = self.notes / "asked.log"
        if not log.exists():
            return []
        lines = [line.split() for line in log.read_text(encoding="utf-8").splitlines()]
        return [(method, path, int(status), int(sent)) for method, path, status, sent in lines]


@contextmanager
def served(folder: Path) -> Iterator[Served]:
    """Serve the files of a folder until the block ends."""
    with tempfile.TemporaryDirectory() as notes:
        process = subprocess.Popen(
            [sys.executable, __file__, str(folder), notes], stdout=subprocess.PIPE, stdin=subprocess.DEVNULL, text=True
        )
        try:
            assert process.stdout is not None
            state = Served(folder=folder, notes=Path(notes), port=int(process.stdout.readline()))
            state.behave()
            yield state
        finally:
            process.kill()
            process.wait()
            if process.stdout is not None:
                process.stdout.close()


class _Handler(http.server.BaseHTTPRequestHandler):
    protocol_version = "HTTP/1.1"
    wbufsize = 65_536  # head and body in one packet
    folder = Path()
    notes = Path()
    given: ClassVar[dict[str, int]] = {}

    def log_message(self, format: str, *args: Any) -> None:
        """Say nothing: what was asked goes to a file."""

    def do_HEAD(self) -> None:
        self._answer()

    def do_GET(self) -> None:
        self._answer()

    def _answer(self) -> None:
        behaviour = json.loads((self.notes / "behaviour.json").read_text(encoding="utf-8"))
        path = unquote(urlsplit(self.path).path)
        file = self.folder / path.lstrip("/")
        status = self._fault(behaviour["faults"].get(path, [])) or (200 if file.is_file() else 404)
        if status != 200:
            self._send(status, _ERROR.get(status, b"no\n"), {})
            return
        stat = file.stat()
        headers = {}
        if behaviour["marks"]:
            headers = {
                "ETag": f'"{stat.st_mtime_ns:x}-{stat.st_size:x}"',
                "Last-Modified": email.utils.formatdate(stat.st_mtime, usegmt=True),
            }
        first, last = 0, stat.st_size - 1
        if behaviour["ranges"]:
            headers["Accept-Ranges"] = "bytes"
            found = re.fullmatch(r"bytes=(\d+)-(\d*)", self.headers.get("Range", ""))
            if found is not None:
                first, last = int(found[1]), min(int(found[2] or last), last)
                if first > last:
                    self._send(416, b"", {"Content-Range": f"bytes */{stat.st_size}"})
                    return
                status = 206
                headers["Content-Range"] = f"bytes {first}-{last}/{stat.st_size}"
        with file.open("rb") as stream:
            stream.seek(first)
            body = stream.read(last - first + 1)
        self._send(status, body, headers)

    def _fault(self, codes: list[int]) -> int:
        if codes and codes[0] < 0:
            return -codes[0]
        turn = self.given.get(self.path, 0)
        self.given[self.path] = turn + 1
        return codes[turn] if turn < len(codes) else 0

    def _send(self, status: int, body: bytes, headers: dict[str, str]) -> None:
        with_body = self.command != "HEAD"
        with (self.notes / "asked.log").open("a", encoding="utf-8") as log:
            log.write(f"{self.command} {self.path} {status} {len(body) if with_body else 0}\n")
        self.send_response(status)
        for name, value in headers.items():
            self.send_header(name, value)
        self.send_header("Content-Length", str(len(body)))
        self.end_headers()
        if with_body:
            try:
                self.wfile.write(body)
            except (BrokenPipeError, ConnectionResetError):
                self.close_connection = True


def main() -> None:
    """Serve the folder named first, with notes in the one named second; print the port."""
    _Handler.folder, _Handler.notes = Path(sys.argv[1]), Path(sys.argv[2])
    server = http.server.ThreadingHTTPServer(("127.0.0.1", 0), _Handler)
    server.daemon_threads = True
    sys.stdout.write(f"{server.server_address[1]}\n")
    sys.stdout.flush()
    server.serve_forever()


if __name__ == "__main__":
    main()
