"""Ways of showing a report; each is one small file that knows only findings."""
