"""The window's panels, one module each."""
