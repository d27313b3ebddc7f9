"""What stops the Excel door, in one line."""


class ExcelDoorError(Exception):
    """The add-in cannot be built, installed or removed; the message is one line for the user."""
