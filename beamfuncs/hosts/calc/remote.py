"""An office without a window, started and spoken to from a Python that knows the office's own modules.

This file stands alone, as that Python knows nothing of beamfuncs. As a script it puts an extension into a profile or
takes it out, where the office's own tool will not because it is run by root:

    python remote.py SOFFICE PROFILE add FILE.oxt
    python remote.py SOFFICE PROFILE remove IDENTIFIER
"""

from __future__ import annotations

import subprocess
import sys
import time
import uuid
from contextlib import suppress
from pathlib import Path
from typing import Any

STARTED_ANEW = 81
"""The status with which an office ends that has made a profile, or changed it, and wants to be started again."""
PATIENCE = 120.0
POLLED = 0.05


class NotStarted(Exception):
    """The office was not started; the message says why."""


class Remote:
    """A running office: `context` is its component context, `desktop` its desktop. Ended when the block is left."""

    def __init__(self, soffice: Path, profile: Path) -> None:
        """Start the office in a profile and connect to it."""
        import uno

        self._channel = f"pipe,name=beamfuncs{uuid.uuid4().hex};urp;StarOffice.ComponentContext"
        silent = ["--headless", "--invisible", "--norestore", "--nologo", "--nodefault", "--nofirststartwizard"]
        self._command = [
            str(soffice),
            *silent,
            f"--accept={self._channel}",
            f"-env:UserInstallation={profile.as_uri()}",
        ]
        self.process = self._launched()
        local = uno.getComponentContext()
        resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
        self.context = self._connected(resolver)
        self.desktop = self.service("com.sun.star.frame.Desktop")

    def service(self, name: str) -> Any:
        """Return a new instance of one of the office's services."""
        return self.context.ServiceManager.createInstanceWithContext(name, self.context)

    def end(self) -> None:
        """End the office and wait for it."""
        with suppress(Exception):  # the office may hang up before it answers
            self.desktop.terminate()
        try:
            self.process.wait(PATIENCE)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()

    def __enter__(self) -> Remote:
        return self

    def __exit__(self, *_: object) -> None:
        self.end()

    def _launched(self) -> subprocess.Popen[bytes]:
        nothing = subprocess.DEVNULL
        return subprocess.Popen(self._command, stdin=nothing, stdout=nothing, stderr=nothing)

    def _connected(self, resolver: Any) -> Any:
        from com.sun.star.connection import NoConnectException

        until = time.monotonic() + PATIENCE
        while time.monotonic() < until:
            try:
                return resolver.resolve(f"uno:{self._channel}")
            except NoConnectException:
                status = self.process.poll()
                if status == STARTED_ANEW:
                    self.process = self._launched()
                elif status is not None:
                    raise NotStarted(f"the office ended with status {status}") from None
                time.sleep(POLLED)
        self.process.kill()
        raise NotStarted(f"the office did not answer within {PATIENCE:g} s")


def _agreeing() -> Any:
    """Return what answers the office's questions: that it is so."""
    import uno
    import unohelper
    from com.sun.star.task import XInteractionHandler
    from com.sun.star.ucb import XCommandEnvironment, XProgressHandler

    approval = uno.getTypeByName("com.sun.star.task.XInteractionApprove")

    class Agreeing(unohelper.Base, XCommandEnvironment, XInteractionHandler, XProgressHandler):  # type: ignore[misc]
        def getInteractionHandler(self) -> Any:
            return self

        def getProgressHandler(self) -> Any:
            return self

        def handle(self, request: Any) -> None:
            for continuation in request.getContinuations():
                if continuation.queryInterface(approval) is not None:
                    continuation.select()
                    return

        def push(self, _: Any) -> None: ...

        def update(self, _: Any) -> None: ...

        def pop(self) -> None: ...

    return Agreeing()


def main(soffice: str, profile: str, action: str, extension: str) -> None:
    """Put an extension into a profile, or take it out."""
    with Remote(Path(soffice), Path(profile)) as office:
        manager = office.context.getValueByName("/singletons/com.sun.star.deployment.ExtensionManager")
        abort = manager.createAbortChannel()
        if action == "add":
            manager.addExtension(Path(extension).as_uri(), (), "user", abort, _agreeing())
        else:
            manager.removeExtension(extension, "beamfuncs.oxt", "user", abort, _agreeing())


if __name__ == "__main__":
    main(*sys.argv[1:])
