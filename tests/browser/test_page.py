"""The page in a browser: what a user does, and what then shows."""

from __future__ import annotations

import http.client
import re
from urllib.parse import urlsplit

import pytest
from playwright.sync_api import Browser, Page, expect

from tests.browser import served_page
from tests.browser.conftest import SIZE, Watch, open_page

pytestmark = [pytest.mark.browser, pytest.mark.slow]

SHEETS = ("Section", "Wing", "Balance", "Speed and battery", "Launch and landing")
MARGINS = (
    "Landing over stall",
    "Launch over stall",
    "Static margin",
    "Elevator left",
    "Cruise power",
    "Endurance",
    "Span",
)

LINE = """(name) => {
  const plot = Bokeh.documents[0].get_model_by_name(name)
  return JSON.stringify(plot.renderers.map((one) => one.data_source
    ? Object.fromEntries(Object.entries(one.data_source.data).map(([k, v]) => [k, [...v]]))
    : null))
}"""

SETTLED = "() => !window.halfspanFlying"

UNPAINTED = """() => {
  const figures = []
  const walk = (view) => {
    if (view.model.type === "Figure") figures.push(view)
    for (const child of view.children_views ? view.children_views() : []) walk(child)
  }
  for (const root of Bokeh.index.roots) walk(root)
  const inked = (view) => {
    const canvas = view.canvas_view.primary.canvas
    if (!canvas.width || !canvas.height) return false
    const pixels = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height).data
    for (let i = 3; i < pixels.length; i += 4) if (pixels[i] > 0) return true
    return false
  }
  const visible = figures.filter((view) => view.el.getClientRects().length > 0)
  if (visible.length < 3) return ["fewer than three figures"]
  return visible.filter((view) => !inked(view)).map((view) => view.model.name)
}"""


def open_sheet(page: Page, name: str) -> None:
    page.get_by_role("tab", name=name, exact=True).click()
    expect(page.get_by_role("tab", name=name, exact=True)).to_have_attribute(
        "aria-selected", "true"
    )
    page.wait_for_function(f"() => Bokeh.documents[0].is_idle && ({SETTLED})()")


def tile(page: Page, label: str):
    return page.locator(".tile").filter(has_text=label)


def entry(page: Page, name: str):
    return page.locator(f'.entry [data-name="{name}"]')


def slider(page: Page, label: str):
    return page.get_by_role("slider", name=label, exact=True)


def give(page: Page, name: str, text: str, *, wait: bool = True) -> None:
    box = entry(page, name)
    box.fill(text)
    box.press("Enter")
    if wait:
        page.wait_for_function(SETTLED)


def wait_for_change(page: Page, plot: str, before: str) -> None:
    page.wait_for_function(f"([name, before]) => ({LINE})(name) !== before", arg=[plot, before])


def test_the_page_opens_with_its_margins_its_inputs_and_its_cautions(page):
    assert page.title() == "Halfspan"
    for name in SHEETS:
        expect(page.get_by_role("tab", name=name, exact=True)).to_be_visible()
    assert page.locator(".tile .label").all_inner_texts() == list(MARGINS)
    for verdict in page.locator(".tile .verdict").all_inner_texts():
        assert re.match(r"\s*(pass|watch|fail)\b", verdict)
    assert page.locator(".tile .verdict svg").count() == len(MARGINS)
    footer = page.locator("footer.cautions")
    expect(footer).to_be_in_viewport()
    assert "certification" in footer.inner_text()
    expect(page.locator(".reason")).not_to_be_empty()


def test_moving_a_slider_by_keyboard_changes_plots_and_strip(page):
    open_sheet(page, "Wing")
    before, said = page.evaluate(LINE, "Wing: local_lift_landing"), tile(page, "Span").inner_text()
    slider(page, "Span").focus()
    page.keyboard.press("ArrowLeft")
    wait_for_change(page, "Wing: local_lift_landing", before)
    expect(tile(page, "Span")).not_to_have_text(said, use_inner_text=True)
    expect(entry(page, "span_m")).to_have_value("2.39")
    page.keyboard.press("ArrowRight")
    expect(entry(page, "span_m")).to_have_value("2.4")
    expect(tile(page, "Span")).to_have_text(said, use_inner_text=True)


def test_of_many_quick_moves_the_last_one_counts(page):
    open_sheet(page, "Wing")
    slider(page, "Span").focus()
    for _ in range(15):
        page.keyboard.press("ArrowLeft")
    for _ in range(10):
        page.keyboard.press("ArrowRight")
    expect(tile(page, "Span")).to_contain_text("2.35")
    give(page, "span_m", "2.4")
    expect(tile(page, "Span")).to_contain_text("2.40")
    expect(slider(page, "Span")).to_have_value("2.4")


