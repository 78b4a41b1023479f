"""The page as text: complete, inert, self-contained, and the same every time."""

from __future__ import annotations

import base64
import hashlib
import itertools
import json
import os
import re
import subprocess
import sys
import zlib
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest
from jinja2 import UndefinedError
from plotly.offline import get_plotlyjs
from report_factory import make_result
from report_plant import HOSTILE, assumed

from auditor.records.errors import Exit
from auditor.records.machines import LiquidFuel, Role, Shaft, Stream
from auditor.records.plant import Fuel, HeatingValue
from auditor.records.result import AuditResult, WorkedInterval
from auditor.records.verdicts import Closure, Status, Verdict
from auditor.report.page import render_report
from auditor.report.sections.worked import worked_interval
from auditor.report.sections.worked_streams import stream_line
from auditor.report.templates import environment
from auditor.resources import folder

RESULT = make_result()
PAGE = render_report(RESULT)
WORDS = re.sub(r'<script type="application[^>]*>.*?</script>', "", PAGE, flags=re.DOTALL)
"""The page without its data blocks."""
VOID = {"meta", "br", "path", "link", "img", "input", "hr"}


class Outline(HTMLParser):
    """Collects what a page consists of."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.open: list[str] = []
        self.unbalanced: list[str] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note an element that opens."""
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note an element without content."""
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        """Check that the element that opened last is the one that closes."""
        if not self.open or self.open.pop() != tag:
            self.unbalanced.append(tag)

    def handle_data(self, data: str) -> None:
        """Keep text as a person reads it."""
        self.text.append(data)


@pytest.fixture(scope="module")
def outline() -> Outline:
    """The parsed page."""
    parser = Outline()
    parser.feed(WORDS)
    return parser


def test_markup_is_well_formed(outline: Outline) -> None:
    """Every element that opens closes, in order."""
    assert outline.unbalanced == [] and outline.open == []


def test_names_from_files_stay_text(outline: Outline) -> None:
    """A tag, a status word or a title that looks like a script is shown, never run."""
    assert HOSTILE not in PAGE
    assert HOSTILE in "".join(outline.text)
    assert "<b>remarks</b>" not in PAGE and "<b>remarks</b>" in "".join(outline.text)
    scripts = [attrs for tag, attrs in outline.tags if tag == "script"]
    assert len(scripts) == 1  # the boot script; data blocks were taken out before parsing


def test_data_block_cannot_end_its_element() -> None:
    """Chart data holds no angle bracket at all, and is valid JSON."""
    block = re.search(r'id="charts">(.*?)</script>', PAGE, flags=re.DOTALL)
    assert block is not None
    assert "<" not in block.group(1)
    assert set(json.loads(block.group(1))) == {"config", "layout", "figures"}


def test_nothing_is_fetched(outline: Outline) -> None:
    """No element points anywhere but into the page itself."""
    for _, attrs in outline.tags:
        assert "src" not in attrs
        assert (attrs.get("href") or "#").startswith("#")
    assert not re.search(r"@import|url\(", WORDS)


def test_content_policy_allows_exactly_the_scripts_of_this_page() -> None:
    """The policy names the plotting script as unpacked and the boot script as it stands."""
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', PAGE)
    boot = re.search(r"<script>(.*?)</script>", PAGE, flags=re.DOTALL)
    packed = re.search(r'id="plotting"[^>]*>([^<]*)</script>', PAGE)
    assert policy is not None and boot is not None and packed is not None
    plotting = zlib.decompress(base64.b64decode(packed.group(1)))
    assert plotting.decode() == get_plotlyjs()
    for script in (plotting, boot.group(1).encode()):
        digest = base64.b64encode(hashlib.sha256(script).digest()).decode()
        assert f"sha256-{digest}" in policy.group(1).replace("&#39;", "'").replace("&#43;", "+")
    assert "default-src &#39;none&#39;" in policy.group(1)
    assert "unsafe-eval" not in policy.group(1) and "'unsafe-inline'; script" not in policy.group(1)


def test_the_page_is_small_enough_to_mail() -> None:
    """A month of three machines with all pictures stays below three megabytes (six is the limit)."""
    assert len(PAGE.encode()) < 3_000_000


def test_tables_have_captions_and_scopes(outline: Outline) -> None:
    """A screen reader can tell what each table is and which cell is a heading."""
    tables = [tag for tag, _ in outline.tags if tag == "table"]
    captions = [tag for tag, _ in outline.tags if tag == "caption"]
    assert len(tables) == len(captions) > 20
    assert all(attrs.get("scope") in ("col", "row") for tag, attrs in outline.tags if tag == "th")


def test_headings_descend_one_step_at_a_time(outline: Outline) -> None:
    """One first heading, and no level is skipped."""
    levels = [int(tag[1]) for tag, _ in outline.tags if re.fullmatch("h[1-6]", tag)]
    assert levels[0] == 1 and levels.count(1) == 1
    assert all(after - before <= 1 for before, after in itertools.pairwise(levels))


def test_anchors_are_unique_and_links_arrive(outline: Outline) -> None:
    """Every link of the contents leads somewhere."""
    ids = [attrs["id"] for _, attrs in outline.tags if attrs.get("id")]
    assert len(ids) == len(set(ids))
    links = {(attrs["href"] or "")[1:] for tag, attrs in outline.tags if tag == "a"}
    labels = {word for _, attrs in outline.tags for word in (attrs.get("aria-labelledby") or "").split()}
    assert links | labels <= set(ids)


def test_every_picture_has_its_caption_and_its_table() -> None:
    """Without a script, and for who cannot see it, the picture is told in words and numbers."""
    pictures = re.findall(r'<section class="picture".*?</section>', WORDS, flags=re.DOTALL)
    assert len(pictures) == 14  # 5 + 5 + 5, the exchanger rejects nothing
    for picture in pictures:
        caption = re.search(r"<figcaption[^>]*>(.*?)</figcaption>", picture, flags=re.DOTALL)
        assert caption is not None and len(caption.group(1)) > 40
        assert "<table>" in picture


def test_withheld_figures_show_their_reason_in_their_place() -> None:
    """The total efficiency of the gas engine is refused, and its number appears nowhere on the first page."""
    head = WORDS[: WORDS.index("</header>")]
    assert "withheld: only 61.0\u00a0% of the energy is covered" in head
    assert "at least 75\u00a0% is needed" in head
    assert "85.6" not in head


def test_efficiencies_carry_their_basis() -> None:
    """Gross or net, electrical, and what they are counted against."""
    head = WORDS[: WORDS.index("</header>")]
    assert "Gross electrical efficiency" in head and "of the fuel&#39;s lower heating value" in head
    assert "Net electrical efficiency" in head and "of the heat that enters" in head


def test_danger_is_never_passed_over_in_silence() -> None:
    """Impossible intervals and open balances are told in one place, and so is their absence."""
    assert "40\u00a0intervals of Organic Rankine engine" in WORDS
    assert "the energy balance of Exhaust coil does not close" in WORDS


def test_no_saving_is_promised() -> None:
    """Distance to a ceiling is never called a saving."""
    told = [match for match in re.findall(r"[^.;]*\bsaving[^.;]*", WORDS)]
    assert told
    assert all(re.search(r"\bnot a savings estimate|\bnever a saving|\bno saving", text) for text in told)


def test_worked_interval_can_be_worked_again() -> None:
    """The printed factors of the printed tick give the printed power."""
    line = re.search(
        r"([\d.]+)\u00a0kg/s · ([\d.]+)\u00a0kJ/\(kg K\) · \(([\d.]+) \u2212 ([\d.]+)\) K = ([\d.\u202f]+)",
        WORDS,
    )
    assert line is not None
    flow, capacity, hot, cold, power = (float(part.replace("\u202f", "")) for part in line.groups())
    assert flow * capacity * (hot - cold) == pytest.approx(power, rel=2e-5)


def test_worked_entropy_can_be_worked_again() -> None:
    """Heat over temperature, stream by stream, adds up to the printed entropy generation."""
    text = re.search(r"<dt>Entropy generation</dt><dd>(.*?) = ([\u2212\d.]+)\u00a0kW/K", WORDS)
    assert text is not None
    left = text.group(1).replace("\u202f", "").replace("\u2212", "-").replace("- ", "-").replace("+ ", "")
    terms = re.findall(r"(-?[\d.]+) kW / ([\d.]+) K", left)
    assert len(terms) == 3  # oil in, air out, losses of the drive
    total = sum(float(power) / float(kelvin) for power, kelvin in terms)
    assert total == pytest.approx(float(text.group(2).replace("\u2212", "-")), abs=2e-4)


def test_flue_gas_is_worked_with_its_air_ratio() -> None:
    """Oxygen of 9.5 % in dry flue gas of natural gas is an air ratio of about 1.74.

    By hand: 1 + 8.6 / 9.6 x 9.5 / (20.946 - 9.5) = 1.7435.
    """
    worked = worked_interval(replace(RESULT, worked=WorkedInterval("engine", 100, "median efficiency")))
    assert worked is not None
    exhaust = next(line for line in worked.streams if line.name.startswith("Exhaust"))
    ratio = re.search(r"= ([\d.]+); flue gas", exhaust.equation)
    assert ratio is not None
    assert float(ratio.group(1)) == pytest.approx(1.7435, abs=0.01)


def _without_numbers(result: AuditResult) -> AuditResult:
    """The same month as if no machine had ever run and no figure could be known."""
    balances, judgements = {}, {}
    for name, balance in result.balances.items():
        nothing = {key: np.full_like(values, np.nan) for key, values in balance.interval.values.items()}
        interval = replace(balance.interval, values=nothing, load=np.full_like(balance.interval.load, np.nan))
        period = {
            key: replace(
                figure,
                value=np.nan,
                expanded_U=np.nan,
                status=Status.WITHHELD,
                withheld_because="no input",
                logged=np.nan,
                common=np.nan,
            )
            for key, figure in balance.period.items()
        }
        balances[name] = replace(
            balance,
            interval=interval,
            interval_U=nothing,
            period=period,
            contributions={},
            closure=Closure.NOT_TESTABLE,
        )
        old = result.judgements[name]
        judgements[name] = replace(old, verdict=np.full_like(old.verdict, Verdict.STOPPED))
    return replace(result, balances=balances, judgements=judgements, findings=(), worked=None)


def test_a_month_without_any_figure_still_gives_a_page() -> None:
    """Nothing known is said in words, figure by figure; no number is made up and nothing fails."""
    page = render_report(_without_numbers(make_result(3, Exit.PROVISIONAL)))
    assert "withheld: no input was logged that it could be counted against" in page
    assert "The program noticed nothing." in page
    assert "The energy flow is not drawn" in page
    visible = re.sub(r"<script.*?</script>", "", page, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\binf\b", visible)


def _numbers(text: str) -> list[float]:
    return [float(part.replace("\u202f", "")) for part in re.findall(r"\d[\d.\u202f]*", text)]


def test_shaft_power_is_worked_in_the_units_that_are_printed() -> None:
    """Torque in N m times revolutions per minute times 2 pi / 60 gives watts."""
    shaft = Stream("power", "orc", Role.WORK_OUT, Shaft("air_flow", "oil_flow"))
    torque, per_second = (
        float(RESULT.ticks.mean[0, RESULT.ticks.column(name)]) for name in ("air_flow", "oil_flow")
    )
    _, minute, newton_metres, per_minute, *_ = _numbers(stream_line(shaft, 0, RESULT).equation)
    watts = 2.0 * np.pi / minute * newton_metres * per_minute
    assert watts == pytest.approx(2.0 * np.pi * torque * per_second, rel=1e-5)


def test_liquid_fuel_is_worked_in_the_units_that_are_printed() -> None:
    """Kilograms per hour times kilowatt-hours per kilogram give kilowatts."""
    value = HeatingValue(
        RESULT.period.start_us, assumed("fuels.oil.values", 42.7e6, 0.0, "J/kg"), None, "sheet"
    )
    oil = Fuel("oil", "liquid", None, (value,), assumed("fuels.oil.standard", 1.0, 0.004))
    plant = replace(RESULT.plant, fuels={**RESULT.plant.fuels, "oil": oil})
    stream = Stream("gas", "engine", Role.FUEL_IN, LiquidFuel("oil", "oil_flow", None, None))
    kg_per_hour, kWh_per_kg, _ = _numbers(stream_line(stream, 0, replace(RESULT, plant=plant)).equation)
    flow = float(RESULT.ticks.mean[0, RESULT.ticks.column("oil_flow")])
    assert kg_per_hour * kWh_per_kg == pytest.approx(flow * 42.7e6 / 1e3, rel=1e-4)


def test_missing_values_in_templates_are_errors() -> None:
    """A name that is misspelt in a template stops the page instead of printing nothing."""
    with pytest.raises(UndefinedError):
        environment().from_string("{{ summary.no_such_thing }}").render(summary={})


def test_same_result_same_bytes(tmp_path: Path) -> None:
    """Neither hash seed nor time zone nor folder shows in the page."""
    code = (
        "import hashlib, report_factory; from auditor.report.page import render_report; "
        "print(hashlib.sha256(render_report(report_factory.make_result(3)).encode()).hexdigest())"
    )
    here = Path(__file__).resolve().parent
    found = set()
    for seed, zone, place in (("1", "UTC", tmp_path), ("2", "Asia/Kathmandu", here)):
        surroundings = os.environ | {
            "PYTHONHASHSEED": seed,
            "TZ": zone,
            "PYTHONPATH": os.pathsep.join((str(here), str(here.parent))),
        }
        run = subprocess.run(
            [sys.executable, "-c", code],
            env=surroundings,
            cwd=place,
            capture_output=True,
            text=True,
            check=True,
        )
        found.add(run.stdout)
    found.add(hashlib.sha256(render_report(make_result(3)).encode()).hexdigest() + "\n")
    assert len(found) == 1


@pytest.mark.parametrize("status", [Exit.FIRM, Exit.PROVISIONAL, Exit.LOOK])
def test_the_verdict_on_the_month_is_told_in_words(status: Exit) -> None:
    """Firm, provisional, or a person must look: in the first sentence."""
    page = render_report(make_result(3, status))
    words = {
        Exit.FIRM: "<strong>Firm.</strong>",
        Exit.PROVISIONAL: "<strong>Provisional.</strong>",
        Exit.LOOK: "<strong>A person must look before this is used.</strong>",
    }
    assert words[status] in page


def _luminance(colour: str) -> float:
    parts = [int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


@pytest.mark.parametrize("name", ["ink", "soft", "blue", "brick", "ochre"])
@pytest.mark.parametrize("ground", ["paper", "tint"])
def test_text_colours_have_enough_contrast(name: str, ground: str) -> None:
    """At least 4.5 to 1 on every ground: WCAG 2.2, success criterion 1.4.3, level AA."""
    css = (folder("report_templates") / "report.css").read_text(encoding="utf-8")
    colours = dict(re.findall(r"--(\w+): (#[0-9a-f]{6})", css))
    light, dark = sorted((_luminance(colours[name]), _luminance(colours[ground])), reverse=True)
    assert (light + 0.05) / (dark + 0.05) >= 4.5
