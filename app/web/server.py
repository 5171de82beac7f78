"""The server: one process, the loopback interface, no log of who asked for what."""

from __future__ import annotations

import socket
from collections.abc import Callable

import uvicorn

from app.actions.desk import Desk
from app.errors import SetupError
from app.settings import Settings
from app.web.application import Application, create_app
from app.web.gate import Address
from app.web.keys import Keys

LOOPBACK = "127.0.0.1"
SECONDS_TO_FINISH = 3

Announce = Callable[[str, str], None]
"""Told the closed link and the open link, once the server can be reached."""


def serve(settings: Settings, desk: Desk, *, port: int, announce: Announce) -> None:
    """Serve `desk` until interrupted; port 0 takes a free one."""
    with listening(port) as bound:
        address = Address(bound.getsockname()[1])
        keys = Keys.made_from(settings.random_bytes)
        app = create_app(settings, desk, keys, port=address.port)
        announce(enter_link(address, keys.closed), enter_link(address, keys.open))
        try:
            uvicorn.Server(config_of(app)).run(sockets=[bound])
        except KeyboardInterrupt:
            return  # how a server is stopped


def enter_link(address: Address, key: str) -> str:
    return f"{address.url}/enter/{key}"


def listening(port: int) -> socket.socket:
    """A socket that takes connections already, so that a link that is printed works at once."""
    # the protocol is named because asyncio asks for it before it switches off the 40 ms of delayed sending
    bound = socket.socket(socket.AF_INET, socket.SOCK_STREAM, socket.IPPROTO_TCP)
    try:
        bound.bind((LOOPBACK, port))
        bound.listen()
    except OSError as refusal:
        bound.close()
        raise SetupError(
            "the port cannot be used",
            where=LOOPBACK,
            found=f"{port} ({refusal.strerror})",
            accepted="a port that no other program uses",
            remedy="Leave --port out to take a free one",
        ) from refusal
    return bound


def config_of(app: Application) -> uvicorn.Config:
    """No access log, no word about the server, no trust in forwarded headers, no open ends at stopping."""
    return uvicorn.Config(
        app,
        access_log=False,
        log_config=None,
        server_header=False,
        proxy_headers=False,
        lifespan="off",
        ws="none",
        timeout_graceful_shutdown=SECONDS_TO_FINISH,
    )
