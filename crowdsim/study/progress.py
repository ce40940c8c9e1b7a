"""What a run tells of itself while it goes on. This one keeps silent; the console has another."""

from __future__ import annotations

from crowdsim.study.jobs import Row


class Progress:
    """Called by a run; every method may do nothing."""

    def compiling(self) -> None:
        """The kernels are being compiled, which takes a while."""

    def ready(self) -> None:
        """The kernels are there."""

    def case(self, name: str, realisations: int, person_steps: float) -> None:
        """A case begins; person_steps: expected in one realisation."""

    def row(self, row: Row) -> None:
        """A realisation is finished."""

    def case_done(self) -> None:
        """All realisations of the case are finished or the run was stopped."""
