"""Every key of sheets/NAME.toml, once. What one stage takes of it is decided by the stage's own table.

Length: one entry a key, read as a table; a second file would only hide half of it.
"""

from __future__ import annotations

from worksheet.model import dimension as dim
from worksheet.model.keys import Key, Kind, Table
from worksheet.model.project_keys import CONDITION, SUPPLY, TEMPERATURE
from worksheet.model.shared_keys import AT, SETTLING_TOLERANCE, TARGET_KEYS

DESIGN = (
    Key(
        "bias_current",
        "Bias current",
        "Current that the current source sets in the stage, at the nominal temperature.",
        dimension=dim.CURRENT,
        symbol="I",
        low_open=True,
        annotated=True,
        formula=True,
        example="4 uA",
    ),
    Key(
        "width",
        "Width",
        "Total channel width, all fingers together.",
        dimension=dim.LENGTH,
        symbol="W",
        low_open=True,
        annotated=True,
        formula=True,
        example="20 um",
    ),
    Key(
        "length",
        "Length",
        "Channel length.",
        dimension=dim.LENGTH,
        symbol="L",
        low_open=True,
        annotated=True,
        formula=True,
        example="0.5 um",
    ),
    Key(
        "load_capacitance",
        "Load capacitance",
        "Capacitance that the block's output drives, wiring included.",
        dimension=dim.CAPACITANCE,
        symbol="C_L",
        annotated=True,
        formula=True,
        example="1.2 pF",
    ),
)
"""Design variables of every stage. Further devices of a stage carry their name before width, length and fingers."""

GEOMETRY = ("width", "length")
"""The design variables that each device has of its own."""

FINGERS = Key(
    "fingers",
    "Fingers",
    "Parallel units of the device; width is their total.",
    Kind.WHOLE,
    low=1.0,
    default=1.0,
    example="4",
    moves_results=False,
)

ASSUMPTIONS = (
    Key(
        "input_level",
        "Input level",
        "Voltage from ground at which the input stands.",
        dimension=dim.VOLTAGE,
        symbol="V_in",
        annotated=True,
        formula=True,
        example="0.9 V",
    ),
    Key(
        "output_level",
        "Output level",
        "Voltage from ground at which the output stands.",
        dimension=dim.VOLTAGE,
        symbol="V_out",
        annotated=True,
        formula=True,
        example="0.6 V",
    ),
    Key(
        "step_size",
        "Step size",
        "Step at the input for which settling is reckoned, rising and falling. Left out: small steps.",
        dimension=dim.VOLTAGE,
        symbol="dV_in",
        low_open=True,
        annotated=True,
        formula=True,
        example="200 mV",
    ),
    SETTLING_TOLERANCE,
    Key(
        "noise_from",
        "Noise from",
        "Lowest frequency from which flicker noise is counted.",
        dimension=dim.FREQUENCY,
        symbol="f_n",
        low_open=True,
        default=1.0,
        annotated=True,
        formula=True,
        example="1 Hz",
    ),
    Key(
        "drive_resistance",
        "Drive resistance",
        "Resistance in series with the input, with its own thermal noise.",
        dimension=dim.RESISTANCE,
        symbol="R_s",
        default=0.0,
        annotated=True,
        formula=True,
        example="10 kohm",
    ),
    Key(
        "well_capacitance",
        "Well capacitance",
        "Capacitance of a device's own well, from its source to ground; only with the bulk on the source.",
        dimension=dim.CAPACITANCE,
        symbol="C_w",
        default=0.0,
        annotated=True,
        formula=True,
        example="50 fF",
    ),
    Key(
        "bias_overhead",
        "Bias overhead",
        "Extra supply current for the bias branch, as a fraction of the bias current.",
        dimension=dim.NUMBER,
        symbol="k_b",
        default=0.0,
        annotated=True,
        formula=True,
        example="0.1",
    ),
    Key(
        "bias_temperature_exponent",
        "Bias temperature exponent",
        "e in I(T) = I (T/T_nominal)^e: 0 constant, 1 proportional to absolute temperature.",
        dimension=dim.NUMBER,
        symbol="e",
        default=0.0,
        annotated=True,
        formula=True,
        example="1",
    ),
    Key(
        "saturation_margin",
        "Saturation margin",
        "Drain-source voltage wanted beyond the saturation voltage, in every range and headroom.",
        dimension=dim.VOLTAGE,
        symbol="V_m",
        default=0.0,
        annotated=True,
        formula=True,
        example="50 mV",
    ),
)
"""What may be assumed besides the design variables."""

