"""The bench's state: what is declared, how it is edited, undone and saved. Knows no widget."""
