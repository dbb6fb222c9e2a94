"""The report in a browser without a network: what a colleague on a train can do with it."""

from __future__ import annotations

import re

import numpy as np
import pytest
from playwright.sync_api import Browser, Page, expect

from app.analysis.results import Results
from app.analysis.stages import Analysis
from app.report import make_report
from app.report.csv_text import polar_csv, station_csv
from tests.app.report_cases import HARM, demo, harmful, other
from tests.browser.conftest import SIZE

pytestmark = [pytest.mark.browser, pytest.mark.slow]

READY = "() => document.documentElement.dataset.ready === 'true' && Bokeh.documents[0].is_idle"
OWN = ("file:", "data:", "blob:")


class Opened:
    """One report in one page, and everything that it must not have done."""

    def __init__(self, browser: Browser, path) -> None:
        self.complaints: list[str] = []
        self.path = path
        context = browser.new_context(viewport=SIZE, offline=True)
        self.page = context.new_page()
        self.page.set_default_timeout(20_000)
        self.page.on("request", self._request)
        self.page.on("websocket", lambda one: self.complaints.append(f"socket {one.url}"))
        self.page.on("console", self._console)
        self.page.on("pageerror", lambda error: self.complaints.append(f"script: {error}"))
        self.page.goto(path.as_uri())
        self.page.wait_for_function(READY)

    def _request(self, request) -> None:
        if not request.url.startswith(OWN):
            self.complaints.append(f"asks for {request.url}")

    def _console(self, message) -> None:
        if message.type in ("error", "warning"):
            self.complaints.append(f"{message.type}: {message.text}")


@pytest.fixture(scope="module")
def single(browser, tmp_path_factory):
    path = tmp_path_factory.mktemp("report") / "one.html"
    opened = Opened(browser, make_report([harmful()], output=path))
    yield opened
    opened.page.context.close()
    assert opened.complaints == []


@pytest.fixture(scope="module")
def compared(browser, tmp_path_factory):
    path = tmp_path_factory.mktemp("report") / "three.html"
    make_report([demo(), harmful(), other()], output=path)
    opened = Opened(browser, path)
    yield opened
    opened.page.context.close()
    assert opened.complaints == []


def reading(page: Page, key: str, at: int = 0) -> float:
    text = page.locator(f"#live-{at}-{key}").inner_text()
    return float(re.match(r"[−\d.]+", text)[0].replace("−", "-"))


def press(page: Page, name: str, key: str, times: int) -> None:
    page.locator(f"#live-{name}").focus()
    for _ in range(times):
        page.keyboard.press(key)


def back(page: Page) -> None:
    page.get_by_role("button", name="Back to the design").click()


def full_solve(mass: float, speed: float, altitude: float) -> Results:
    scenario = harmful()[0].copy()
    scenario.set_values({"mass_kg": mass, "cruise_speed_m_s": speed, "field_altitude_m": altitude})
    return Analysis().run(scenario.freeze())


def test_sliders_by_keyboard_say_what_a_full_solve_says(single):
    page = single.page
    back(page)
    before = reading(page, "lift_to_drag")
    press(page, "speed", "ArrowRight", 12)
    press(page, "mass", "ArrowRight", 25)
    press(page, "altitude", "ArrowRight", 33)
    expect(page.locator("#live-speed-said")).to_have_text("18.2\u00a0m/s")
    expect(page.locator("#live-mass-said")).to_have_text("4.85\u00a0kg")
    expect(page.locator("#live-altitude-said")).to_have_text("450\u00a0m")
    solved = full_solve(4.85, 18.2, 450.0)
    landing, cruise = solved.landing, solved.cruise
    endurance = next(one.value for one in solved.margins if one.key == "endurance")
    expected = {
        "lift_to_drag": cruise.lift_to_drag,
        "drag": cruise.drag.total,
        "power": cruise.electric_power_w,
        "endurance": endurance,
        "stall": landing.stall_speed_m_s,
        "landing_ratio": landing.landing_ratio,
        "speed_ratio": 18.2 / landing.stall_speed_m_s,
    }
    for key, value in expected.items():
        # Three figures are written, and the table may be off by a per cent.
        assert reading(page, key) == pytest.approx(value, rel=0.015), key
    assert reading(page, "elevator") == pytest.approx(cruise.elevator_deg, abs=0.2)
    assert reading(page, "lift_to_drag") != before
    share = page.evaluate("() => Bokeh.documents[0].get_model_by_name('station').data.share[0]")
    place = share * float(solved.planform.wing_y.max())
    span = cruise.span
    assert reading(page, "local_lift") == pytest.approx(
        float(np.interp(place, span.y_m, span.lift)), abs=0.01
    )
    assert reading(page, "local_limit") == pytest.approx(
        float(np.interp(place, span.y_m, span.limit)), rel=0.015
    )
    back(page)
    assert reading(page, "lift_to_drag") == before


