"""The colours that a drawing of the plotting library shares with page.css."""

INK = "#14222b"
SEA = "#1f6b7c"
RED = "#c0272d"
