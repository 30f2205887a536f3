"""Screens: results as the text that the terminal, a saved text record and the bench's record panel show."""
