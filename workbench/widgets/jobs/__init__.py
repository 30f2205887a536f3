"""Jobs: work off the home thread, with its progress, its Cancel, and the last good result kept."""