OWN_CONDITIONS = (
    Key(
        "supply",
        "Supply of this sheet",
        "Replaces the project's supplies for this sheet, which is then on its own regulator.",
        dimension=SUPPLY.dimension,
        symbol=SUPPLY.symbol,
        low_open=True,
        annotated=True,
        listed=True,
        example="1.2 V",
    ),
    Key(
        "temperature",
        "Temperature of this sheet",
        "Replaces the project's temperatures for this sheet.",
        dimension=TEMPERATURE.dimension,
        symbol=TEMPERATURE.symbol,
        low_open=True,
        annotated=True,
        listed=True,
        example="37 °C",
    ),
)
"""Conditions that a sheet may state for itself, in [assume]."""

OWN = Key(
    "own",
    "Own name",
    "A value of your own for formulas; its unit is kept as written.",
    low=None,
    annotated=True,
    formula=True,
    example="40 kHz",
)
"""What an entry of [own] is."""

PROPOSE = "propose"
"""Written instead of a value in [choose] to leave it to the solver."""

BIAS_KEYS = (
    Key(
        "device",
        "Bias device",
        '"ideal", or a device: of the other polarity on a drain output, of the same on a source output.',
        Kind.NAME,
        default="ideal",
        example="ideal",
    ),
    Key(
        "output_conductance",
        "Output conductance",
        "Conductance of an ideal current source.",
        dimension=dim.CONDUCTANCE,
        symbol="g_L",
        default=0.0,
        annotated=True,
        formula=True,
        example="0 S",
    ),
    Key(
        "capacitance",
        "Capacitance",
        "Capacitance of an ideal current source.",
        dimension=dim.CAPACITANCE,
        symbol="C_b",
        default=0.0,
        annotated=True,
        formula=True,
        example="0 F",
    ),
)

SOLVE_KEYS = (
    Key(
        "keep",
        "Keep",
        "What stays while the bias current is back-computed: the geometry, or the inversion coefficient.",
        Kind.CHOICE,
        choices=("geometry", "inversion"),
        default="geometry",
        example="geometry",
    ),
    Key(
        "inversion_coefficient",
        "Inversion coefficient",
        "The inversion coefficient to keep; left out: that of the present point.",
        dimension=dim.NUMBER,
        symbol="IC",
        low_open=True,
        example="1.0",
    ),
    Key(
        "over",
        "Over",
        "The conditions in which a bound or proposal must hold.",
        Kind.CHOICE,
        choices=("all", "nominal"),
        default="all",
        example="all",
    ),
    Key(
        "current_allowance",
        "Current allowance",
        "How far the compact point's current may lie above the recommended one, as a fraction.",
        dimension=dim.NUMBER,
        default=0.05,
        example="0.05",
    ),
)

