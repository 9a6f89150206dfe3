"""``backveer desk``: the local web page."""

from __future__ import annotations

import click

from backveer.io.atomic import WriteError


@click.command(short_help="The local web page: drop a file and see the answer.")
@click.option(
    "--port",
    type=click.IntRange(0, 65535),
    default=0,
    help="Port on the loopback address; a free one when left out.",
)
@click.option("--open/--no-open", "browse", default=True, help="Open it in the browser.")
def desk(port: int, browse: bool) -> int:
    """
    Open a page on this machine only: drop a file, correct how it was read, see the answer.

    Stops with Ctrl-C; everything that was dropped is then removed.
    """
    try:
        import uvicorn

        from backveer.io.desk.server import application
    except ImportError as error:
        raise WriteError(
            f"the desk needs {error.name}. Install it with: pip install 'backveer[desk]'."
        ) from None
    import secrets
    import socket

    token = secrets.token_urlsafe(24)
    listener = socket.socket(socket.AF_INET, socket.SOCK_STREAM)
    try:
        listener.bind(("127.0.0.1", port))
    except OSError as error:
        raise WriteError(
            f"port {port} cannot be used ({error.strerror}). Leave --port out for a free one."
        ) from None
    address = f"http://127.0.0.1:{listener.getsockname()[1]}/?token={token}"
    click.echo(f"The desk is open on this machine only: {address}")
    click.echo("Ctrl-C closes it and removes what was dropped.")
    if browse:
        import webbrowser

        webbrowser.open(address)
    config = uvicorn.Config(
        application(token),
        log_level="warning",
        access_log=False,
        server_header=False,
        timeout_keep_alive=30,
        limit_concurrency=200,
    )
    uvicorn.Server(config).run(sockets=[listener])
    return 0
