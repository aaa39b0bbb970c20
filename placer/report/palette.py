"""The colours of reports: one name for each meaning, a light and a dark value.

Our own set, chosen so that no two meanings that stand side by side become alike under
the three kinds of colour-blindness (`tests/report/test_palette.py` measures it), and
never the only carrier of a meaning: every state has a letter or a pattern too.
"""

from __future__ import annotations

PALETTE: dict[str, tuple[str, str]] = {
    # Paper and ink.
    "paper": ("#faf8f3", "#11191f"),
    "sheet": ("#ffffff", "#18232b"),
    "ink": ("#1c2a33", "#e6ebe7"),
    "faint": ("#5b6870", "#9fb0b6"),
    "rule": ("#d8d5cb", "#2f3f49"),
    "accent": ("#0d5a66", "#6cc6cf"),
    "good": ("#17684a", "#6fcf9f"),
    "bad": ("#a3341f", "#f2937c"),
    # What a site holds.
    "data": ("#2f5d8a", "#7fb2e5"),
    "value": ("#d9822b", "#f0a452"),
    "lent": ("#1f9e89", "#4fd1b5"),
    "clean": ("#b9c4c9", "#4a5b66"),
    "high": ("#7a3e9d", "#c493e6"),
    "moving": ("#15202b", "#f4f1e8"),
    # Causes of error, from the largest usual one on.
    "decay": ("#2f5d8a", "#7fb2e5"),
    "swaps": ("#d9822b", "#f0a452"),
    "two_qubit": ("#6a7b52", "#b5c78f"),
    "one_qubit": ("#c9b458", "#efe09a"),
    "measurement": ("#1f9e89", "#4fd1b5"),
    "level2": ("#7a3e9d", "#c493e6"),
    "preparation": ("#8a8f94", "#8a979e"),
    # Steps from little to much.
    "step1": ("#dcebea", "#20343c"),
    "step2": ("#a9cfd0", "#2b525c"),
    "step3": ("#5fa3a8", "#3f8690"),
    "step4": ("#1d6570", "#7fd0d6"),
}


def variables(mode: int) -> str:
    """Return the colours as CSS variables; mode 0 is light, 1 is dark."""
    return "".join(f"--{name}:{pair[mode]};" for name, pair in PALETTE.items())