def test_too_slow_is_said_and_never_shown_as_a_flight(single):
    page = single.page
    press(page, "speed", "Home", 1)
    expect(page.locator("#live-0-trust")).to_contain_text("no level flight")
    expect(page.locator("#live-0-drag")).to_have_text("not found")
    expect(page.locator("#live-0-local_lift")).to_have_text("not found")
    assert reading(page, "stall") > 5.0
    back(page)
    expect(page.locator("#live-0-trust")).not_to_contain_text("no level flight")


def centre(page: Page, name: str) -> tuple[float, float]:
    place = page.locator(f"#plot-{name}")
    place.scroll_into_view_if_needed()
    page.evaluate("(id) => document.getElementById(id).scrollIntoView({block: 'center'})",
                  f"plot-{name}")  # fmt: skip
    box = place.bounding_box()
    return box["x"] + 0.55 * box["width"], box["y"] + 0.5 * box["height"]


def test_the_pointer_reads_a_value_off_a_plot(single):
    page = single.page
    x, _ = centre(page, "lift-to-drag")
    box = page.locator("#plot-lift-to-drag").bounding_box()
    tip = page.locator(".bk-tooltip-content")
    for share in np.linspace(0.2, 0.8, 60):
        page.mouse.move(x, box["y"] + share * box["height"])
        # The reading follows with the next painting.
        page.evaluate("() => new Promise((done) => requestAnimationFrame(() => done()))")
        if tip.count() and tip.first.is_visible():
            break
    expect(tip.first).to_be_visible()
    said = tip.first.inner_text()
    assert re.search(r"speed:\s+\d+\.\d m/s", said)
    assert re.search(r"lift to drag:\s+\d+\.\d", said)
    page.mouse.move(2, 2)


def test_a_box_zooms_and_a_double_click_undoes_it(single):
    page = single.page
    ends = """() => { const plot = Bokeh.documents[0].get_model_by_name("power")
      return [plot.x_range.start, plot.x_range.end] }"""
    before = page.evaluate(ends)
    x, y = centre(page, "power")
    page.mouse.move(x - 60, y - 40)
    page.mouse.down()
    page.mouse.move(x + 20, y + 30, steps=4)
    page.mouse.up()
    page.wait_for_function(f"(before) => ({ends})()[1] < before[1] - 1", arg=before)
    inside = page.evaluate(ends)
    assert before[0] < inside[0] < inside[1] < before[1]
    page.mouse.dblclick(x, y)
    page.wait_for_function(f"(before) => Math.abs(({ends})()[1] - before[1]) < 1e-9", arg=before)


def station(page: Page) -> float:
    return page.evaluate("() => Bokeh.documents[0].get_model_by_name('station').data.share[0]")


def test_one_station_is_pointed_at_everywhere(single):
    page = single.page
    said, here = page.locator("#station-said"), page.locator("table.stations tr.here th")
    page.locator("#station").focus()
    page.keyboard.press("Home")
    first, row, lift = station(page), here.inner_text(), reading(page, "local_lift")
    for _ in range(40):
        page.keyboard.press("ArrowRight")
    assert station(page) > first + 0.3
    assert here.count() == 1
    assert here.inner_text() != row
    assert said.inner_text().startswith(f"{float(here.inner_text()):.3g}")
    assert reading(page, "local_lift") != lift
    # A row of the table points, and so does a plot along the wing.
    page.locator("table.stations tbody tr").nth(4).click()
    expect(here).to_have_text(f"{harmful()[1].landing.landing_span.y_m[4]:.3f}")
    held = station(page)
    x, y = centre(page, "local-lift-cruise")
    page.mouse.click(x, y)
    page.mouse.move(x + 60, y, steps=3)
    page.wait_for_function(
        "(held) => Bokeh.documents[0].get_model_by_name('station').data.share[0] > held", arg=held
    )


