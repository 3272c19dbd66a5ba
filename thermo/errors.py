"""What can go wrong, in terms that the reader can mend.

Below ``study`` an error knows no file: it names the quantity, the value, what
is allowed and the remedy. The case reader adds file and line.
"""


class MidradiusError(Exception):
    """Any error that midradius raises on purpose."""


class InputFault(MidradiusError):
    """A quantity that the caller gave and must change.

    Parameters
    ----------
    quantity
        What was given, in the caller's words (``"diameter"``).
    value
        The value as given (``"-30 mm"``).
    allowed
        What would have been accepted (``"0.5 mm to 5 m"``).
    remedy
        One sentence that says what to do.
    """

    def __init__(self, quantity: str, value: str, allowed: str, remedy: str = "") -> None:
        self.quantity = quantity
        self.value = value
        self.allowed = allowed
        self.remedy = remedy
        text = f"{quantity} = {value}, but must be {allowed}."
        super().__init__(f"{text} {remedy}".rstrip())


class SolverFault(MidradiusError):
    """The solver gave up: no answer is better than a wrong one."""
