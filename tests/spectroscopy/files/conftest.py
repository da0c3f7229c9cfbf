"""Small files of each kind, invented, and ways to damage them."""

from __future__ import annotations

import socket
import threading
import time
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from urllib.parse import parse_qs, urlsplit

import numpy as np
import pytest

from planner.spectroscopy.hitran import format_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import quiet_hapi


def xsc_text(
    name="CCl3F", low=830.0, high=860.0, values=None, temperature=293.0, pressure=7.5, common="CFC-11", count=None
):
    """A cross-section table laid out as HITRAN does, written apart from the program's own writer."""
    values = np.linspace(1e-19, 4e-18, 57) if values is None else np.asarray(values, dtype=float)
    count = len(values) if count is None else count
    header = (
        name.rjust(20) + f"{low:10.4f}" + f"{high:10.4f}" + str(count).rjust(7) + f"{temperature:7.1f}"
        + f"{pressure:6.1f}" + f"{max(values):10.3E}" + "0.03 " + common.rjust(15) + "    " + "N2 " + " 34"
    )  # fmt: skip
    assert len(header) == 100
    written = [f"{value:10.3E}" for value in values]
    rows = ["".join(written[i : i + 10]) for i in range(0, len(written), 10)]
    return "\n".join([header, *rows]) + "\n"


def cia_text(pair="N2-H2", temperatures=(200.0, 300.0), wavenumber=None, coefficient=None, errors=False):
    """Collision blocks laid out as HITRAN does."""
    wavenumber = np.arange(100.0, 140.0) if wavenumber is None else wavenumber
    blocks = []
    for number, temperature in enumerate(temperatures):
        k = 1e-44 * (number + 1) * np.ones(wavenumber.size) if coefficient is None else coefficient[number]
        blocks.append(
            pair.rjust(20) + f"{wavenumber[0]:10.3f}" + f"{wavenumber[-1]:10.3f}" + str(wavenumber.size).rjust(7)
            + f"{temperature:7.1f}" + f"{max(k):10.3E}" + " -.999" + " " * 27 + " 12"
        )  # fmt: skip
        blocks += [
            f"{nu:10.4f}{value:11.3E}" + (f"{value / 10:11.3E}" if errors else "")
            for nu, value in zip(wavenumber, k, strict=True)
        ]
    return "\n".join(blocks) + "\n"


@pytest.fixture
def make_xsc():
    return xsc_text


@pytest.fixture
def make_cia():
    return cia_text


KINDS = ("drop", "insert", "overwrite", "control", "cut", "wrap", "join", "lose", "repeat")


def damage_bytes(data: bytes, spots, kind: str, rng: np.random.Generator) -> bytes:
    """A copy of a file with one fault, at one of the given places (offsets of bytes that carry a number or name)."""
    at = int(rng.choice(spots))
    begin, end = data.rfind(b"\n", 0, at) + 1, data.find(b"\n", at)
    letter = rng.choice(list(b"!$%&*=?@GHJKQRZxyz~"))
    match kind:
        case "drop":
            return data[:at] + data[at + 1 :]
        case "insert":
            return data[:at] + bytes([rng.choice(list(b"0123456789.x"))]) + data[at:]
        case "overwrite":
            return data[:at] + bytes([letter]) + data[at + 1 :]
        case "control":
            return data[:at] + bytes([rng.choice([0, 7, 27, 127, 195, 255])]) + data[at + 1 :]
        case "cut":
            return data[:at]
        case "wrap":
            return data[:at] + b"\n" + data[at:]
        case "join":
            return data[:end] + data[end + 1 :] if end < len(data) - 1 else data[: begin - 1] + data[begin:]
        case "lose":
            return data[:begin] + data[end + 1 :]
        case "repeat":
            return data[: end + 1] + data[begin:]
    raise ValueError(kind)


@pytest.fixture
def damage():
    return damage_bytes


# ---------------------------------------------------------------- a service that speaks as HITRANonline does


class Service:
    """The lines that the server has, what it was asked, and how it is to fail next."""

    def __init__(self):
        rng = np.random.default_rng(7)
        nu = np.sort(np.concatenate([rng.uniform(510, 1700, 300), rng.uniform(2300, 2400, 200)]))
        self.lines = Lines.make(
            molecule=2, isotopologue=np.arange(500) % 3 + 1, wavenumber_per_cm=np.round(nu, 6), intensity_cm=1e-22,
            lower_energy_per_cm=100.0, air_width_per_cm_atm=0.07, self_width_per_cm_atm=0.09, temperature_exponent=0.7,
        )  # fmt: skip
        self.questions: list[dict[str, str]] = []
        self.faults: list[str] = []
        self.always: str | None = None
        self.release = threading.Event()

    def answer(self, question: dict[str, str]) -> bytes:
        """Records as the service writes them: 160 characters, then what was asked for beside them."""
        hapi = quiet_hapi()
        pairs = {tuple(hapi.ISO_ID[int(i)][:2]) for i in question["iso_ids_list"].split(",")}
        lines = self.lines
        asked = [(int(m), int(i)) in pairs for m, i in zip(lines.molecule, lines.isotopologue, strict=True)]
        nu = lines.wavenumber_per_cm
        lines = lines.where(np.array(asked) & (nu >= float(question["numin"])) & (nu <= float(question["numax"])))
        values = {"gamma_H2": "0.105", "n_H2": "0.6", "gamma_He": "0.06", "n_He": "#"}
        names = question["request_params"].split(",")
        assert names[0] == "par_line"
        beside = "".join("," + values.get(name, "#") for name in names[1:])
        return "".join(record + beside + "\n" for record in format_par(lines).splitlines()).encode()


