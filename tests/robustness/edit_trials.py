"""10,000 random edits with undo, redo, closing and opening in between, against a model.

    PYTHONPATH=. python tests/robustness/edit_trials.py [EXAMPLES] [STEPS]

The state machine of `tests/campaign/test_campaign_history.py`, only longer: after each step the
campaign in memory and the one read anew from the file are what the model says. Prints by how much
the memory of the process grew after the first tenth, which must stay below 50 MB.
"""

from __future__ import annotations

import gc
import importlib.util
import sys
from pathlib import Path

from hypothesis import HealthCheck, Phase, settings
from hypothesis.stateful import run_state_machine_as_test

MOST_GROWTH_MB = 50


def resident_mb() -> float:
    gc.collect()
    pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[1])
    return pages * 4096 / 1e6


def main(examples: int, steps: int) -> int:
    path = Path(__file__).parent.parent / "campaign" / "test_campaign_history.py"
    spec = importlib.util.spec_from_file_location("history", path)
    assert spec is not None
    assert spec.loader is not None
    history = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(history)
    count = {"steps": 0, "examples": 0}
    memory: list[float] = []

    class Counted(history.Editing):  # type: ignore[misc, name-defined]
        def teardown(self) -> None:
            super().teardown()
            count["examples"] += 1
            if count["examples"] in (examples // 10 or 1, examples):
                memory.append(resident_mb())

        def check_invariants(self, *arguments: object) -> None:
            super().check_invariants(*arguments)
            count["steps"] += 1

    run_state_machine_as_test(
        Counted,
        settings=settings(
            max_examples=examples,
            stateful_step_count=steps,
            deadline=None,
            database=None,
            phases=(Phase.generate,),
            suppress_health_check=list(HealthCheck),
        ),
    )
    memory.append(resident_mb())
    grown = memory[-1] - memory[0]
    print(f"{count['steps']} steps in {count['examples']} campaigns agree with the model;")
    print(f"memory {memory[0]:.0f} MB after the first tenth, grown by {grown:.1f} MB")
    return int(grown > MOST_GROWTH_MB)


if __name__ == "__main__":
    wanted = [int(word) for word in sys.argv[1:]]
    sys.exit(main(wanted[0] if wanted else 200, wanted[1] if len(wanted) > 1 else 60))
