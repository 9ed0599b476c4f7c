"""`trundle link`: robots on a socket. Make keys, look at one, put its adapter through a trial, serve a simulated."""

from __future__ import annotations

import argparse
import os
import sys
from typing import TYPE_CHECKING

from runner.cli.exits import Exit

if TYPE_CHECKING:
    from pathlib import Path

    from backends.contract import Line

NOT_A_SAFETY_DEVICE = (
    "Trundle is no safety device: a halt is a request through software and a line. What protects people is the\n"
    "emergency stop and the robot's own protective stop. The site's rules and the standards that apply there come\n"
    "first, and the people licensed to apply them."
)


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "link",
        help="a robot on a socket: keys, a look, an adapter's trial, a simulated one",
        description="Everything about robots on a socket, by the protocol of backends/link/PROTOCOL.md.",
    )
    parts = parser.add_subparsers(dest="part", metavar="PART", required=True)
    _add_keys(parts)
    _add_look(parts)
    _add_try(parts)
    _add_serve(parts)


def _add_keys(parts: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = parts.add_parser("keys", help="make a pair of keys", description="Makes NAME.secret and NAME.public.")
    parser.add_argument("name", metavar="NAME", help="whose keys they are: a robot or a computer")
    parser.add_argument("--in", dest="folder", default=None, metavar="FOLDER", help="where to (default: "
                        "trundle/keys in the user's configuration)")  # fmt: skip


def _add_look(parts: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = parts.add_parser(
        "look",
        help="say who is there and how good the line is",
        description="Greets a robot for some seconds, without taking control of it, and says how good the line is.",
    )
    parser.add_argument("address", metavar="ADDRESS", help="tcp://HOST:PORT or ipc:///PATH")
    parser.add_argument("--seconds", type=float, default=3.0, metavar="N", help="for how long (default: 3)")
    add_key_options(parser)


def _add_try(parts: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = parts.add_parser(
        "try",
        help="put an adapter through the requirements of the protocol",
        description=f"Tries each requirement of the protocol against a live adapter.\n\n{NOT_A_SAFETY_DEVICE}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("address", metavar="ADDRESS", help="tcp://HOST:PORT or ipc:///PATH")
    parser.add_argument("--standing", action="store_true", help="leave out what moves the robot")
    parser.add_argument("--speed", type=float, default=0.2, metavar="M_S", help="how fast it moves (default: 0.2)")
    parser.add_argument("--ahead", type=float, default=1.0, metavar="M", help="how far ahead it moves (default: 1)")
    parser.add_argument("--only", type=int, nargs="+", default=(), metavar="N", help="try only these requirements")
    parser.add_argument("--restart", action="store_true", help="ask for a restart of the adapter at the end")
    parser.add_argument("--json", metavar="FILE", help="write the results as JSON; - for the standard output")
    add_area_option(parser)
    add_key_options(parser)


def _add_serve(parts: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = parts.add_parser(
        "serve",
        help="serve a simulated robot",
        description="Puts the simulated robot of a mission on a socket, in real time, as a robot would be.",
    )
    parser.add_argument("mission", metavar="MISSION", help="whose site, robot and start: a file or an example's name")
    parser.add_argument("--at", default="tcp://127.0.0.1:7410", metavar="ADDRESS", help="(default: %(default)s)")
    parser.add_argument("--conditions", metavar="NAME", help="what the simulated world does: a file or an example")
    parser.add_argument("--seed", type=int, default=1, metavar="N", help="of the simulated world (default: 1)")
    parser.add_argument("--backend", default="sim", metavar="NAME", help="what to put behind it (default: sim)")
    parser.add_argument("--pace", type=float, default=1.0, metavar="N", help="simulated seconds a second (default: 1)")
    parser.add_argument("--keep", metavar="FILE", help="where it stands and its goals, kept over a restart; "
                        "what the conditions do begins anew all the same")  # fmt: skip
    parser.add_argument("--key", metavar="FILE", help="the robot's secret key")
    parser.add_argument("--allow", metavar="PATH", help="public keys that are admitted: a folder or a file")
    parser.add_argument("--insecure-line", action="store_true", help="plain text beyond this computer, at your risk")


def add_key_options(parser: argparse.ArgumentParser) -> None:
    """The options of every command that reaches a robot."""
    parser.add_argument("--key", metavar="FILE", default="", help="our own secret key")
    parser.add_argument("--robot-key", metavar="FILE", default="", help="the robot's public key")
    parser.add_argument("--insecure-line", action="store_true", help="plain text beyond this computer, at your risk")


def add_area_option(parser: argparse.ArgumentParser) -> None:
    """For scripts: what a person is asked otherwise."""
    parser.add_argument(
        "--area-clear", action="store_true", help="say that the area is clear and an emergency stop is in reach"
    )


def add_robot_options(parser: argparse.ArgumentParser) -> None:
    """The options of `trundle run` for a robot on a socket."""
    parser.add_argument("--robot", metavar="ADDRESS", help="run a robot on a socket: tcp://HOST:PORT or ipc:///PATH")
    add_area_option(parser)
    add_key_options(parser)


def line_of(arguments: argparse.Namespace, address: str) -> Line:
    """The way to a robot, from the options of a command. Warns where it is plain on purpose."""
    from backends.contract import Line

    if arguments.insecure_line and not arguments.key:
        _warn_of_plain_text()
    return Line(address, key_file=arguments.key, robot_key_file=arguments.robot_key, insecure=arguments.insecure_line)


def _warn_of_plain_text() -> None:
    print("Warning: the line is plain. Everybody on the way can read it, and drive the robot.", file=sys.stderr)


def area_is_clear(address: str, said_so: bool, always: bool = False) -> bool:
    """Whether a person says that the robot may move. Asked of every robot that is not on this computer, or `always`."""
    from backends.link.sockets import on_this_computer

    if said_so or (on_this_computer(address) and not always):
        return True
    print(f"The robot at {address} is about to move.\n{NOT_A_SAFETY_DEVICE}", file=sys.stderr)
    if not sys.stdin.isatty():
        print("Say --area-clear if the area is clear and an emergency stop is in reach.", file=sys.stderr)
        return False
    print("Is the area clear, and is an emergency stop in reach? Write yes: ", end="", file=sys.stderr, flush=True)
    return sys.stdin.readline().strip().lower() == "yes"


def run(arguments: argparse.Namespace) -> int:
    from backends.contract import BackendError

    parts = {"keys": _keys, "look": _look, "try": _try, "serve": _serve}
    try:
        return parts[arguments.part](arguments)
    except BackendError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE


def keys_folder() -> Path:
    """Where keys are unless said otherwise."""
    from pathlib import Path

    base = os.environ.get("XDG_CONFIG_HOME") or str(Path.home() / ".config")
    return Path(base) / "trundle" / "keys"


def _keys(arguments: argparse.Namespace) -> int:
    from pathlib import Path

    from backends.contract import BackendError
    from backends.link.keys import make_pair

    if not arguments.name or not all(letter.isalnum() or letter in "-_" for letter in arguments.name):
        raise BackendError(f'"{arguments.name}" is no name for keys: use letters, digits, - and _.')
    secret, public = make_pair(Path(arguments.folder) if arguments.folder else keys_folder(), arguments.name)
    print(f"{secret}  stays here; only its owner may read it\n{public}  goes to the other side")
    return Exit.OK


def _look(arguments: argparse.Namespace) -> int:
    from backends.link.looking import look

    line = line_of(arguments, arguments.address)
    for text in look(line, max(0.2, arguments.seconds)):
        print(text, flush=True)
    return Exit.OK


def _try(arguments: argparse.Namespace) -> int:
    from runner.cli.trying import try_adapter

    return try_adapter(arguments, line_of(arguments, arguments.address))


def _serve(arguments: argparse.Namespace) -> int:
    from runner.cli.serving import serve

    if arguments.insecure_line and not arguments.key:
        _warn_of_plain_text()
    return serve(arguments)
