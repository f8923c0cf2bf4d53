"""G-code post-analyser and backlash-compensation preprocessor."""

from __future__ import annotations

from gcodetool.errors import GcodetoolError, ProofError, Refusal, SheetError

__version__ = "0.1.0"
__all__ = ["GcodetoolError", "ProofError", "Refusal", "SheetError", "__version__"]
