"""What is withdrawn among some sealed files, and why; it stays in a package as it stays in an archive, and is told."""

from __future__ import annotations

from collections.abc import Sequence

from archive.exchange.sealed_document import SealedDocument
from schemas.acts import WithdrawalDocument

__all__ = ["reasons_of_withdrawal"]


def reasons_of_withdrawal(sealed: Sequence[SealedDocument]) -> dict[str, str]:
    """Return why each address is withdrawn; a withdrawal that was itself withdrawn counts for nothing."""
    acts = [each.document for each in sealed if isinstance(each.document, WithdrawalDocument)]
    taken_back = {act.target for act in acts}
    return {act.target: act.why for act in acts if act.address not in taken_back}
