"""`amend TRIAL PLAN --reason TEXT --by NAME [--decided-by NAME]`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.amend import Amendment, amend
from app.cli.at_desk import at_desk
from app.cli.files import read_file
from app.cli.parsing import Command
from app.cli.said import tell
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument("plan", metavar="PLAN", type=Path, help="the whole plan as it is to be from now on")
    parser.add_argument("--reason", metavar="TEXT", required=True, help="why; it is recorded for ever")
    parser.add_argument(
        "--decided-by", metavar="NAME", help="who decided it, when that is not who records it"
    )
    parser.add_argument(
        "--by", metavar="NAME", required=True, help="who records it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    plan = read_file(options.plan)
    with at_desk(settings, options.trial) as desk:
        amendment = amend(
            desk,
            plan_name=options.plan.name,
            plan=plan,
            reason=options.reason,
            by=options.by,
            decided_by=options.decided_by,
        )
    tell(amendment.doubts)
    print(as_text(amendment))
    return 0


def as_text(amendment: Amendment) -> str:
    """What changed key by key, from where on, and what was known when it was decided."""
    changes = [f"  {each.key}: {each.before} -> {each.after}" for each in amendment.changes]
    looks = ", ".join(map(str, amendment.results_opened))
    stays = f" Look {amendment.stays} is open and stays under the version before." if amendment.stays else ""
    return "\n".join(
        (
            f"Plan version {amendment.version} governs the looks received from now on.{stays}",
            *changes,
            f"Comparative results opened before: {f'looks {looks}' if looks else 'none'}; "
            f"arms {'unmasked' if amendment.unmasked else 'masked'}. Looks held stay as they were.",
        )
    )


COMMAND = Command(
    arguments,
    run,
    example="amend Q17.trial plan-2.toml --reason 'slow accrual' --decided-by 'the sponsor' --by 'Jane Roe'",
)
