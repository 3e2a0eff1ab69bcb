"""``acidity serve``: the page for chemists, on this machine."""

from __future__ import annotations

import argparse
import importlib.util
import socket
import sys
import threading
import webbrowser
from pathlib import Path

from qsar.errors import UserError

HELP = "start the page for chemists on this machine"

_NEEDED = ("fastapi", "uvicorn", "jinja2", "python_multipart")
_EVERYWHERE = ("0.0.0.0", "::")


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "--host",
        default="127.0.0.1",
        metavar="ADDRESS",
        help="address to listen on (default: 127.0.0.1, this machine alone); there is no password, so any other "
        "address opens the page to whoever reaches it",
    )
    parser.add_argument(
        "--port", type=_port, default=8420, metavar="N", help="port (default: 8420; 0 takes a free one)"
    )
    parser.add_argument(
        "--allow-host",
        action="append",
        default=[],
        metavar="NAME",
        help="another name under which the page is asked for, where --host is not this machine alone",
    )
    parser.add_argument(
        "--model", type=Path, metavar="FOLDER", help="folder of another model than the shipped one"
    )
    parser.add_argument("--workers", type=_workers, metavar="N", help="processes for the chemistry (default: 2 to 4)")
    parser.add_argument("--open", action="store_true", help="open the page in the browser")


def _port(text: str) -> int:
    if not text.isascii() or not text.isdigit() or int(text) > 65535:
        raise argparse.ArgumentTypeError(f"{text!r} is not a port, 0 to 65535")
    return int(text)


def _workers(text: str) -> int:
    if not text.isascii() or not text.isdigit() or not 2 <= int(text) <= 64:
        raise argparse.ArgumentTypeError(f"{text!r} is not a number of processes from 2 to 64")
    return int(text)


def run(args: argparse.Namespace) -> int:
    """Run the command until it is interrupted.

    Returns
    -------
    int
        0 when it is ended.

    Raises
    ------
    UserError
        If something is not installed, the address cannot be had, or the model cannot be read.
    """
    missing = [name for name in _NEEDED if importlib.util.find_spec(name) is None]
    if missing:
        raise UserError(f"the page needs {', '.join(missing)}; install them with: pip install 'qsar[page]'")
    import uvicorn

    from qsar.model import load_model
    from qsar.service.app import create_app
    from qsar.service.settings import LOCAL_HOSTS, Settings, default_workers

    load_model(args.model)  # what is wrong with it is said here, not in the browser
    own = () if args.host in _EVERYWHERE else (_bracketed(args.host.lower()),)
    settings = Settings(
        hosts=tuple(dict.fromkeys((*LOCAL_HOSTS, *own, *(_bracketed(h.lower()) for h in args.allow_host)))),
        model=args.model,
        workers=args.workers or default_workers(),
    )
    listener = _listen(args.host, args.port)
    shown = "127.0.0.1" if args.host in _EVERYWHERE else args.host
    address = f"http://{_bracketed(shown)}:{listener.getsockname()[1]}/"
    print(f"acidity: the page is at {address} (Ctrl-C ends it)", file=sys.stderr, flush=True)
    if args.open:
        threading.Timer(1.0, webbrowser.open, [address]).start()
    config = uvicorn.Config(
        create_app(settings),
        log_level="warning",
        server_header=False,
        date_header=False,
        timeout_keep_alive=30,
        timeout_graceful_shutdown=3,
        http="h11",
        h11_max_incomplete_event_size=1 << 18,  # an address may hold a long SMILES
    )
    uvicorn.Server(config).run(sockets=[listener])
    return 0


def _bracketed(host: str) -> str:
    return f"[{host}]" if ":" in host and not host.startswith("[") else host


def _listen(host: str, port: int) -> socket.socket:
    try:
        family, kind, protocol, _, address = socket.getaddrinfo(host, port, type=socket.SOCK_STREAM)[0]
        listener = socket.socket(family, kind, protocol)
        listener.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        listener.bind(address)
        listener.listen(256)  # who reads the address that is printed may connect at once
    except OSError as problem:
        raise UserError(
            f"cannot listen on {host}:{port} ({problem.strerror or problem}); choose another --host or --port"
        ) from problem
    return listener
