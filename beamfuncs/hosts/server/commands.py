"""The command `beamfuncs serve`."""

from __future__ import annotations

import sys
from typing import Annotated

import typer

from beamfuncs.hosts.server import IDLE
from beamfuncs.status import DONE_WITH_ERRORS, NOTHING_DONE, give_up


def serve(
    stop: Annotated[bool, typer.Option("--stop", help="Stop the server that runs.")] = False,
    status: Annotated[bool, typer.Option("--status", help="Tell whether a server runs.")] = False,
    idle: Annotated[
        float, typer.Option("--idle", metavar="SECONDS", min=0.1, help="End after so long without a call.")
    ] = IDLE,
) -> None:
    """Run the function server, which computes for the spreadsheet programs of this user.

    They start it themselves: the command is there to look after it.
    Exit status: 0 done; 1 no server runs (--status); 2 nothing done.
    """
    from beamfuncs.hosts.calc.component.beamfuncs_client.connecting import HungError
    from beamfuncs.hosts.calc.component.beamfuncs_client.places import UnusableError

    try:
        if stop:
            _stop()
        elif status:
            _tell_status()
        else:
            _run(idle)
    except (HungError, UnusableError, OSError) as error:
        give_up(str(error))


def _stop() -> None:
    from beamfuncs.hosts.server import control

    print("the function server has been stopped" if control.stop() else "no function server runs")


def _tell_status() -> None:
    from beamfuncs.hosts.calc.component.beamfuncs_client import places
    from beamfuncs.hosts.server import control

    told = control.status()
    if told is None:
        print("no function server runs")
        raise typer.Exit(DONE_WITH_ERRORS)
    print(
        f"the function server runs: beamfuncs {told['version']}, process {told['pid']:.0f},"
        f" for {told['seconds']:.0f} s, connected {told['hosts']:.0f}, calls {told['calls']:.0f}; log {places.log()}"
    )


def _run(idle: float) -> None:
    from beamfuncs.hosts.server import control, serving

    if told := control.status():
        give_up(f"the function server of this user runs already, process {told['pid']:.0f}")
    print(f"the function server runs until it has had no call for {idle:g} s; Ctrl-C stops it", file=sys.stderr)
    if serving.serve(idle):
        raise typer.Exit(NOTHING_DONE)
