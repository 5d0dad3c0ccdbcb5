"""Why a file as a whole could not be read."""

from labdata.errors import KerogateError


class UnreadableFile(KerogateError):
    """The file is empty, damaged, encrypted, too large or of another kind."""

    code = "unreadable_file"