EVIDENCE = Table(
    "evidence",
    "What a simulation or a bench found.",
    keys=(
        Key("metric", "Metric", "The metric or target that was found.", Kind.NAME, required=True, moves_results=False),
        Key("value", "Value", "What was found.", low=None, required=True, moves_results=False),
        Key("low", "Low", "Least of what was found.", low=None, moves_results=False),
        Key("high", "High", "Greatest of what was found.", low=None, moves_results=False),
        Key("spread", "Spread", "One standard deviation of what was found.", moves_results=False),
        Key("samples", "Samples", "How many were simulated or measured.", Kind.WHOLE, low=1.0, moves_results=False),
        Key(
            "found_by",
            "Found by",
            "simulation, extraction or measurement.",
            Kind.CHOICE,
            choices=("simulation", "extraction", "measurement"),
            required=True,
            moves_results=False,
        ),
        Key("dated", "Dated", "The day it was found.", Kind.DATE, moves_results=False),
        Key(
            "basis",
            "Basis",
            "The sheet's digest then; a different one now makes the evidence stale.",
            Kind.TEXT,
            moves_results=False,
        ),
        Key(
            "at",
            "At",
            "The condition at which it was found; left out: the nominal one.",
            Kind.CONDITION,
            moves_results=False,
        ),
        Key("by", "By", "Who found it.", Kind.TEXT, moves_results=False),
        Key("reference", "Reference", "Run, netlist or bench log.", Kind.TEXT, moves_results=False),
        Key("note", "Note", "Anything a reader of this evidence should know.", Kind.TEXT, moves_results=False),
    ),
    repeated=True,
)

WAIVER = Table(
    "waiver",
    "A miss that was accepted, by whom and why.",
    keys=(
        Key("target", "Target", "The target whose miss is accepted.", Kind.NAME, required=True, moves_results=False),
        Key("by", "By", "Who accepted it.", Kind.TEXT, required=True, moves_results=False),
        Key("reason", "Reason", "Why it was accepted.", Kind.TEXT, required=True, moves_results=False),
        Key(
            "value",
            "Value",
            "The value that was accepted: anything worse is missed again.",
            low=None,
            moves_results=False,
        ),
        Key("dated", "Dated", "The day it was accepted.", Kind.DATE, moves_results=False),
        Key("until", "Until", "The last day on which the waiver holds.", Kind.DATE, moves_results=False),
    ),
    repeated=True,
)

REMARK = Table(
    "remark",
    "What somebody has to say or to ask about the sheet or one of its values, open until it is settled.",
    keys=(
        Key("by", "By", "Who says it.", Kind.TEXT, required=True, moves_results=False, example="M. Sandoe"),
        Key(
            "text",
            "Text",
            "What is said or asked.",
            Kind.TEXT,
            required=True,
            moves_results=False,
            example="Is the load still that of the old floor plan?",
        ),
        Key(
            "about",
            "About",
            "The dotted key it is about, such as assume.load_capacitance; left out: the whole sheet.",
            Kind.TEXT,
            moves_results=False,
            example="target.bandwidth",
        ),
        Key("to", "To", "Who is asked to answer.", Kind.TEXT, moves_results=False),
        Key("dated", "Dated", "The day it was said.", Kind.DATE, moves_results=False),
        Key("settled", "Settled", "The day it was settled; left out while it is open.", Kind.DATE, moves_results=False),
        Key("settled_by", "Settled by", "Who settled it.", Kind.TEXT, moves_results=False),
        Key("answer", "Answer", "What came of it.", Kind.TEXT, moves_results=False),
    ),
    repeated=True,
)

ACCEPTANCE = Table(
    "acceptance",
    "Who accepted the block, and for which inputs: when these move, an accepted sheet falls back to for-review.",
    keys=(
        Key("by", "By", "Who accepted the block.", Kind.TEXT, required=True, moves_results=False),
        Key(
            "basis",
            "Basis",
            "The sheet's digest then: another one now means that the accepted inputs have moved.",
            Kind.TEXT,
            required=True,
            moves_results=False,
        ),
        Key("dated", "Dated", "The day the block was accepted.", Kind.DATE, moves_results=False),
        Key("note", "Note", "On what grounds, or with what reservations.", Kind.TEXT, moves_results=False),
    ),
    repeated=True,
)

COLLISION = Table(
    "collision",
    "Where two people gave one key different values, to be settled; the file holds what the first one gave.",
    keys=(
        Key("key", "Key", "The dotted key that both changed.", Kind.TEXT, required=True, moves_results=False),
        Key(
            "base",
            "Before",
            "What both started from, as TOML; left out where there was nothing.",
            Kind.TEXT,
            moves_results=False,
        ),
        Key(
            "ours",
            "Ours",
            "What the file held that the merge went into, as TOML; left out where it was taken out.",
            Kind.TEXT,
            moves_results=False,
        ),
        Key(
            "theirs",
            "Theirs",
            "What the other side holds, as TOML; left out where it was taken out there.",
            Kind.TEXT,
            moves_results=False,
        ),
    ),
    repeated=True,
)