def test_tables_are_saved_as_csv(single):
    page = single.page
    results = harmful()[1]
    for words, expected in (
        ("Save the stations as CSV", station_csv(results)),
        ("Save the curves as CSV", polar_csv(results)),
    ):
        with page.expect_download() as waiting:
            page.get_by_role("button", name=words).click()
        download = waiting.value
        assert download.suggested_filename.endswith(".csv")
        assert download.path().read_bytes().decode() == expected


def test_text_of_a_user_is_shown_and_never_run(single):
    page = single.page
    assert page.evaluate("window.harmed") is None
    assert page.locator("img").count() == 0
    assert page.locator("h1").inner_text() == f"{HARM} & co"
    assert harmful()[0].note.splitlines()[0] in page.locator(".note-of-user").inner_text()


def test_the_policy_stops_a_script_and_a_load_that_got_in(browser, single, tmp_path):
    text = single.path.read_text(encoding="utf-8")
    smuggled = tmp_path / "smuggled.html"
    bad = "<script>window.harmed=9</script><img src='http://127.0.0.1:9/x.png'></body>"
    smuggled.write_text(text.replace("</body>", bad), encoding="utf-8")
    page = browser.new_context(viewport=SIZE).new_page()
    asked: list[str] = []
    page.on("requestfinished", lambda one: asked.append(one.url))
    page.goto(smuggled.as_uri())
    page.wait_for_function(READY)
    assert page.evaluate("window.harmed") is None
    assert [url for url in asked if not url.startswith(OWN)] == []
    page.context.close()


def test_on_paper_nothing_is_wider_than_the_page_and_no_plot_is_cut(single):
    page = single.page
    page.evaluate("() => window.dispatchEvent(new Event('beforeprint'))")
    page.emulate_media(media="print")
    # A4 less the margins of the style sheet, in CSS pixels.
    page.set_viewport_size({"width": 703, "height": 1000})
    wide = page.evaluate(
        """() => [...document.querySelectorAll("main *")]
        .filter((one) => one.getBoundingClientRect().right > 704).map((one) => one.id)"""
    )
    assert wide == []
    cut = page.evaluate(
        """() => [...document.querySelectorAll(".plot")]
        .filter((one) => getComputedStyle(one).breakInside !== "avoid").length"""
    )
    assert cut == 0
    assert page.locator(".sliders").is_hidden()
    assert page.locator(".station-bar").is_hidden()
    expect(page.locator(".print-only")).to_contain_text("true airspeed 17.0")
    page.emulate_media(media="screen")
    page.set_viewport_size(SIZE)
    page.evaluate("() => window.dispatchEvent(new Event('afterprint'))")
    assert page.locator(".sliders").is_visible()
    assert page.pdf(prefer_css_page_size=True).startswith(b"%PDF")


def test_three_wings_side_by_side_and_moved_together(compared):
    page = compared.page
    assert compared.path.stat().st_size < 5_000_000
    assert page.evaluate("window.harmed") is None
    assert page.locator("img").count() == 0
    wings = [demo(), harmful(), other()]
    for label in ("Landing over stall", "Endurance"):
        row = page.locator(".side-by-side tbody tr").filter(has_text=label)
        cells = row.locator("td b").all_inner_texts()
        found = [float(re.match(r"[\d.]+", text)[0]) for text in cells]
        values = [
            next(one.value for one in results.margins if one.label == label) for _, results in wings
        ]
        # Three figures are written.
        assert found == pytest.approx(values, rel=5e-3)
    differ = page.locator("#differences tbody th").all_inner_texts()
    assert {"Span", "Tip chord"} <= set(differ)
    assert "Mass" not in differ
    ratios = [reading(page, "lift_to_drag", at) for at in range(3)]
    assert ratios == pytest.approx([one.cruise.lift_to_drag for _, one in wings], rel=0.015)
    press(page, "mass", "ArrowRight", 10)
    expect(page.locator("#live-mass-said")).to_contain_text("+10.0")
    stalls = [reading(page, "stall", at) for at in range(3)]
    # Heavier by a tenth: stall speed with its square root, but for the Reynolds number.
    expected = [np.sqrt(1.1) * one.landing.stall_speed_m_s for _, one in wings]
    assert stalls == pytest.approx(expected, rel=0.02)
    columns = page.evaluate(
        "() => [0, 1, 2].map((at) => Bokeh.documents[0].get_model_by_name(`live-${at}-data`)"
        ".data.x.length)"
    )
    assert min(columns) > 30
    back(page)
