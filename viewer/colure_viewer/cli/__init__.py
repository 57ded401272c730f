"""The command line; this file imports nothing, so that a command loads only what it uses."""
