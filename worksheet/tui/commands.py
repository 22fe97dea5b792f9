"""Every command once: its key, a second key that multiplexers leave alone, its title, its help, and when it is there.

Bindings, the line at the foot, the list of commands, the help page, the user's key file and the documentation are all
made from this table; a screen only has a method `action_NAME` for each of its commands.

First keys are single letters and signs, which every multiplexer passes on; second keys are function and control keys.
Control+A, control+B (prefixes of terminal multiplexers), control+S and control+Q (flow control) are given to none.

Length: one entry a command, read as a table; a second file would only hide half of it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

BOOK, SHEET, ALGEBRA, MAP, MEETING, TAKEOVER = "book", "sheet", "algebra", "map", "meeting", "takeover"
COMPARE, CURVES = "compare", "curves"
VARIANTS, SWEEP, FRONT, CHAIN, FAILING = "variants", "sweep", "front", "chain", "failing"
EVERYWHERE = (BOOK, SHEET, ALGEBRA, MAP, MEETING, TAKEOVER, COMPARE, CURVES, VARIANTS, SWEEP, FRONT, CHAIN, FAILING)

PLACES = {
    BOOK: "Project",
    SHEET: "Sheet",
    ALGEBRA: "Algebra",
    MAP: "Window map",
    MEETING: "Review meeting",
    TAKEOVER: "Taking over",
    COMPARE: "Comparison",
    VARIANTS: "Variants",
    SWEEP: "Sweep",
    FRONT: "Front",
    CHAIN: "Signal paths",
    FAILING: "What breaks it",
    CURVES: "Device from curves",
}
"""Names of the screens that commands belong to."""


@dataclass(frozen=True, slots=True)
class Command:
    """One command.

    Attributes:
        name: In the key file, and of the method that does it.
        key: First key.
        second: Another way in.
        title: In the list of commands and at the foot.
        help: What it does, one sentence.
        places: Screens that have it.
        when: Condition that must hold, a name of the screen's `holds` ("row", "field", "undo", ...); "" for none.
        writes: Whether it changes files, so that a book opened for reading does not have it.
        foot: Rank at the foot of the screen, 0 for none.
    """

    name: str
    key: str
    second: str
    title: str
    help: str
    places: tuple[str, ...]
    when: str = ""
    writes: bool = False
    foot: int = 0


COMMANDS = (
    Command(
        "help", "question_mark", "f1", "Help", "Explain what has the focus, and list the keys.", EVERYWHERE, foot=9
    ),
    Command(
        "commands", "space", "f2", "Commands", "List every command and run one; type to search.", EVERYWHERE, foot=8
    ),
    Command("open", "enter", "o", "Open", "Open the sheet of this block.", (BOOK,), "row", foot=1),
    Command(
        "find",
        "f",
        "ctrl+f",
        "Find",
        "Show only blocks whose name, title, stage, state or verdict holds what you type.",
        (BOOK,),
        foot=2,
    ),
    Command("new", "n", "insert", "New", "Start a sheet for another block.", (BOOK,), writes=True, foot=3),
    Command(
        "duplicate",
        "d",
        "ctrl+d",
        "Duplicate",
        "Copy this sheet under another name.",
        (BOOK,),
        "row",
        writes=True,
        foot=4,
    ),
    Command(
        "rename",
        "r",
        "ctrl+r",
        "Rename",
        "Give this sheet another name; formulas of other sheets follow.",
        (BOOK, SHEET),
        "sheet",
        writes=True,
        foot=5,
    ),
    Command(
        "delete",
        "x",
        "delete",
        "Delete",
        "Take this sheet out of the project; undo brings it back.",
        (BOOK,),
        "row",
        writes=True,
        foot=6,
    ),
    Command(
        "problems",
        "exclamation_mark",
        "f9",
        "Problems",
        "List everything that is wrong with the project's files.",
        (BOOK, SHEET),
        "problems",
    ),
    Command(
        "edit",
        "enter",
        "e",
        "Edit",
        "Change the value under the cursor where it stands.",
        (SHEET,),
        "field",
        writes=True,
        foot=1,
    ),
    Command(
        "step_up",
        "plus",
        "greater_than_sign",
        "More",
        "Raise the value under the cursor by one step.",
        (SHEET,),
        "step",
        writes=True,
        foot=2,
    ),
    Command(
        "step_down",
        "minus",
        "less_than_sign",
        "Less",
        "Lower the value under the cursor by one step.",
        (SHEET,),
        "step",
        writes=True,
        foot=2,
    ),
    Command(
        "step_size",
        "s",
        "f5",
        "Step size",
        "Choose what one step is: the grid, a finger, or a share of the value.",
        (SHEET,),
        foot=3,
    ),
    Command(
        "take",
        "p",
        "f7",
        "Take proposal",
        "Write the recommended point into the choices, on the grid.",
        (SHEET,),
        "proposal",
        writes=True,
        foot=4,
    ),
    Command(
        "add",
        "a",
        "insert",
        "Add",
        "Add an assumption, an own name, a target, evidence, a waiver or a remark.",
        (SHEET,),
        writes=True,
        foot=5,
    ),
    Command(
        "remove",
        "x",
        "delete",
        "Remove",
        "Take out what the cursor is on; undo brings it back.",
        (SHEET,),
        "removable",
        writes=True,
    ),
    Command(
        "algebra", "w", "f6", "Why", "Show the algebra behind the number under the cursor.", (SHEET,), "number", foot=6
    ),
    Command(
        "map",
        "m",
        "f4",
        "Map",
        "Show where all targets hold, over bias current and load capacitance.",
        (SHEET,),
        foot=7,
    ),
    Command(
        "settle_merge",
        "k",
        "f10",
        "Settle merge",
        "Settle what a merge left: a value that two people changed, or a file with both sides in it.",
        (SHEET,),
        "merge",
        writes=True,
        foot=1,
    ),
    Command("next_section", "tab", "right_square_bracket", "Next part", "Go to the next part of the sheet.", (SHEET,)),
    Command(
        "previous_section",
        "shift+tab",
        "left_square_bracket",
        "Part before",
        "Go to the part of the sheet before this one.",
        (SHEET,),
    ),
    Command("next_sheet", "n", "ctrl+n", "Next sheet", "Open the sheet after this one.", (SHEET,)),
    Command("previous_sheet", "b", "ctrl+p", "Sheet before", "Open the sheet before this one.", (SHEET,)),
    Command(
        "drawing",
        "v",
        "ctrl+v",
        "Drawing",
        "Show or hide the drawing and the operating point beside the sheet.",
        (SHEET,),
    ),
    Command(
        "follow", "enter", "o", "Follow", "Show the algebra of the input under the cursor.", (ALGEBRA,), "row", foot=1
    ),
    Command("unknown", "u", "f5", "Solve for", "Solve the target for another unknown.", (ALGEBRA,), "target", foot=2),
    Command(
        "take_place",
        "enter",
        "p",
        "Take this place",
        "Write the bias current and load capacitance under the cross into the choices.",
        (MAP,),
        "place",
        writes=True,
        foot=1,
    ),
    Command(
        "closer",
        "plus",
        "greater_than_sign",
        "Closer",
        "Show less around the cross or the present value, in more detail.",
        (MAP, SWEEP),
        foot=2,
    ),
    Command(
        "wider",
        "minus",
        "less_than_sign",
        "Wider",
        "Show more around the cross or the present value.",
        (MAP, SWEEP),
        foot=3,
    ),
    Command(
        "whole", "w", "home", "Whole", "Show everything near the sheet's present point again.", (MAP, SWEEP), foot=4
    ),
    Command(
        "variants",
        "d",
        "ctrl+d",
        "Variants",
        "Lay the sheet's variants side by side; take one over, or keep the present choice as one.",
        (SHEET,),
    ),
    Command("sweep", "g", "ctrl+g", "Sweep", "Draw a metric over one quantity, with the target as a line.", (SHEET,)),
    Command(
        "front",
        "f",
        "ctrl+f",
        "Front",
        "Show what meets every target with the least current and area, and the present choice.",
        (SHEET,),
    ),
    Command(
        "failing",
        "i",
        "f12",
        "What breaks it",
        "Show what would have to be true for this block to fail, weakest trust first.",
        (SHEET,),
    ),
    Command(
        "chains",
        "p",
        "f4",
        "Signal paths",
        "Show the chains of sheets, what each path achieves and what every sheet takes of it.",
        (BOOK,),
    ),
    Command(
        "take_variant",
        "enter",
        "p",
        "Take over",
        "Make the sheet what this variant says; undo brings back what it was.",
        (VARIANTS,),
        "variant",
        writes=True,
        foot=1,
    ),
    Command(
        "keep_variant",
        "k",
        "f5",
        "Keep present",
        "Keep what the sheet chooses now as a variant.",
        (VARIANTS,),
        writes=True,
        foot=2,
    ),
    Command(
        "drop_variant",
        "x",
        "delete",
        "Take out",
        "Take this variant out; undo brings it back.",
        (VARIANTS,),
        "variant",
        writes=True,
        foot=3,
    ),
    Command("quantity", "enter", "e", "Quantity", "Choose what is swept.", (SWEEP,), foot=1),
    Command(
        "scale",
        "g",
        "ctrl+g",
        "Ratios or steps",
        "Let the values keep their ratio or their distance.",
        (SWEEP,),
        foot=5,
    ),
    Command(
        "take_point",
        "enter",
        "p",
        "Take this point",
        "Write the point under the cursor into the choices, on the layout grid.",
        (FRONT,),
        "point",
        writes=True,
        foot=1,
    ),
    Command(
        "meeting",
        "g",
        "ctrl+g",
        "Meeting",
        "Walk through everything that wants a decision, and decide.",
        (BOOK,),
        foot=7,
    ),
    Command(
        "look",
        "enter",
        "o",
        "Open",
        "Open the sheet at what the cursor is on; back returns here.",
        (MEETING, TAKEOVER, COMPARE, CHAIN, FAILING),
        "row",
        foot=1,
    ),
    Command(
        "accept",
        "a",
        "f4",
        "Accept",
        "Accept the block for the inputs that it has now.",
        (MEETING,),
        "row",
        writes=True,
        foot=2,
    ),
    Command(
        "waive",
        "w",
        "f5",
        "Waive",
        "Accept this miss: for a value and until a day.",
        (MEETING,),
        "waivable",
        writes=True,
        foot=3,
    ),
    Command(
        "send_back",
        "b",
        "f6",
        "Send back",
        "Make the block a draft again, with a remark that says what is wanted and of whom.",
        (MEETING,),
        "row",
        writes=True,
        foot=4,
    ),
    Command(
        "settle",
        "d",
        "f7",
        "Settle",
        "Settle this remark with an answer.",
        (MEETING, TAKEOVER),
        "remark",
        writes=True,
        foot=5,
    ),
    Command(
        "kinds", "k", "ctrl+f", "Only", "Show one kind of thing only: missed, stale, waived, ...", (MEETING,), foot=6
    ),
    Command(
        "minutes",
        "m",
        "f9",
        "Minutes",
        "End the meeting: write its minutes and record a revision.",
        (MEETING,),
        writes=True,
        foot=7,
    ),
    Command(
        "take_over",
        "h",
        "f10",
        "Take over",
        "Be led through what is asked, new, stale and weak in this block before it is yours.",
        (BOOK,),
        "row",
    ),
    Command(
        "rescue",
        "w",
        "ctrl+w",
        "Write elsewhere",
        "The project's folder is gone: write its files as they were last seen into another folder.",
        (BOOK,),
        "away",
        foot=1,
    ),
    Command(
        "project",
        "b",
        "ctrl+e",
        "Project",
        "Change the project's title, conditions and budgets.",
        (BOOK,),
        writes=True,
    ),
    Command("compare", "e", "f6", "Compare", "Lay a revision beside the files as they stand.", (BOOK,)),
    Command("before", "b", "left", "From", "Choose the revision or branch that is compared from.", (COMPARE,), foot=4),
    Command(
        "after",
        "n",
        "right",
        "To",
        "Choose what it is compared to: another revision, a branch, the files as they stand.",
        (COMPARE,),
        foot=5,
    ),
    Command(
        "form",
        "i",
        "f4",
        "One list",
        "Show the values in one list, the weightiest first, or side by side in their parts.",
        (COMPARE,),
        "laid",
        foot=6,
    ),
    Command(
        "parts", "tab", "f7", "Parts", "Close all parts, so that their heads stand, or open all.", (COMPARE,), "parts"
    ),
    Command(
        "record", "s", "f7", "Record", "Save a revision of the project's own files, with a note.", (BOOK,), writes=True
    ),
    Command(
        "curves",
        "j",
        "f5",
        "From curves",
        "Fit a device of the process file to measured or simulated curves, and look at the fit.",
        (BOOK,),
    ),
    Command(
        "next_view",
        "tab",
        "v",
        "Next view",
        "Summary, currents, residuals, efficiency: the next one.",
        (CURVES,),
        foot=1,
    ),
    Command(
        "next_curves",
        "n",
        "right",
        "Next curves",
        "Show the curves of the next length, source voltage or temperature.",
        (CURVES,),
        "fit",
        foot=2,
    ),
    Command(
        "columns",
        "k",
        "f4",
        "Columns",
        "State which column is what, with unit and sign, and fit again.",
        (CURVES,),
        foot=3,
    ),
    Command(
        "write",
        "w",
        "f7",
        "Into the file",
        "Write the fitted device into the process file, after saying what changes.",
        (CURVES,),
        "fit",
        writes=True,
        foot=4,
    ),
    Command(
        "restore",
        "r",
        "f5",
        "Take back",
        "Make a value, a sheet or the project what it was in that revision, as an edit that can be undone.",
        (COMPARE,),
        "laid",
        writes=True,
        foot=2,
    ),
    Command(
        "trace",
        "h",
        "ctrl+o",
        "Over revisions",
        "Show this value or metric over all revisions: who, when, why, and what it was.",
        (COMPARE, SHEET),
        "traced",
        foot=3,
    ),
    Command(
        "moved",
        "j",
        "ctrl+e",
        "What moved",
        "Show what moved since the block was accepted, and since each stale piece of evidence was found.",
        (SHEET, MEETING),
        "moved",
    ),
    Command(
        "checked",
        "v",
        "f5",
        "Checked",
        "Say that you looked this value up again, and how far it is to be trusted now.",
        (TAKEOVER,),
        "value",
        writes=True,
        foot=2,
    ),
    Command(
        "ask",
        "a",
        "f4",
        "Ask",
        "Ask somebody about what the cursor is on; the question stays with the sheet until it is settled.",
        (TAKEOVER,),
        "row",
        writes=True,
        foot=3,
    ),
    Command(
        "keep",
        "m",
        "f9",
        "Make it yours",
        "Become the one who answers for the block.",
        (TAKEOVER,),
        writes=True,
        foot=5,
    ),
    Command(
        "undo",
        "z",
        "ctrl+u",
        "Undo",
        "Take back the last change, in whichever sheet it was.",
        (BOOK, SHEET, MAP, MEETING, TAKEOVER, COMPARE, CURVES, VARIANTS, FRONT),
        "undo",
        writes=True,
    ),
    Command(
        "redo",
        "y",
        "ctrl+y",
        "Redo",
        "Make the change again that was taken back last.",
        (BOOK, SHEET, MAP, MEETING, TAKEOVER, COMPARE, CURVES, VARIANTS, FRONT),
        "redo",
        writes=True,
    ),
    Command(
        "copy",
        "c",
        "f8",
        "Copy",
        "Copy the number, the row or the table out, through the terminal or into a file.",
        EVERYWHERE,
    ),
    Command("theme", "t", "ctrl+t", "Theme", "Choose the colours; the choice is remembered.", EVERYWHERE),
    Command("reload", "l", "ctrl+l", "Read again", "Read the files again and draw the screen anew.", EVERYWHERE),
    Command("suspend", "ctrl+z", "S", "Suspend", "Go back to the shell; fg returns here.", EVERYWHERE),
    Command(
        "back",
        "escape",
        "backspace",
        "Back",
        "Go back to where you came from.",
        tuple(place for place in EVERYWHERE if place != BOOK),
        foot=10,
    ),
    Command("leave", "q", "ctrl+x", "Leave", "Leave the program. Everything is on disk already.", EVERYWHERE, foot=10),
)
"""All of them, in the order of the help page."""


def of_place(place: str) -> Iterator[Command]:
    """Commands of a screen."""
    return (command for command in COMMANDS if place in command.places)


def find(name: str) -> Command | None:
    """The command of that name, or None."""
    return next((command for command in COMMANDS if command.name == name), None)


_SHOWN = {
    "question_mark": "?",
    "exclamation_mark": "!",
    "plus": "+",
    "minus": "-",
    "greater_than_sign": ">",
    "less_than_sign": "<",
    "right_square_bracket": "]",
    "left_square_bracket": "[",
    "escape": "esc",
    "delete": "del",
    "insert": "ins",
}


def shown_key(key: str) -> str:
    """A key as people write it: "?", "ctrl+f", "F1"."""
    if key in _SHOWN:
        return _SHOWN[key]
    return key.upper() if key[:1] == "f" and key[1:].isdigit() else key
