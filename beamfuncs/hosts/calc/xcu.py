"""What the office's configuration must know: the functions with their texts, and the jobs on loading and saving."""

from __future__ import annotations

from collections.abc import Iterable
from xml.sax.saxutils import escape, quoteattr

from beamfuncs.catalogue import Entry, catalogue
from beamfuncs.hosts.calc.naming import LOADED, SAVED, SERVICE, method

EVENTS = {"OnLoadFinished": LOADED, "OnSaveDone": SAVED, "OnSaveAsDone": SAVED}
"""After which event of a document which job is run."""

_HEAD = (
    '<?xml version="1.0" encoding="UTF-8"?>\n<oor:component-data xmlns:oor="http://openoffice.org/2001/registry"'
    ' xmlns:xs="http://www.w3.org/2001/XMLSchema" oor:package="org.openoffice.Office" oor:name="{}">\n'
)


def functions() -> str:
    """Return the configuration of the add-in: names, category, help of the functions and of their arguments."""
    entries = (_function(entry) for entry in catalogue().values())
    service = _node(SERVICE, [_node("AddInFunctions", entries)], replaced=True)
    return _document("CalcAddIns", [_node("AddInInfo", [service])])


def jobs() -> str:
    """Return the configuration of the jobs."""
    listed = (_node(job, [_property("Service", job)], replaced=True) for job in sorted(set(EVENTS.values())))
    events = (
        _node(event, [_node("JobList", [_node(job, [], replaced=True)])], fused=True) for event, job in EVENTS.items()
    )
    return _document("Jobs", [_node("Jobs", listed), _node("Events", events)])


def _function(entry: Entry) -> str:
    arguments = (
        _node(
            method(a.name),
            [_property("DisplayName", a.name, translated=True), _property("Description", a.help, translated=True)],
            replaced=True,
        )
        for a in entry.arguments
    )
    return _node(
        method(entry.name),
        [
            _property("DisplayName", entry.name, translated=True),
            _property("Description", entry.summary, translated=True),
            _property("Category", entry.category),
            _property("CompatibilityName", entry.name, translated=True),
            _node("Parameters", arguments),
        ],
        replaced=True,
    )


def _document(name: str, nodes: Iterable[str]) -> str:
    return _HEAD.format(name) + "".join(nodes) + "</oor:component-data>\n"


def _node(name: str, inside: Iterable[str], *, replaced: bool = False, fused: bool = False) -> str:
    how = ' oor:op="replace"' * replaced + ' oor:op="fuse"' * fused
    return f"<node oor:name={quoteattr(name)}{how}>\n{''.join(inside)}</node>\n"


def _property(name: str, value: str, *, translated: bool = False) -> str:
    language = ' xml:lang="en-US"' * translated
    return f'<prop oor:name="{name}"><value{language}>{escape(value)}</value></prop>\n'
