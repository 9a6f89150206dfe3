"""
The routes of the desk, and who may ask.

Bound to the loopback address. A browser gets in with the start token, once, and then holds a cookie
that scripts cannot read; every change must come from the desk's own page (Origin, a header that a
foreign page cannot send, SameSite). Uploads are counted as they arrive.
"""

from __future__ import annotations

import asyncio
import hmac
import json
import secrets
from collections.abc import AsyncIterator, Awaitable, Callable
from contextlib import asynccontextmanager
from typing import Any
from urllib.parse import unquote

from starlette.applications import Starlette
from starlette.concurrency import run_in_threadpool
from starlette.middleware import Middleware
from starlette.middleware.trustedhost import TrustedHostMiddleware
from starlette.requests import Request
from starlette.responses import JSONResponse, PlainTextResponse, RedirectResponse, Response
from starlette.routing import Route

from backveer.io.browser import asset
from backveer.io.desk import answer as answers
from backveer.io.desk.session import Session, Sessions, Upload
from backveer.profiles.flags import FLAGS

LIMIT = 256 * 1024 * 1024  # bytes of an upload
TIME = 120.0  # seconds that an upload may take to arrive
COOKIE = "backveer_desk"
POLICY = (
    "default-src 'none'; script-src 'self'; style-src 'self'; connect-src 'self'; "
    "img-src 'self' data:; base-uri 'none'; form-action 'none'; frame-ancestors 'none'"
)
HEADERS = {
    "Content-Security-Policy": POLICY,
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cache-Control": "no-store",
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
}
ASSETS = {
    "statement.js": "text/javascript",
    "d3.min.js": "text/javascript",
    "desk.js": "text/javascript",
    "statement.css": "text/css",
    "desk.css": "text/css",
}


def application(token: str, limit: int = LIMIT, time: float = TIME) -> Starlette:
    """
    Build the desk.

    Parameters
    ----------
    token
        What lets a browser in.
    limit, time
        Largest upload [bytes] and the longest that it may take to arrive [s].
    """
    sessions = Sessions()
    jobs: dict[str, tuple[Session, answers.Work, asyncio.Task[Any]]] = {}

    @asynccontextmanager
    async def lifespan(_: Starlette) -> AsyncIterator[None]:
        try:
            yield
        finally:
            for _session, work, _task in jobs.values():
                work.cancelled.set()
            sessions.close()

    Handler = Callable[[Request, Session], Awaitable[Response]]

    def guarded(handler: Handler) -> Callable[[Request], Awaitable[Response]]:
        async def handle(request: Request) -> Response:
            session = sessions.get(request.cookies.get(COOKIE))
            if session is None:
                return _refused("open the desk with the address that the command printed", 403)
            if request.method not in ("GET", "HEAD"):
                origin = request.headers.get("origin")
                if request.headers.get("x-backveer") != "desk" or (
                    origin is not None and origin != _own_origin(request)
                ):
                    return _refused("only the desk's own page may ask that", 403)
            try:
                return await handler(request, session)
            except answers.BadCall as error:
                return _refused(str(error), 422)

        return handle

    async def front(request: Request) -> Response:
        given = request.query_params.get("token")
        if given is not None:
            if not hmac.compare_digest(given.encode(), token.encode()):
                return _refused("the token in the address is not this desk's", 403)
            response: Response = RedirectResponse("/", status_code=303)
            if sessions.get(request.cookies.get(COOKIE)) is None:
                response.set_cookie(COOKIE, sessions.new(), httponly=True, samesite="strict")
            return response
        if sessions.get(request.cookies.get(COOKIE)) is None:
            return _refused("open the desk with the address that the command printed", 403)
        return Response(asset("desk.html"), media_type="text/html")

    async def static(request: Request) -> Response:
        name = request.path_params["name"]
        if name not in ASSETS:
            return _refused("there is no such part", 404)
        return Response(asset(name), media_type=ASSETS[name])

    async def state(_: Request, session: Session) -> Response:
        return JSONResponse(
            {
                "uploads": [
                    {"key": upload.key, "name": upload.name, "said": upload.said}
                    for upload in session.uploads.values()
                ]
            }
        )

    async def flags(_: Request, session: Session) -> Response:
        return JSONResponse({str(flag.bit): flag.name for flag in FLAGS})

    async def upload(request: Request, session: Session) -> Response:
        name = unquote(request.headers.get("x-name", "pasted table"))
        name = name.replace("\\", "/").rsplit("/", 1)[-1][:120] or "pasted table"
        declared = request.headers.get("content-length", "")
        if declared.isdigit() and int(declared) > limit:
            return _refused(_too_large(limit), 413)
        pieces, size = [], 0
        try:
            async with asyncio.timeout(time):
                async for piece in request.stream():
                    size += len(piece)
                    if size > limit:
                        return _refused(_too_large(limit), 413)
                    pieces.append(piece)
        except TimeoutError:
            return _refused(f"the file took longer than {time:g} s to arrive", 408)
        kept = await run_in_threadpool(session.add, name, b"".join(pieces))
        return JSONResponse({"key": kept.key, "name": kept.name})

    async def ask(request: Request, session: Session) -> Response:
        chosen = _upload(request, session)
        body = await request.body()
        if len(body) > 100_000:
            return _refused("that is more than can be said of a file", 413)
        try:
            said = json.loads(body or b"{}")
        except (UnicodeDecodeError, json.JSONDecodeError, RecursionError):
            return _refused("what was said is not JSON", 422)
        if not isinstance(said, dict):
            return _refused("what was said is not JSON", 422)
        answers.hints_of(said)
        answers.settings_of(said)
        chosen.said = said
        work = answers.Work()
        task = asyncio.ensure_future(run_in_threadpool(answers.answer, chosen, work))
        done, _ = await asyncio.wait({task}, timeout=0.8)
        if done:
            return JSONResponse(task.result())
        key = secrets.token_hex(8)
        jobs[key] = (session, work, task)
        return JSONResponse({"job": key, "done": work.done}, status_code=202)

    async def job(request: Request, session: Session) -> Response:
        key = request.path_params["key"]
        if key not in jobs or jobs[key][0] is not session:
            return _refused("there is no such work", 404)
        _, work, task = jobs[key]
        if request.method == "DELETE":
            work.cancelled.set()
            jobs.pop(key)
            await asyncio.wait({task}, timeout=5)
            return JSONResponse({"cancelled": True})
        await asyncio.wait({task}, timeout=0.3)
        if not task.done():
            return JSONResponse({"job": key, "done": work.done}, status_code=202)
        jobs.pop(key)
        return JSONResponse(task.result())

    async def forget(request: Request, session: Session) -> Response:
        session.remove(_upload(request, session).key)
        return JSONResponse({"forgotten": True})

    async def export(request: Request, session: Session) -> Response:
        chosen = _upload(request, session)
        kind = request.path_params["kind"]
        if kind == "mapping.toml":
            return _download(answers.mapping_toml(chosen.said), kind, "application/toml")
        if kind == "command.txt":
            return PlainTextResponse(answers.command_line(chosen) + "\n")
        if kind in ("statement.json", "report.html"):
            text = await run_in_threadpool(exported, chosen, kind)
            media = "application/json" if kind.endswith("json") else "text/html"
            return _download(text, kind, media)
        return _refused("there is no such export", 404)

    def _upload(request: Request, session: Session) -> Upload:
        chosen = session.uploads.get(request.path_params["key"])
        if chosen is None:
            raise answers.BadCall("that file is no longer open; drop it again")
        return chosen

    routes = [
        Route("/", front),
        Route("/part/{name}", static),
        Route("/state", guarded(state)),
        Route("/flags", guarded(flags)),
        Route("/files", guarded(upload), methods=["POST"]),
        Route("/files/{key}", guarded(forget), methods=["DELETE"]),
        Route("/files/{key}/answer", guarded(ask), methods=["POST"]),
        Route("/files/{key}/{kind}", guarded(export)),
        Route("/jobs/{key}", guarded(job), methods=["GET", "DELETE"]),
    ]
    built = Starlette(
        routes=routes,
        lifespan=lifespan,
        middleware=[Middleware(TrustedHostMiddleware, allowed_hosts=["127.0.0.1", "localhost"])],
        exception_handlers={Exception: _fault},
    )
    built.add_middleware(_Headers)
    built.state.sessions = sessions
    return built


