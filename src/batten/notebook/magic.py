"""The magics read, call `examine` and show. A user's mistake becomes one line; a fault of ours stays a traceback."""

from __future__ import annotations

from typing import Any

from IPython.core.error import UsageError
from IPython.core.magic import Magics, cell_magic, line_magic, magics_class, no_var_expand

from batten.errors import BattenError
from batten.errors import magic as errors
from batten.exam import Examination, examine
from batten.frame.spelling import on_one_line
from batten.notebook.display import in_kernel, show
from batten.notebook.line import LINE_HELP, SUBCOMMANDS, run_line
from batten.notebook.options import read_line, usage
from batten.notebook.progress import Progress
from batten.notebook.variables import find_frame

__all__ = ["BattenMagics"]


@magics_class
class BattenMagics(Magics):
    """%%batten and %batten of one shell. last: its last examination."""

    shell: Any
    last: Examination | None = None

    @no_var_expand
    @cell_magic("batten")  # type: ignore[arg-type]
    def batten_cell(self, line: str, cell: str) -> None:
        try:
            self._examine(line, cell)
        except BattenError as error:
            raise UsageError(error.one_line()) from None

    @no_var_expand
    @line_magic("batten")  # type: ignore[arg-type]
    def batten_line(self, line: str) -> None:
        try:
            run_line(line, self.last, shell=self.shell)
        except BattenError as error:
            raise UsageError(error.one_line()) from None

    # what %%batten? and %batten? show
    batten_cell.__doc__ = usage()  # type: ignore[assignment]
    batten_line.__doc__ = LINE_HELP  # type: ignore[assignment]

    def _examine(self, line: str, cell: str) -> None:
        names = self.shell.user_ns
        asked = read_line(line)
        keep, plain = asked.given.pop("keep", None), asked.given.pop("plain", False)
        frame = find_frame(asked.frame, names, subcommands=tuple(SUBCOMMANDS))
        if not on_one_line(cell):
            raise errors.no_formula()
        with Progress(kernel=in_kernel(self.shell)) as progress:
            exam = examine(cell, frame, **asked.given, progress=progress, env=names, frame_name=asked.frame)
            # remembered as soon as it is whole, so that nothing that goes wrong in showing it loses it
            self.last = exam
            if keep:
                names[keep] = exam
            show(exam, shell=self.shell, progress=progress, plain=plain, changed=self._follow)

    def _follow(self, before: Examination, after: Examination) -> None:
        """What a widget makes of the last examination (another span or aim, further remedies) is the last one now."""
        if self.last is before:
            self.last = after