@pytest.mark.parametrize("text", ["wide", "2.1.3", "1e", "99", "-2"])
def test_a_refused_entry_marks_its_field_and_the_page_keeps_the_last_good_state(page, text):
    open_sheet(page, "Wing")
    before = page.evaluate(LINE, "Wing: local_lift_landing")
    give(page, "span_m", text)
    box = entry(page, "span_m")
    error = page.locator("#field-span_m-error")
    expect(error).to_be_visible()
    expect(error).to_contain_text("Span must be a number between 0.4 and 8 m")
    expect(box).to_have_attribute("aria-invalid", "true")
    expect(box).to_have_value(text)
    assert page.evaluate(LINE, "Wing: local_lift_landing") == before
    expect(tile(page, "Span")).to_contain_text("2.40")
    if text == "99":
        open_sheet(page, "Balance")
        open_sheet(page, "Wing")
        expect(error).to_be_visible()
        expect(box).to_have_value(text)
    give(page, "span_m", "2.4")
    expect(error).to_be_hidden()
    expect(box).not_to_have_attribute("aria-invalid", "true")


def test_a_decimal_comma_is_taken(page):
    open_sheet(page, "Wing")
    give(page, "span_m", "2,31")
    expect(tile(page, "Span")).to_contain_text("2.31")
    expect(entry(page, "span_m")).to_have_value("2.31")
    give(page, "span_m", "2.4")
    expect(tile(page, "Span")).to_contain_text("2.40")


def test_text_of_the_user_is_shown_and_never_run(page):
    assert page.locator("h1").inner_text() == served_page.NAME
    assert page.locator(".note").first.inner_text() == served_page.NOTE
    assert page.evaluate("window.harmed") is None
    assert page.locator("h1 *").count() == 0
    # A refused section's name comes back in a sentence.
    open_sheet(page, "Section")
    give(page, "root_section", "<img src=x onerror=window.harmed=3>")
    error = page.locator("#field-root_section-error")
    expect(error).to_contain_text("<img src=x onerror=window.harmed=3>")
    assert page.locator("img").count() == 0
    assert page.evaluate("window.harmed") is None
    give(page, "root_section", "E387")
    expect(error).to_be_hidden()


def test_an_error_in_a_callback_is_said_and_the_last_good_result_stays(page):
    open_sheet(page, "Wing")
    before = page.evaluate(LINE, "Wing: local_lift_landing")
    give(page, "mass_kg", str(served_page.FAILS_AT_KG))
    notice = page.get_by_role("alert").filter(has_text="last good result")
    expect(notice).to_be_visible()
    assert "on purpose" not in notice.inner_text()
    assert page.evaluate(LINE, "Wing: local_lift_landing") == before
    give(page, "mass_kg", "4.65")
    expect(notice).to_be_hidden()
    assert page.evaluate(LINE, "Wing: local_lift_landing") != before
    give(page, "mass_kg", "4.6")
    assert page.evaluate(LINE, "Wing: local_lift_landing") == before


def test_what_takes_long_is_marked_and_the_mark_goes(page):
    give(page, "mass_kg", str(served_page.SLOW_AT_KG), wait=False)
    solving = page.locator(".solving")
    expect(solving).to_have_text("solving")
    opacity = "() => getComputedStyle(document.documentElement).getPropertyValue('--plots')"
    assert float(page.evaluate(opacity)) < 1.0
    expect(solving).to_have_text("")
    assert float(page.evaluate(opacity)) == 1.0
    give(page, "mass_kg", "4.6")
    expect(entry(page, "mass_kg")).to_have_value("4.6")


def test_a_margin_opens_its_sheet_and_says_its_reason(page):
    open_sheet(page, "Wing")
    main = page.locator(".reason").inner_text()
    tile(page, "Static margin").click()
    expect(page.get_by_role("tab", name="Balance", exact=True)).to_have_attribute(
        "aria-selected", "true"
    )
    expect(page.locator(".reason")).to_contain_text("Static margin:")
    page.get_by_role("button", name="Back to the main reason").click()
    expect(page.locator(".reason")).to_have_text(main, use_inner_text=True)


def station_of(page: Page, plot: str) -> float:
    return page.evaluate(
        """(name) => Bokeh.documents[0].get_model_by_name(name).renderers
        .map((one) => one.data_source).find((one) => one && one.name === "station")
        .data.share[0]""",
        plot,
    )


def test_pointing_at_the_wing_lights_up_the_station_everywhere(page):
    open_sheet(page, "Wing")
    words = page.locator(".station output")
    drawing = page.get_by_role("img", name=re.compile("Wing and tail from above"))
    box, shares = drawing.bounding_box(), []
    for place in (0.62, 0.8):
        said = words.inner_text()
        page.mouse.move(box["x"] + place * box["width"], box["y"] + 0.3 * box["height"])
        expect(words).not_to_have_text(said, use_inner_text=True)
        shares.append(station_of(page, "Wing: planform"))
        assert station_of(page, "Wing: local_lift_landing") == shares[-1]
        assert station_of(page, "Wing: reynolds_cruise_landing") == shares[-1]
    assert shares[0] < shares[1]
    open_sheet(page, "Section")
    assert station_of(page, "Section: section_lift") == shares[-1]
    # The same by keyboard.
    place = page.get_by_role("slider", name="Station, share of the half-span")
    place.focus()
    said = words.inner_text()
    page.keyboard.press("Home")
    expect(words).not_to_have_text(said, use_inner_text=True)
    assert station_of(page, "Section: section_lift") < shares[0]


