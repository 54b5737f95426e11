"""The colours that drawings share with page.css."""

PAPER = "#fbfaf6"
INK = "#14222b"
QUIET = "#7b8287"
SEA = "#1f6b7c"
AMBER = "#a65d00"
RED = "#c0272d"
