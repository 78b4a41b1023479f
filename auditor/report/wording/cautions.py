"""What this statement is not, and what can hurt someone who acts on it."""

from __future__ import annotations

CEILING = (
    "Ceiling is a theoretical limit for the stated temperatures; no real machine reaches it; distance "
    "to it is not a savings estimate."
)

CAUTIONS: tuple[tuple[str, str], ...] = (
    (
        "Not a protection or control function.",
        "This statement is an aid to reporting. Never change interlocks, trips or combustion settings "
        "because of it alone; local codes and licensed people decide.",
    ),
    (
        "Air and combustion.",
        "Cutting excess air can raise carbon monoxide and unburnt fuel. Boiler explosions and carbon "
        "monoxide kill: only a competent person who measures carbon monoxide may adjust a burner or an "
        "engine.",
    ),
    (
        "Colder stacks.",
        "A lower stack temperature can bring water or acid below its dew point (common practice: about "
        "55 to 58 °C for natural gas, 100 to 140 °C with sulphur in the fuel), corrode metal and "
        "brick, weaken the draught and needs a drain for condensate.",
    ),
    (
        "Recovering heat.",
        "Pressure-equipment rules apply. Thermal oil burns; working fluids of organic Rankine engines "
        "may be flammable or greenhouse gases; warm water and cooling towers can breed Legionella; "
        "steam and hot pipes scald; engine exhaust contains carbon monoxide.",
    ),
    (
        "Water that goes missing.",
        "A mass imbalance in a boiler may be a leaking tube: have it looked at without delay. A "
        "statement that is made once a night can be late to notice.",
    ),
    (
        "Not a bill, not a declaration.",
        "The meters behind it may not be legally verified. It replaces no invoice and no "
        "custody-transfer reading, and it is no declaration under an emissions or support scheme; "
        "where the law asks for an accredited verifier, one is still needed.",
    ),
    (
        "Not a certified audit.",
        "It is not in itself an energy audit under EN 16247 or ISO 50002, nor proof of conformity with "
        "ISO 50001. A competent person has to review and sign it.",
    ),
    (
        "Guarantees.",
        "Claims against a supplier need the test code named in the contract. Monthly figures from "
        "loggers are indicative only.",
    ),
    (
        "Reference values.",
        "Heating values, shares, factors and prices are the user's responsibility. Each is printed with "
        "its source and, where declared, its date.",
    ),
    (
        "Confidential content.",
        "File names, headings and status words are copied from the logs and may name people; site "
        "figures may be commercially sensitive. Treat this file accordingly before passing it on.",
    ),
    (
        "Uncertainty.",
        "Every figure stands with its expanded uncertainty (k = 2, about 95 %). A difference smaller "
        "than the uncertainty of that difference is no difference; between two months on the same "
        "meters that uncertainty is smaller than the one printed here, because the common calibration "
        "cancels.",
    ),
    ("Ceilings.", CEILING),
    (
        "No warranty.",
        "The program comes without warranty. Try it on a month whose result you know before you rely on it.",
    ),
)
