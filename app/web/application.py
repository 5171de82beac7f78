"""The application: its layers from the outside in, and its routes."""

from __future__ import annotations

from fastapi import FastAPI
from fastapi.telemetry import TelemetryConfig
from starlette.middleware import Middleware
from starlette.staticfiles import StaticFiles
from starlette.types import ASGIApp

from app.actions.desk import Desk
from app.assets import asset
from app.render.page import page_environment
from app.settings import Settings
from app.web.errors import UnexpectedErrors, answer_errors
from app.web.gate import Address, Gate
from app.web.headers import StrictHeaders
from app.web.keys import Keys
from app.web.limits import BodyLimit
from app.web.pages import Pages
from app.web.routes import acts, amending, entering, looks, receiving, record, verification
from app.web.sessions import Sessions
from app.web.site import Site
from app.web.verifying import Verifying

NO_TELEMETRY: TelemetryConfig = {"tracing": False, "metrics": False, "logs": False, "auto_configure": False}


class Application(FastAPI):
    """FastAPI, with the strict headers outside everything it adds itself."""

    def build_middleware_stack(self) -> ASGIApp:
        return StrictHeaders(super().build_middleware_stack())


def create_app(settings: Settings, desk: Desk, keys: Keys, *, port: int) -> Application:
    """The pages of one trial file, as served at this port of the loopback interface."""
    address = Address(port)
    sessions = Sessions(settings)
    environment = page_environment(asset("templates"))
    pages = Pages(environment)
    app = Application(
        docs_url=None,
        redoc_url=None,
        openapi_url=None,
        redirect_slashes=False,
        telemetry=NO_TELEMETRY,
        middleware=[
            Middleware(UnexpectedErrors, settings=settings, pages=pages),
            Middleware(Gate, address=address, sessions=sessions, pages=pages),
            Middleware(BodyLimit, limits=settings.limits, pages=pages),
        ],
    )
    app.state.site = Site(settings, desk, keys, address, sessions, environment, pages, Verifying(desk))
    answer_errors(app, pages)
    for module in (entering, receiving, acts, record, amending, verification, looks):
        app.include_router(module.router)
    app.mount("/static", StaticFiles(directory=asset("static")), name="static")
    return app
