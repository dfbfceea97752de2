"""The text of the Calc add-in, made from the table of worksheet functions.

An extension is a zip of five texts: what it is (`description.xml`), what is in it
(`META-INF/manifest.xml`), the functions' types (`.idl`), their names and help (`.xcu`), and one Python module
that hands every call on.
"""

from __future__ import annotations

import io
import re
import site
import sys
import zipfile
from collections.abc import Iterable
from pathlib import Path
from typing import Final
from xml.sax.saxutils import escape, quoteattr

from xleq import __version__
from xleq.functions import TABLE, Function
from xleq.hosts.wording import argument_help

#: Name of the extension, as the office lists it.
IDENTIFIER: Final = "org.xleq.calc"
_SERVICE: Final = "org.xleq.calc.Functions"
_OLDEST_OFFICE: Final = "25.2"
_EPOCH: Final = (1980, 1, 1, 0, 0, 0)

_MANIFEST: Final = """<?xml version="1.0" encoding="UTF-8"?>
<manifest:manifest xmlns:manifest="http://openoffice.org/2001/manifest">
 <manifest:file-entry manifest:media-type="application/vnd.sun.star.uno-typelibrary;type=RDB" manifest:full-path="functions.idl"/>
 <manifest:file-entry manifest:media-type="application/vnd.sun.star.uno-component;type=Python" manifest:full-path="xleq_in_calc.py"/>
 <manifest:file-entry manifest:media-type="application/vnd.sun.star.configuration-data" manifest:full-path="CalcAddIns.xcu"/>
</manifest:manifest>
"""  # noqa: E501

_DESCRIPTION: Final = """<?xml version="1.0" encoding="UTF-8"?>
<description xmlns="http://openoffice.org/extensions/description/2006" xmlns:l="http://libreoffice.org/extensions/description/2011">
 <identifier value="{identifier}"/>
 <version value="{version}"/>
 <display-name><name lang="en">xleq: chemical equilibrium</name></display-name>
 <dependencies><l:LibreOffice-minimal-version value="{oldest}" name="LibreOffice {oldest}"/></dependencies>
</description>
"""

_MODULE: Final = '''"""Hands calls from Calc to xleq."""

import site
import sys

if sys.version_info[:2] != {version!r}:
    raise ImportError("xleq was installed for Python {dotted}; run `xleq calc install` again")
before = list(sys.path)
for folder in {folders!r}:
    site.addsitedir(folder)
# The environment's own packages come first: older ones elsewhere would not fit each other.
sys.path[:] = [p for p in sys.path if p not in before] + before

import unohelper
from com.sun.star.lang import XServiceInfo

from xleq.hosts.libreoffice.calls import call

try:
    from org.xleq.calc import XFunctions
except ImportError:  # while the extension is being registered, its types are not there yet
    class XFunctions:
        pass

SERVICE = {service!r}


class Functions(unohelper.Base, XFunctions, XServiceInfo):
    def __init__(self, context):
        self.context = context

    def getImplementationName(self):
        return SERVICE

    def supportsService(self, name):
        return name == SERVICE

    def getSupportedServiceNames(self):
        return (SERVICE,)


def method(name):
    return lambda self, *arguments: call(name, arguments)


for attribute, name in {methods!r}.items():
    setattr(Functions, attribute, method(name))

g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Functions, SERVICE, (SERVICE,))
'''


def method_name(function: Function) -> str:
    """The function's name in the interface, which has no underscores.

    Examples
    --------
    >>> method_name(TABLE["XLEQ_K_FROM_DG"])
    'xleqKFromDg'
    """
    first, *rest = function.name.lower().split("_")
    return first + "".join(part.capitalize() for part in rest)


def _idl(functions: Iterable[Function]) -> str:
    lines = []
    for f in functions:
        arguments = ", ".join(f"[in] any argument{i}" for i, _ in enumerate(f.arguments, 1))
        lines.append(f"    sequence< sequence< any > > {method_name(f)}({arguments});")
    body = "\n".join(lines)
    interface = f"  interface XFunctions {{\n{body}\n  }};"
    return f"module org {{ module xleq {{ module calc {{\n{interface}\n}}; }}; }};\n"


def _text(name: str, value: str) -> str:
    return f'<prop oor:name={quoteattr(name)}><value xml:lang="en">{escape(value)}</value></prop>'


def _node(f: Function) -> str:
    parameters = "".join(
        f'<node oor:name="argument{i}" oor:op="replace">{_text("DisplayName", a.name)}'
        f"{_text('Description', argument_help(a))}</node>"
        for i, a in enumerate(f.arguments, 1)
    )
    return (
        f'<node oor:name="{method_name(f)}" oor:op="replace">{_text("DisplayName", f.name)}'
        f"{_text('Description', f.gives)}"
        f'<prop oor:name="Category"><value>Add-In</value></prop>{_text("CompatibilityName", f.name)}'
        f'<node oor:name="Parameters">{parameters}</node></node>\n'
    )


def _configuration(functions: Iterable[Function]) -> str:
    nodes = "".join(map(_node, functions))
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n'
        '<oor:component-data xmlns:oor="http://openoffice.org/2001/registry" '
        'xmlns:xs="http://www.w3.org/2001/XMLSchema" oor:name="CalcAddIns" '
        'oor:package="org.openoffice.Office">\n'
        f'<node oor:name="AddInInfo"><node oor:name="{_SERVICE}" oor:op="replace">'
        f'<node oor:name="AddInFunctions">\n{nodes}</node></node></node>\n</oor:component-data>\n'
    )


def extension_members(folders: Iterable[str] | None = None) -> dict[str, str]:
    """The extension's members and their text.

    Parameters
    ----------
    folders : iterable of str, optional
        Folders of packages in which the office's Python finds xleq; those of this Python by default.
    """
    functions = list(TABLE.values())
    methods = {method_name(f): f.name for f in functions}
    version = sys.version_info[:2]
    module = _MODULE.format(
        version=tuple(version),
        dotted=".".join(map(str, version)),
        folders=list(folders if folders is not None else package_folders()),
        service=_SERVICE,
        methods=methods,
    )
    number = re.match(r"[\d.]+", __version__)
    return {
        "META-INF/manifest.xml": _MANIFEST,
        "description.xml": _DESCRIPTION.format(
            identifier=IDENTIFIER, version=number[0] if number else "0", oldest=_OLDEST_OFFICE
        ),
        "functions.idl": _idl(functions),
        "CalcAddIns.xcu": _configuration(functions),
        "xleq_in_calc.py": module,
    }


def package_folders() -> list[str]:
    """Folders of packages of this Python, and the one that holds xleq if it is in none of them."""
    folders = [p for p in dict.fromkeys(site.getsitepackages()) if Path(p).is_dir()]
    home = Path(__file__).resolve().parents[3]
    if not any(home == Path(p).resolve() for p in folders):
        folders.append(str(home))
    return folders


def build_extension(folders: Iterable[str] | None = None) -> bytes:
    """The extension as one file, the same bytes for the same table."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, text in extension_members(folders).items():
            archive.writestr(zipfile.ZipInfo(name, _EPOCH), text.encode("utf-8"), zipfile.ZIP_DEFLATED)
    return packed.getvalue()
