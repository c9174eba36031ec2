"""How things of an archive are named in provenance: qualified names that every notation of PROV can hold.

A cooldown has a namespace of its own, made from the digest of its first accession; so two laboratories that both have a
cooldown 2026-03 do not speak of the same one. Records, plans and programs are named with a digest of their content.

References
----------
.. [1] P. Leach et al., A Universally Unique IDentifier (UUID) URN Namespace, RFC 4122, 2005, section 4.3 (version 5).
"""

from __future__ import annotations

import re
import uuid
from typing import Final

__all__ = [
    "CONTENT_PREFIX",
    "TERMS_PREFIX",
    "cooldown_namespace",
    "escaped",
    "fixed_namespaces",
    "program_identifier",
]

TERMS_PREFIX: Final = "stillroom"
CONTENT_PREFIX: Final = "content"

# Drawn once at random; it stands for Stillroom where others would give a web address.
_ROOT = uuid.UUID("3f0c2b52-6f3c-4c1b-9a0e-2f5c6d1f7a48")
# Letters that local parts may have in XML as well, besides the underscore, with which the others are spelled.
_PLAIN = re.compile(r"[A-Za-z0-9.-]")


def fixed_namespaces() -> dict[str, str]:
    """Return the namespaces that every document has, by prefix."""
    return {
        TERMS_PREFIX: f"urn:uuid:{uuid.uuid5(_ROOT, 'terms')}#",
        CONTENT_PREFIX: f"urn:uuid:{uuid.uuid5(_ROOT, 'content')}#",
    }


def cooldown_namespace(first_accession: str) -> str:
    """Return the namespace of a cooldown.

    Parameters
    ----------
    first_accession : str
        SHA-256 of the sealed file of its first accession.
    """
    return f"urn:uuid:{uuid.uuid5(_ROOT, first_accession)}#"


def program_identifier(version: str) -> str:
    """Return the address that stands for a version of this program, which has none on the web."""
    return f"urn:uuid:{uuid.uuid5(_ROOT, f'program {version}')}"


def escaped(text: str) -> str:
    """Return a text as part of a local name, different texts differently.

    Examples
    --------
    >>> escaped("log/Übersicht 1.csv")
    'log_2f__dc_bersicht_20_1.csv'
    """
    return "".join(sign if _PLAIN.fullmatch(sign) else f"_{ord(sign):x}_" for sign in text)
