"""The one family of errors that mean: the input or the call is at fault, not this program."""

from __future__ import annotations


class SplitcheckError(Exception):
    """Something in the input that cannot be read or judged; the command ends with exit code 2.

    Parameters
    ----------
    place
        Where: a file, ``file:line``, or the name of an option.
    wrong
        What is wrong, with the offending text and, where there is a limit, both numbers.
    do
        What the user can do about it.

    Examples
    --------
    >>> print(SplitcheckError("top.gbr:118", "aperture D14 is not defined", "export it again"))
    top.gbr:118: aperture D14 is not defined; export it again
    """

    def __init__(self, place: str, wrong: str, do: str) -> None:
        super().__init__(place, wrong, do)
        self.place = place
        self.wrong = wrong
        self.do = do

    def __str__(self) -> str:
        return f"{self.place}: {self.wrong}; {self.do}"
