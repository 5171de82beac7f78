"""Sheet 1, Data: can we trust this extract?"""

from __future__ import annotations

from collections.abc import Sequence

from app.model.extract import Acknowledgement, Changes, Extract, Finding, Snapshot, with_severity
from app.sheets.blocks import Cell, Column, CountsFigure, Line, Row, Sheet, Span, Table
from app.sheets.methods import methods
from app.sheets.words import NO_BREAK, count, counted, day_text, line, moment, of_total
from app.views.closed import ClosedView
from app.views.open import OpenView

QUESTION = "Can we trust this extract?"
MOST_IDENTIFIERS = 20


def data_sheet(view: ClosedView, snapshot: Snapshot, extract: Extract) -> Sheet:
    look = view.look
    return Sheet(
        key="data",
        number=1,
        name="Data",
        question=QUESTION,
        answer=(data_sentence(view),),
        figure=changes_figure(view),
        tables=(_received_table(snapshot), _files_table(extract), _endpoints_table(extract)),
        wide_tables=(
            *_findings_table(look.findings, snapshot.acknowledgements),
            *_identifiers_table(look.changes),
        ),
        notes=(line(_compared(look.changes), _not_read(extract)),),
        methods=methods("changes"),
        figure_table=_changes_table(look.changes),
    )


def data_sentence(view: ClosedView) -> Line:
    """ "The extract holds 900 subjects and 384 events and can be used; 2 doubts stand." """
    information, doubts = view.look.information, with_severity(view.look.findings, "doubt")
    start = line("The extract holds ", counted(information.subjects, "subject"), " and ")
    held = line(start, counted(information.events, "event"), " and can be used")
    return line(held, "; ", doubts_words(len(doubts)), ".") if doubts else line(held, "; no doubt was found.")


def doubts_words(number: int) -> Line:
    """ "2 doubts stand", answered with a reason but not gone."""
    said = f"{number}{NO_BREAK}doubt{'s' if number != 1 else ''}"
    return (Span(said, "doubt", value=float(number)), Span(" stands" if number == 1 else " stand"))


def changed_events_sentence(view: ClosedView) -> Line:
    """ "Since look 2, 5 earlier events were changed." """
    changes = view.look.changes
    if changes is None:
        return line("It is the first extract.")
    changed = len(changes.reversed_events) + len(changes.moved_events)
    verb = "was" if changed == 1 else "were"
    before = f"Since look{NO_BREAK}{view.look.number - 1}, "
    if changed == 0:
        return line(before, "no earlier event was changed.")
    return line(before, f"{changed}{NO_BREAK}earlier event{'s' if changed != 1 else ''} {verb} changed.")


def changes_figure(view: ClosedView) -> CountsFigure:
    """What changed since the last snapshot; for a first one, what it holds."""
    changes, information = view.look.changes, view.look.information
    if changes is None:
        return CountsFigure(
            title="What the first extract holds",
            description="Subjects and events in the extract.",
            counts=((count(information.subjects), "subjects"), (count(information.events), "events")),
        )
    return CountsFigure(
        title="Changes since the last snapshot",
        description=f"Counted over {changes.n_common} subjects who are in both snapshots.",
        counts=tuple((count(len(subjects)), words) for words, subjects in _kinds_of_change(changes)),
    )


def _kinds_of_change(changes: Changes) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """What the committee asks about first, in the order it asks."""
    return (
        ("new events", changes.new_events),
        ("reversed", changes.reversed_events),
        ("moved", changes.moved_events),
        ("vanished subjects", changes.vanished_subjects),
        ("changed arm", changes.changed_arm),
    )


def _further_changes(changes: Changes) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """What it takes besides to get from the events before to the events now."""
    return (
        ("changed stratum", changes.changed_stratum),
        ("new subjects", changes.new_subjects),
        ("new subjects with an event", changes.new_subjects_with_event),
        ("vanished subjects with an event", changes.vanished_with_event),
    )


def _changes_table(changes: Changes | None) -> Table | None:
    if changes is None:
        return None
    kinds = (*_kinds_of_change(changes), *_further_changes(changes))
    rows = tuple(Row(line(_capital(words)), (Cell((count(len(subjects)),)),)) for words, subjects in kinds)
    caption = line("Changes since the last snapshot; ", counted(changes.n_common, "subject"), " in both")
    return Table(caption, (Column(()),), rows)


def _capital(words: str) -> str:
    return words[:1].upper() + words[1:]


