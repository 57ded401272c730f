"""Data files shipped with Colure, each with its provenance and the script that built it."""
