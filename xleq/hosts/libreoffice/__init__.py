"""Worksheet functions live in LibreOffice Calc; the add-in is built from their table at run time."""

from xleq.hosts.libreoffice.extension import IDENTIFIER, build_extension, extension_members
from xleq.hosts.libreoffice.installing import OfficeState, install, remove, state

__all__ = ["IDENTIFIER", "OfficeState", "build_extension", "extension_members", "install", "remove", "state"]
