"""Quote what a user typed inside a one-line message, whatever it contains."""


def one_line(text: str, most: int = 60) -> str:
    """Return the text without outer blanks, unprintable characters shown as `�`, cut at `most` characters."""
    clean = "".join(c if c.isprintable() else "\ufffd" for c in text.strip())
    return clean if len(clean) <= most else clean[: most - 1] + "…"
