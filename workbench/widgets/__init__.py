"""Widgets: the bench's state, actions, bindings, panels and arrangement."""