VARIANT = Table(
    "variant",
    "Named sets of changed values, to be laid beside the sheet; they move nothing of the sheet itself.",
    entry=Table(
        "",
        "One variant: what it changes of [assume], [choose] and [own], by plain name.",
        keys=(Key("note", "Note", "What the variant is for, or what came of it.", Kind.TEXT, moves_results=False),),
        entry=Key(
            "change",
            "Change",
            "The value that the key of this name in [assume], [choose] or [own] has in the variant; no formula.",
            annotated=True,
            moves_results=False,
            example="8 uA",
        ),
        names="a key of [assume], [choose] or [own]",
    ),
    names="a name of your own",
)

SHEET = Table(
    "",
    "One circuit block.",
    keys=(
        Key(
            "schema",
            "Schema",
            "Version of the file format.",
            Kind.WHOLE,
            low=1.0,
            high=1.0,
            required=True,
            example="1",
            moves_results=False,
        ),
        Key("title", "Title", "What the block is, for people.", Kind.TEXT, moves_results=False),
        Key(
            "stage",
            "Stage",
            "The circuit: one of the stages that the program knows.",
            Kind.NAME,
            required=True,
            example="source-follower",
        ),
        Key(
            "device",
            "Device",
            "The transistor type of the stage, from the process file.",
            Kind.NAME,
            required=True,
            example="nfet",
        ),
        Key(
            "bulk",
            "Bulk",
            "Where the stage's bulks are tied: the rail, or each to its own source (needs own_well).",
            Kind.CHOICE,
            choices=("rail", "source"),
            default="rail",
        ),
        Key(
            "count",
            "Count",
            "How many of this block the chip has; for budgets.",
            Kind.WHOLE,
            low=1.0,
            default=1.0,
            example="1",
            moves_results=False,
        ),
        Key("owner", "Owner", "Who answers for the block.", Kind.TEXT, moves_results=False),
        Key(
            "state",
            "State",
            "How far the block is.",
            Kind.CHOICE,
            choices=("draft", "for-review", "accepted"),
            default="draft",
            moves_results=False,
        ),
        Key("notes", "Notes", "Anything else, as text.", Kind.TEXT, moves_results=False),
    ),
    tables=(
        Table("bias", "The current source.", keys=BIAS_KEYS),
        Table("assume", "What is imposed on the block, and where it came from.", keys=ASSUMPTIONS + OWN_CONDITIONS),
        Table("own", "Names of your own, for formulas.", entry=OWN, names="a name of your own"),
        Table("choose", "The designer's decisions.", keys=DESIGN),
        Table("solve", "How bounds and proposals are found.", keys=SOLVE_KEYS),
        Table(
            "target",
            "What is wanted, by metric.",
            entry=Table("", "A target.", keys=TARGET_KEYS),
            names="a metric, or a name of your own with a formula",
        ),
        VARIANT,
        EVIDENCE,
        WAIVER,
        REMARK,
        ACCEPTANCE,
        COLLISION,
    ),
)
"""The whole sheet. In [assume] and [choose] the stage adds its design variables (stages.stage.Stage.design_keys)."""

__all__ = [
    "ACCEPTANCE",
    "ASSUMPTIONS",
    "AT",
    "BIAS_KEYS",
    "COLLISION",
    "CONDITION",
    "DESIGN",
    "EVIDENCE",
    "FINGERS",
    "GEOMETRY",
    "OWN",
    "OWN_CONDITIONS",
    "PROPOSE",
    "REMARK",
    "SHEET",
    "SOLVE_KEYS",
    "TARGET_KEYS",
    "VARIANT",
    "WAIVER",
]