def handler_for(service):
    class Handler(BaseHTTPRequestHandler):
        protocol_version = "HTTP/1.1"

        def log_message(self, *arguments):
            pass

        def do_GET(self):
            parts = urlsplit(self.path)
            question = {name: values[0] for name, values in parse_qs(parts.query).items()}
            service.questions.append(question | {"path": parts.path, "agent": self.headers["User-Agent"]})
            fault = service.faults.pop(0) if service.faults else service.always
            body = service.answer(question)
            getattr(self, f"do_{fault}" if fault else "do_well")(body)

        def do_well(self, body):
            if not body:
                self.do_404(body)
                return
            self.send_response(200)
            self.send_header("Content-Type", "text/plain")
            self.send_header("Transfer-Encoding", "chunked")
            self.end_headers()
            for start in range(0, len(body), 5000):
                piece = body[start : start + 5000]
                self.wfile.write(f"{len(piece):x}\r\n".encode() + piece + b"\r\n")
            self.wfile.write(b"0\r\n\r\n")

        def do_nothing_found(self, body):
            self.send_response(200)
            self.send_header("Content-Length", "0")
            self.end_headers()

        def do_404(self, body, status=404, **headers):
            self.send_response(status)
            for name, value in headers.items():
                self.send_header(name.replace("_", "-"), value)
            self.send_header("Content-Length", "0")
            self.end_headers()

        def do_403(self, body):
            self.do_404(body, 403)

        def do_429(self, body):
            self.do_404(body, 429, Retry_After="7")

        def do_503(self, body):
            self.do_404(body, 503)

        def do_400(self, body):
            self.do_404(body, 400)

        def do_truncated(self, body, at=None):
            self.send_response(200)
            self.send_header("Content-Length", str(len(body)))
            self.end_headers()
            self.wfile.write(body[: len(body) // 2 if at is None else at])
            self.close_connection = True

        def do_truncated_between_records(self, body):
            self.do_truncated(body, body.index(b"\n") + 1)

        def do_truncated_chunks(self, body):
            self.send_response(200)
            self.send_header("Transfer-Encoding", "chunked")
            self.end_headers()
            self.wfile.write(f"{len(body):x}\r\n".encode() + body[: len(body) // 3])
            self.close_connection = True

        def do_garbage(self, body):
            self.send_whole(b"<html><body>Service is being maintained</body></html>\n")

        def do_binary(self, body):
            self.send_whole(bytes(range(256)) * 20)

        def do_other_molecule(self, body):
            self.send_whole(b"\n".join(b" 1" + row[2:] for row in body.splitlines()) + b"\n")

        def do_other_range(self, body):
            self.send_whole(b"\n".join(row[:3] + b" 9999.000000" + row[15:] for row in body.splitlines()) + b"\n")

        def do_other_parameters(self, body):
            self.send_whole(b"\n".join(row[:160] for row in body.splitlines()) + b"\n")

        def send_whole(self, body):
            self.send_response(200)
            self.send_header("Content-Length", str(len(body)))
            self.end_headers()
            self.wfile.write(body)

        def do_hang(self, body):
            service.release.wait(5)
            self.close_connection = True

        def do_stall(self, body):
            self.send_response(200)
            self.send_header("Content-Length", str(len(body)))
            self.end_headers()
            self.wfile.write(body[:500])
            self.wfile.flush()
            service.release.wait(5)
            self.close_connection = True

        def do_slow_start(self, body):
            time.sleep(0.3)
            self.do_well(body)

        def do_drop(self, body):
            self.connection.shutdown(socket.SHUT_RDWR)
            self.close_connection = True

    return Handler


@pytest.fixture
def service(monkeypatch):
    """A running service; `service.address` is where."""
    monkeypatch.setenv("NO_PROXY", "127.0.0.1")
    state = Service()
    server = ThreadingHTTPServer(("127.0.0.1", 0), handler_for(state))
    server.daemon_threads = True
    state.address = f"http://127.0.0.1:{server.server_port}"
    thread = threading.Thread(target=server.serve_forever, kwargs={"poll_interval": 0.02})
    thread.start()
    yield state
    state.release.set()
    server.shutdown()
    server.server_close()
    thread.join()
