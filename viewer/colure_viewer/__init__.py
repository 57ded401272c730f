"""The Qt window, the painter and the command line over the `colure` core."""