@pytest.mark.parametrize("name", SHEETS)
def test_every_plot_of_a_sheet_is_painted_and_the_page_does_not_scroll(page, name):
    open_sheet(page, name)
    page.wait_for_function(f"() => ({UNPAINTED})().length === 0", polling=100)
    tall, wide = page.evaluate(
        "() => [document.documentElement.scrollHeight, document.documentElement.scrollWidth]"
    )
    assert (tall, wide) == (SIZE["height"], SIZE["width"])
    text = page.locator("body").inner_text()
    assert not re.search(r"\b(nan|NaN|inf|undefined|null)\b", text)


def test_every_control_has_a_name_a_unit_and_its_help(page):
    for name in SHEETS:
        open_sheet(page, name)
        while page.locator(".inputs details:not([open]) > summary").count():
            page.locator(".inputs details:not([open]) > summary").first.click()
        unnamed = page.evaluate(
            """() => {
              const found = []
              const walk = (root) => { for (const one of root.querySelectorAll("*")) {
                if (one.shadowRoot) walk(one.shadowRoot)
                if (!one.matches("input, select, button")) continue
                const label = one.getAttribute("aria-label") || one.textContent.trim()
                  || (one.labels && one.labels.length ? one.labels[0].textContent : "")
                if (!label) found.push(one.outerHTML)
              } }
              walk(document)
              return found
            }"""
        )
        assert unnamed == []
        for field in page.locator(".field").all():
            helped = field.locator(".unseen").inner_text()
            assert "Allowed:" in helped


def test_the_numbers_behind_the_plots_open_by_keyboard(page):
    open_sheet(page, "Balance")
    fold = page.locator("details.fold:visible")
    expect(fold.locator("table")).to_have_count(0)
    fold.locator("summary").focus()
    page.keyboard.press("Enter")
    expect(fold.locator("tbody tr").first).to_be_visible()
    expect(fold.locator("th").first).to_have_text("speed [m/s]")
    page.keyboard.press("Enter")
    expect(fold.locator("table")).to_be_hidden()


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_words_stand_out_from_the_paper_in_light_and_dark(browser: Browser, address, scheme):
    watch = Watch(address)
    page = open_page(browser, address, watch, color_scheme=scheme)
    ratios = page.evaluate(
        """() => {
          const canvas = document.createElement("canvas").getContext("2d")
          const rgb = (colour) => { canvas.clearRect(0, 0, 1, 1); canvas.fillStyle = colour
            canvas.fillRect(0, 0, 1, 1); return [...canvas.getImageData(0, 0, 1, 1).data] }
          const light = (colour) => { const c = rgb(colour).slice(0, 3).map((v) => v / 255)
            .map((v) => v <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4)
            return 0.2126 * c[0] + 0.7152 * c[1] + 0.0722 * c[2] }
          const style = getComputedStyle(document.documentElement)
          const token = (name) => style.getPropertyValue(name).trim()
          const ratio = (a, b) => { const [x, y] = [light(a), light(b)].sort((p, q) => q - p)
            return (x + 0.05) / (y + 0.05) }
          const out = {}
          for (const ink of ["--ink", "--muted", "--pass-ink", "--watch-ink", "--fail-ink"])
            for (const paper of ["--paper", "--card", "--sunk"])
              out[ink + paper] = ratio(token(ink), token(paper))
          const walk = (root) => root.querySelector("h1") ?? [...root.querySelectorAll("*")]
            .filter((one) => one.shadowRoot).map((one) => walk(one.shadowRoot)).find(Boolean)
          out.heading = ratio(getComputedStyle(walk(document)).color, token("--paper"))
          return out
        }"""
    )
    page.context.close()
    # Web Content Accessibility Guidelines 2.2, 1.4.3: 4.5 for text of this size.
    assert min(ratios.values()) >= 4.5, ratios
    assert watch.complaints == []


def test_a_foreign_page_cannot_reach_the_program(address):
    place = urlsplit(address)
    for origin, status in (("http://elsewhere.example", 403), (address.rstrip("/"), 101)):
        connection = http.client.HTTPConnection(place.hostname, place.port, timeout=10)
        connection.request(
            "GET",
            "/ws",
            headers={
                "Origin": origin,
                "Connection": "Upgrade",
                "Upgrade": "websocket",
                "Sec-WebSocket-Version": "13",
                "Sec-WebSocket-Key": "AAAAAAAAAAAAAAAAAAAAAA==",
                "Sec-WebSocket-Protocol": "bokeh, token",
            },
        )
        answer = connection.getresponse()
        connection.close()
        assert answer.status == status


def test_a_request_that_names_another_host_is_refused(address):
    place = urlsplit(address)
    for path in ("/", "/ws", "/static/js/bokeh.min.js"):
        connection = http.client.HTTPConnection(place.hostname, place.port, timeout=10)
        connection.request("GET", path, headers={"Host": f"elsewhere.example:{place.port}"})
        answer = connection.getresponse()
        assert answer.status == 403
        assert b"127.0.0.1" in answer.read()
        connection.close()
