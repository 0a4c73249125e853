"""The extension as a file: it follows from the catalogue alone, and from it always the same."""

from __future__ import annotations

import ast
import io
import json
import sys
import zipfile
from importlib.metadata import version
from pathlib import Path
from xml.etree import ElementTree

import pytest

from beamfuncs.catalogue import Argument, Entry, catalogue
from beamfuncs.hosts.calc import idl, naming, offices, packing, texts, typelibrary, xcu

OOR = "{http://openoffice.org/2001/registry}"
MANIFEST = "{http://openoffice.org/2001/manifest}"
MODULES = sorted(packing.COMPONENT.rglob("*.py"))


def configured() -> dict[str, ElementTree.Element]:
    """The nodes of the functions in the configuration, by the names of their methods."""
    root = ElementTree.fromstring(xcu.functions())
    (functions,) = (node for node in root.iter("node") if node.get(f"{OOR}name") == "AddInFunctions")
    return {node.get(f"{OOR}name", ""): node for node in functions}


def told(node: ElementTree.Element, name: str) -> str:
    """A property of a node of the configuration."""
    return next(one[0].text or "" for one in node if one.get(f"{OOR}name") == name)


def test_every_function_is_configured_and_declared() -> None:
    """Each function of the catalogue has its names, help and arguments in the configuration, and one method."""
    functions = configured()
    assert list(functions) == [naming.method(name) for name in catalogue()]
    source = idl.source()
    for entry in catalogue().values():
        node = functions[naming.method(entry.name)]
        shown = [told(node, one) for one in ("DisplayName", "CompatibilityName", "Description", "Category")]
        assert shown == [entry.name, entry.name, entry.summary, "Beam"]
        (parameters,) = (one for one in node if one.get(f"{OOR}name") == "Parameters")
        arguments = [(told(one, "DisplayName"), told(one, "Description")) for one in parameters]
        assert arguments == [(argument.name, argument.help) for argument in entry.arguments]
        assert source.count(f" {naming.method(entry.name)}(") == 1


def test_the_types_of_arguments_and_results() -> None:
    """One argument is any value, a repeated one any number of them; what can be an array is rows of cells."""
    source = idl.source()
    assert "any reaction([in] any beam, [in] any loads, [in] any support, [in] any stiffness, [in] any comb" in source
    assert "any beamLine([in] sequence<any> part);" in source
    assert "sequence< sequence<any> > momentAt(" in source
    assert "sequence< sequence<any> > reactions(" in source


def test_methods_and_long_names_are_told_apart() -> None:
    """No two functions share a method, whatever the case of letters, and their long names lead back to them."""
    long_names = [naming.long_name(name) for name in catalogue()]
    assert len(set(long_names)) == len(long_names)
    known = json.loads(texts.table())
    assert [f"{known['service']}.{method}".upper() for method in known["functions"]] == long_names


def test_a_new_function_needs_the_catalogue_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    """A function that is added to the catalogue is in the types, the configuration and the component's table."""
    new = Entry("new_one", len, "Return it.", (Argument("beam", "A <beam> & more.", False, False),), "array", "")
    entries = {**catalogue(), "new_one": new}
    for module in (idl, xcu, texts):
        monkeypatch.setattr(module, "catalogue", lambda: entries)
    assert "sequence< sequence<any> > newOne([in] any beam);" in idl.source()
    assert told(configured()["newOne"], "DisplayName") == "new_one"
    assert json.loads(texts.table())["functions"]["newOne"]["arguments"] == [["beam", "A <beam> & more."]]
    assert not typelibrary.is_current()
    with pytest.raises(typelibrary.NotBuilt, match="calc build --types"):
        packing.packed()


def test_the_type_library_is_of_this_catalogue() -> None:
    """The shipped type library was built from today's types: their source is beside it, and their names are in it."""
    assert typelibrary.is_current()
    library = typelibrary.LIBRARY.read_bytes()
    assert library.startswith(b"UNOIDL\xff\0")
    for entry in catalogue().values():
        for name in (naming.method(entry.name), *(naming.method(argument.name) for argument in entry.arguments)):
            assert library.count(_counted(name)) == 1, name


def _counted(name: str) -> bytes:
    """A name as a type library holds it: its length, and its letters."""
    return len(name).to_bytes(4, "little") + name.encode()


def test_the_type_library_is_built_the_same_anew() -> None:
    """Where the tool is, the types built anew are those that are shipped, to the last byte."""
    programs = [office.program for office in offices.offices()]
    try:
        built = typelibrary.build(idl.source(), programs)
    except typelibrary.NotBuilt as error:
        pytest.skip(f"not run: {error}")
    shipped = typelibrary.LIBRARY.read_bytes()
    if _mark(built) != _mark(shipped):
        pytest.skip(f"not run: the type library is by {_mark(shipped)}, the tool here is {_mark(built)}")
    assert built == shipped
    assert typelibrary.build(idl.source().replace("any support", "any prop", 1), programs) != built


def _mark(library: bytes) -> str:
    """What a type library says of the tool that built it."""
    return library[library.index(b"** Created by") :].split(b"**")[1].decode().strip()


def test_the_same_bytes() -> None:
    """Packed twice, the extension is the same to the last byte, and no file in it has the date of its making."""
    assert packing.packed() == packing.packed()
    with zipfile.ZipFile(io.BytesIO(packing.packed())) as archive:
        assert {member.date_time for member in archive.infolist()} == {(1980, 1, 1, 0, 0, 0)}


def test_what_is_registered_is_there() -> None:
    """The list of contents names files that are in the extension, the types before the code that uses them."""
    contents = packing.contents()
    root = ElementTree.fromstring(contents["META-INF/manifest.xml"])
    listed = [one.get(f"{MANIFEST}full-path", "") for one in root]
    assert set(listed) <= set(contents)
    assert listed.index("functions.rdb") < listed.index("uno_functions.py")
    jobs = ElementTree.fromstring(contents["Jobs.xcu"])
    events = [node.get(f"{OOR}name") for node in jobs.findall("node[2]/node")]
    assert events == ["OnLoadFinished", "OnSaveDone", "OnSaveAsDone"]
    services = [one.text for one in jobs.iter("value")]
    table = json.loads(contents[packing.TABLE])
    assert services == [table["loaded"], table["saved"]]


def test_the_description() -> None:
    """The extension is of the package's version, asks for a new enough office, and shows no licence to agree to."""
    text = packing.contents()["description.xml"].decode()
    root = ElementTree.fromstring(text)
    space = "{http://openoffice.org/extensions/description/2006}"
    assert [root.find(f"{space}{name}").get("value") for name in ("identifier", "version")] == [
        "beamfuncs.calc",
        version("beamfuncs"),
    ]
    assert 'LibreOffice-minimal-version d:name="LibreOffice 7.2" value="7.2"' in text
    assert "license" not in text


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.name)
def test_the_component_stands_alone(path: Path) -> None:
    """What runs in the office is Python 3.8, and imports the standard library, the office's own modules, and itself."""
    source = path.read_text(encoding="utf-8")
    tree = ast.parse(source, feature_version=(3, 8))
    allowed = {*sys.stdlib_module_names, "uno", "unohelper", "com", "beamfuncs_component"}
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            assert {alias.name.split(".")[0] for alias in node.names} <= allowed
        elif isinstance(node, ast.ImportFrom) and not node.level:
            assert (node.module or "").split(".")[0] in allowed
