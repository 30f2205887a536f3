"""The analysis file: read, told what is wrong with it, and written back."""
