"""`recommend TRIAL ADVICE --reason TEXT --by NAME [--look N] [--on DATE]`"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from app.actions.recommend import ADVICE, read_advice, recommend
from app.cli.at_desk import at_desk
from app.cli.parsing import Command, day_of, look_number
from app.settings import Settings


def arguments(parser: ArgumentParser) -> None:
    parser.add_argument("trial", metavar="TRIAL", type=Path, help="the trial file")
    parser.add_argument("advice", metavar="ADVICE", help=f"one of: {', '.join(ADVICE)}")
    parser.add_argument(
        "--reason", metavar="TEXT", required=True, help="the recommendation in words, as the minutes have it"
    )
    parser.add_argument(
        "--look", metavar="N", type=look_number, help="the frozen look it rests on; default: the last one"
    )
    parser.add_argument(
        "--on", metavar="DATE", type=day_of("--on"), help="the day the committee met; default: today"
    )
    parser.add_argument(
        "--by", metavar="NAME", required=True, help="who records it; not an electronic signature"
    )


def run(options: Namespace, settings: Settings) -> int:
    advice = read_advice(options.advice, where="ADVICE")
    with at_desk(settings, options.trial) as desk:
        look, words = recommend(
            desk,
            advice=advice,
            reason=options.reason,
            by=options.by,
            look=options.look,
            held_on=options.on,
        )
    print(f"Recorded after look {look}: {advice}.")
    for sentence in words:
        print(sentence)
    return 0


COMMAND = Command(
    arguments,
    run,
    example="recommend Q17.trial continue --reason 'no concern' --on 2027-01-20 --by 'Jane Roe'",
)
