"""Arguments in, text and exit code out; the only room that prints or exits."""


def main() -> None:
    """Run the command line."""
