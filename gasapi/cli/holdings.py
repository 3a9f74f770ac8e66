"""What all workers are to hold alike: the context with the site's own gases, and the tokens. Read by the master process.

Workers are forked from the master and find both ready in memory. A worker that comes later holds what the others hold, even
where a file was changed meanwhile; a change counts from the moment when the service is told of it (SIGHUP), and one that
cannot be right is told in the log and left aside.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from gasapi.errors import GasapiError
from gasapi.settings import Settings

if TYPE_CHECKING:
    from gasapi.service.context import Context
    from gasapi.web.tokens import TokenList

__all__ = ["Holdings"]


class Holdings:
    """The context and the tokens.

    :raises TokenFileError: a line of the token file cannot be used
    :raises DataError: the site file, or a data file, does not hold what it must
    """

    def __init__(self, settings: Settings) -> None:
        self._settings = settings
        self.context: Context
        self.tokens: TokenList | None
        self._read()

    def _read(self) -> None:
        from gasapi.app import create_context
        from gasapi.web.tokens import TokenList

        file = self._settings.token_file
        try:
            tokens = None if file is None else TokenList.from_file(file)
        except OSError as error:
            raise _Unreadable(f"{file}: {error.strerror}") from None
        self.context = create_context(self._settings)
        self.tokens = tokens

    def read_again(self) -> str | None:
        """Take the files as they are now; return what is wrong where they cannot be taken and all stays as it was."""
        try:
            self._read()
        except GasapiError as error:
            return str(error)
        return None


class _Unreadable(GasapiError):
    """A file cannot be read."""