def exported(upload: Upload, kind: str) -> str:
    """Write the JSON or the report of an upload, as the command line would."""
    import io

    from backveer.io.report.page import page
    from backveer.io.words.record import write_json
    from backveer.profiles.statement import statement

    reading = answers.read_upload(upload)
    if not reading.files:
        raise answers.BadCall("the file could not be read, so there is nothing to save")
    said = statement(reading.stack, answers.settings_of(upload.said))
    if kind == "statement.json":
        out = io.StringIO()
        write_json(out, reading, said)
        return out.getvalue()
    shown = upload.said.get("shown")
    units = shown if shown in ("si", "aviation") else "si"
    return page(reading, said, units=units, options=answers.command_line(upload))


class _Headers:
    """Put the same headers on every answer, errors too."""

    def __init__(self, app: Any) -> None:
        self.app = app

    async def __call__(self, scope: Any, receive: Any, send: Any) -> None:
        async def with_headers(message: Any) -> None:
            if message["type"] == "http.response.start":
                message["headers"] = [
                    *message.get("headers", []),
                    *((name.lower().encode(), value.encode()) for name, value in HEADERS.items()),
                ]
            await send(message)

        await self.app(scope, receive, with_headers if scope["type"] == "http" else send)


def _own_origin(request: Request) -> str:
    return f"http://{request.headers.get('host', '')}"


def _refused(problem: str, status: int) -> Response:
    return JSONResponse({"problem": problem}, status_code=status)


async def _fault(_: Request, error: Exception) -> Response:
    return _refused(f"internal fault ({type(error).__name__}); please report it", 500)


def _too_large(limit: int) -> str:
    return f"the file is larger than {limit // (1024 * 1024)} MB; use the command line for it"


def _download(text: str, name: str, media: str) -> Response:
    return Response(
        text, media_type=media, headers={"Content-Disposition": f'attachment; filename="{name}"'}
    )
