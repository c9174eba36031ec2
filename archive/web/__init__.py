"""The archive as pages in a browser: read-only, on this machine, without a network."""

from archive.web.app import application
from archive.web.serving import serve

__all__ = ["application", "serve"]
