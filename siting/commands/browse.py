"""`siting browse`: the web pages, on this computer."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

from siting.commands.command import FOUND

if TYPE_CHECKING:
    import argparse


def add(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    """Add the command and its options."""
    parser = commands.add_parser(
        "browse",
        help="open the web pages on a study",
        description="Serve the web pages on this computer until Ctrl-C. Without a study, the demo is opened.",
    )
    parser.add_argument("study", nargs="?", metavar="STUDY", help="folder of CSV tables, or an .xlsx workbook")
    parser.add_argument("--address", default="127.0.0.1", help="where to listen (default: this computer alone)")
    parser.add_argument("--port", type=int, help="port to listen on (default: the first free one from 8501 on)")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """Serve until interrupted."""
    from siting.browse.serve import free_port, serve
    from siting.study.demo import study_path

    study = study_path(arguments.study) if arguments.study else None
    port = free_port(arguments.address, arguments.port)
    host = f"[{arguments.address}]" if ":" in arguments.address else arguments.address
    sys.stdout.write(f"siting is at http://{host}:{port} - stop it with Ctrl-C\n")
    sys.stdout.flush()
    serve(study, address=arguments.address, port=port)
    return FOUND