def _identifiers_table(changes: Changes | None) -> tuple[Table, ...]:
    """Whom to ask the data centre about: identifiers as received, of all changes but new ones."""
    if changes is None:
        return ()
    kinds = (*_kinds_of_change(changes), ("changed stratum", changes.changed_stratum))
    named = [(words, ids) for words, ids in kinds if ids and not words.startswith("new")]
    if not named:
        return ()
    rows = tuple(
        Row(line(_capital(words)), (Cell((count(len(ids)),)), Cell(line(_some(ids))))) for words, ids in named
    )
    columns = (Column(line("subjects")), Column(line("identifiers as received"), "words"))
    return (Table(line("Whom to ask the data centre about"), columns, rows, line("Change")),)


def _some(identifiers: Sequence[str]) -> str:
    shown = ", ".join(identifiers[:MOST_IDENTIFIERS])
    more = len(identifiers) - MOST_IDENTIFIERS
    return f"{shown} and {more} more" if more > 0 else shown


def _received_table(snapshot: Snapshot) -> Table:
    extracted = "not stated" if snapshot.extracted is None else day_text(snapshot.extracted)
    rows = [
        ("Snapshot", str(snapshot.number)),
        ("Declared as", snapshot.kind),
        ("Data cutoff", day_text(snapshot.cutoff)),
        ("Extract", extracted),
        ("Received", moment(snapshot.received_at)),
        ("Received by", snapshot.by),
    ]
    return Table(
        line("As received"), (Column((), "words"),), tuple(Row(line(a), (Cell(line(b)),)) for a, b in rows)
    )


def _files_table(extract: Extract) -> Table:
    rows = tuple(
        Row(line(file.name), (Cell((count(file.n_rows),)), Cell((count(len(file.columns_read)),))))
        for file in extract.files
    )
    return Table(line("Files"), (Column(line("rows")), Column(line("columns read"))), rows, line("Name"))


def _endpoints_table(extract: Extract) -> Table:
    rows = tuple(
        Row(line(parameter), (Cell(of_total(events, rows)),))
        for parameter, rows, events in extract.parameters
    )
    return Table(line("Endpoints in the extract"), (Column(line("events of rows")),), rows, line("Parameter"))


def _findings_table(findings: Sequence[Finding], answered: Sequence[Acknowledgement]) -> tuple[Table, ...]:
    if not findings:
        return ()
    reasons = {each.finding_id: each.reason for each in answered}
    rows = tuple(_finding_row(finding, reasons.get(finding.id)) for finding in findings)
    columns = (
        Column(line("what was found"), "words"),
        Column(line("rows")),
        Column(line("answered with"), "words"),
    )
    return (Table(line("Findings"), columns, rows, line("Kind")),)


def _finding_row(finding: Finding, reason: str | None) -> Row:
    doubt = finding.severity == "doubt"
    head = Span("Doubt", "doubt") if doubt else Span("Note")
    rows = Cell((count(finding.count),) if finding.count else ())
    return Row((head,), (Cell(line(str(finding))), rows, Cell(line(reason or ""))))


def _compared(changes: Changes | None) -> Line:
    """The denominator of what changed."""
    if changes is None:
        return ()
    both = counted(changes.n_common, "subject")
    return line("Changes: of the ", both, " in both snapshots. ")


def _not_read(extract: Extract) -> Line:
    left_out = sorted({column for file in extract.files for column in file.columns_left_out})
    if not left_out:
        return line("Every column of the extract was read.")
    return line(f"Not read, because not needed: {', '.join(left_out)}.")


# --- the open side --------------------------------------------------------------------------------------


def open_data_sheet(view: OpenView) -> Sheet:
    look = view.look
    figure = CountsFigure(
        title="What the extract holds",
        description="Subjects and events, both arms together.",
        counts=((count(look.subjects), "subjects"), (count(look.events), "events")),
    )
    table = Table(
        line("What the extract holds"),
        (Column(()),),
        (
            Row(line("Subjects"), (Cell((count(look.subjects),)),)),
            Row(line("Events"), (Cell((count(look.events),)),)),
        ),
    )
    return Sheet(
        key="data",
        number=1,
        name="Data",
        question=QUESTION,
        answer=(open_data_sentence(view),),
        figure=figure,
        tables=(table,),
        notes=(line("Findings and changes are reported to the closed side."),),
        figure_table=table,
    )


def open_data_sentence(view: OpenView) -> Line:
    look = view.look
    return line(
        "The extract was accepted: ",
        counted(look.subjects, "subject"),
        " and ",
        counted(look.events, "event"),
        ".",
    )
