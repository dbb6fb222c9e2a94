"""The journal in a browser: kept, found, compared, brought back; and nothing lost."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from playwright.sync_api import Browser, Locator, Page, expect

from app.journal_exchange import LARGEST_UPLOAD
from app.scenario_file import read_scenario
from tests.browser.conftest import IDLE, Program, Watch, open_page
from tests.browser.test_page import (
    LINE,
    SETTLED,
    UNPAINTED,
    entry,
    give,
    open_sheet,
    slider,
    wait_for_change,
)

pytestmark = [pytest.mark.browser, pytest.mark.slow]

HARM = '<img src=x onerror="window.harmed=7">'


class Desk:
    """A program with a folder of its own, and one page on it that the tests hand on."""

    def __init__(self, folder: Path, browser: Browser) -> None:
        self.folder, self.browser = folder, browser
        self.program = Program(str(folder))
        self.address = self.program.address
        self.watch = Watch(self.address)
        self.page: Page | None = None

    def get(self) -> Page:
        """Give the page as it is, or a new one."""
        if self.page is None:
            self.page = open_page(self.browser, self.address, self.watch)
            dismiss = self.page.get_by_role("button", name="Dismiss")
            if dismiss.is_visible():
                dismiss.click()
        return self.page

    def drop(self) -> None:
        """Close the page: the next test opens its own."""
        if self.page is not None:
            self.page.context.close()
        self.page = None
        self.watch.complaints.clear()

    def restart(self) -> None:
        """Start the program again where it was."""
        self.program = Program(str(self.folder), str(urlsplit(self.address).port))


@pytest.fixture(scope="module")
def desk(tmp_path_factory: pytest.TempPathFactory, browser: Browser) -> Iterator[Desk]:
    made = Desk(tmp_path_factory.mktemp("desk"), browser)
    yield made
    made.drop()
    made.program.end()


@pytest.fixture
def page(desk: Desk, request: pytest.FixtureRequest) -> Iterator[Page]:
    """Give an open page; afterwards fail on errors and on foreign requests."""
    failed = request.session.testsfailed
    yield desk.get()
    complaints = list(desk.watch.complaints)
    if complaints or request.session.testsfailed != failed:
        desk.drop()
    assert complaints == []


def button(page: Page, name: str | re.Pattern[str]) -> Locator:
    return page.get_by_role("button", name=name)


def keep(page: Page, name: str, note: str = "") -> None:
    button(page, re.compile("^Snapshot")).click()
    page.get_by_label("Name", exact=True).fill(name)
    page.get_by_label("Note", exact=True).fill(note)
    button(page, "Keep in the journal").click()
    expect(page.locator(".said .done")).to_have_text(f"Kept “{name}” in the journal.")


def row(page: Page, name: str) -> Locator:
    return page.locator(".journal li[data-id]").filter(has_text=name)


def remove_all(page: Page) -> None:
    open_sheet(page, "Journal")
    expect(page.locator(".journal .list > li").first).to_be_visible()
    rows = page.locator(".journal li[data-id]")
    while count := rows.count():
        rows.first.get_by_role("button", name=re.compile("^Delete")).click()
        expect(rows).to_have_count(count - 1)


def unharmed(page: Page) -> None:
    assert page.evaluate("window.harmed") is None
    assert page.locator("img").count() == 0


def kept_address(page: Page) -> str:
    """Wait until the address names the present state."""
    before = page.url
    page.wait_for_function("(before) => location.href !== before", arg=before)
    return page.url


def test_undo_and_redo_by_button_and_by_keyboard(page):
    open_sheet(page, "Wing")
    sweep = entry(page, "sweep_deg")  # no other test moves it: close moves would be one step
    give(page, "sweep_deg", "5")
    expect(button(page, "Nothing to do again")).to_be_disabled()
    before = page.evaluate(LINE, "Wing: planform")
    button(page, re.compile(r"^Undo sweep 0\S* to 5\S* deg$")).click()
    expect(sweep).to_have_value("0")
    wait_for_change(page, "Wing: planform", before)
    slider(page, "Root chord").focus()
    page.keyboard.press("Control+Shift+z")
    expect(sweep).to_have_value("5")
    # Letters typed into a field are the browser's to undo.
    entry(page, "mass_kg").focus()
    page.keyboard.press("Control+z")
    page.wait_for_function(SETTLED)
    expect(sweep).to_have_value("5")
    slider(page, "Root chord").focus()
    page.keyboard.press("Control+z")
    expect(sweep).to_have_value("0")
    expect(button(page, re.compile(r"^Redo sweep"))).to_be_enabled()


def test_snapshots_are_compared_and_one_is_brought_back(page):
    remove_all(page)
    keep(page, "As drawn", "the start")
    give(page, "mass_kg", "5.2")
    keep(page, "Heavier")
    rows = page.locator(".journal li[data-id]")
    expect(rows).to_have_count(2)
    assert "Heavier" in rows.nth(0).inner_text()
    assert row(page, "As drawn").locator(".figure").count() == 7
    assert row(page, "As drawn").locator("svg.wing path").count() == 2
    give(page, "mass_kg", "4.9")
    compare = page.locator(".journal").get_by_role("button", name="Compare")
    expect(compare).to_be_disabled()
    page.get_by_label("Compare As drawn").check()
    page.get_by_label("Compare Heavier").check()
    page.get_by_label("with what is on the page now").check()
    compare.click()
    table = page.locator(".comparison table")
    expect(table).to_have_count(2)
    margins, inputs = table.nth(0), table.nth(1)
    assert [one.strip()[0] for one in margins.locator("thead th b").all_inner_texts()] == [
        "A",
        "B",
        "C",
    ]
    assert inputs.locator("tbody tr").all_inner_texts() == ["Mass kg\t4.9\t5.2\t4.6"]
    for line in margins.locator("tbody tr").all():
        assert len(re.findall(r"pass|watch|fail", line.inner_text())) == 3
    page.wait_for_function(f"() => ({UNPAINTED})().length === 0", polling=100)
    button(page, "Back to the list").click()
    row(page, "As drawn").get_by_role("button", name=re.compile("^Restore")).click()
    expect(page.locator(".said .done")).to_contain_text("Restored “As drawn”")
    expect(entry(page, "mass_kg")).to_have_value("4.6")
    button(page, re.compile("^Undo mass")).click()
    expect(entry(page, "mass_kg")).to_have_value("4.9")
    give(page, "mass_kg", "4.6")


def test_rename_search_delete_and_its_undo(page):
    remove_all(page)
    keep(page, "Slow one", "for the meadow")
    keep(page, "Fast one")
    row(page, "Slow one").get_by_role("button", name=re.compile("^Rename")).click()
    page.get_by_label("Name of the snapshot").fill("Calm one")
    button(page, "Set").click()
    expect(row(page, "Calm one")).to_have_count(1)
    search = page.get_by_label("Search the journal")
    search.fill("meadow")
    expect(page.locator(".journal li[data-id]")).to_have_count(1)
    expect(page.locator(".journal .count")).to_have_text("1 of 2")
    search.fill("")
    expect(page.locator(".journal li[data-id]")).to_have_count(2)
    row(page, "Calm one").get_by_role("button", name=re.compile("^Delete")).click()
    expect(page.locator(".journal .undo")).to_contain_text("Deleted “Calm one”.")
    page.locator(".journal .undo").get_by_role("button", name="Undo").click()
    expect(row(page, "Calm one")).to_have_count(1)


def test_what_is_typed_anywhere_is_shown_and_never_run(page):
    remove_all(page)
    keep(page, HARM, HARM)
    row(page, HARM).get_by_role("button", name=re.compile("^Rename")).click()
    page.get_by_label("Name of the snapshot").fill(f"2 {HARM}")
    page.get_by_label("Note of the snapshot").fill(f"<script>window.harmed=8</script>{HARM}")
    button(page, "Set").click()
    expect(row(page, f"2 {HARM}")).to_have_count(1)
    assert row(page, HARM).locator("strong").inner_text() == f"2 {HARM}"
    page.get_by_label("Search the journal").fill(HARM)
    expect(page.locator(".journal .count")).to_have_text("1 of 1")
    page.get_by_label("with what is on the page now").check()
    page.get_by_label(re.compile("^Compare 2 <img")).check()
    page.locator(".journal").get_by_role("button", name="Compare").click()
    expect(page.locator(".comparison thead").first).to_contain_text(f"2 {HARM}")
    unharmed(page)
    button(page, "Back to the list").click()
    page.get_by_label("with what is on the page now").uncheck()
    page.get_by_label(re.compile("^Compare 2 <img")).uncheck()
    page.get_by_label("Search the journal").fill("")
    row(page, HARM).get_by_role("button", name=re.compile("^Delete")).click()
    expect(page.locator(".journal .undo")).to_contain_text(HARM)
    button(page, "Edit name and note").click()
    for label in ("Name", "By", "Note"):
        page.get_by_label(label, exact=True).fill(HARM)
    button(page, "Set").click()
    expect(page.locator("h1")).to_have_text(HARM)
    name = button(page, re.compile(r"^Undo"))
    expect(name.first).to_have_attribute("title", re.compile("^Undo .*name"))
    unharmed(page)
    name.first.click()
    expect(page.locator("h1")).not_to_have_text(HARM)


def test_an_export_is_taken_in_again_and_too_large_a_file_is_not_sent(page, tmp_path):
    remove_all(page)
    keep(page, "To go")
    with page.expect_download() as waiting:
        row(page, "To go").get_by_role("button", name=re.compile("^Export")).click()
    file = tmp_path / waiting.value.suggested_filename
    waiting.value.save_as(file)
    remove_all(page)
    chooser = page.get_by_label("File to take in")
    chooser.set_input_files(file)
    expect(page.locator(".journal .done")).to_have_text("1 snapshot was taken in.")
    expect(row(page, "To go")).to_have_count(1)
    large = tmp_path / "large.zip"
    with large.open("wb") as stream:
        stream.truncate(LARGEST_UPLOAD + 100_000)
    chooser.set_input_files(large)
    problem = page.locator(".journal .problem")
    expect(problem).to_have_text(re.compile(r"^large\.zip has 15\.1 MB; at most 15 MB"))
    other = tmp_path / "other.toml"
    other.write_text("name = 'nothing of ours'")
    chooser.set_input_files(other)
    expect(problem).to_have_text(re.compile(r"other\.toml.* cannot be taken in: "))


def test_two_windows_on_one_journal_lose_nothing(page, desk):
    remove_all(page)
    watch = Watch(desk.address)
    other = open_page(desk.browser, desk.address, watch)
    keep(other, "From the other window")
    # Nobody touches this one: it looks by itself.
    expect(row(page, "From the other window")).to_have_count(1)
    keep(page, "From this window")
    open_sheet(other, "Journal")
    expect(other.locator(".journal li[data-id]")).to_have_count(2)
    (desk.folder / "journal" / "20260101T000000Z-x-0123456789ab.snapshot.toml").write_text("no")
    expect(page.locator(".journal .messages")).to_contain_text("damaged")
    expect(page.locator(".journal li[data-id]")).to_have_count(2)
    other.context.close()
    assert watch.complaints == []


def test_save_writes_the_opened_file_and_a_copy_is_handed_over(page, desk):
    file = desk.folder / "rook.toml"
    give(page, "mass_kg", "4.7")
    expect(page.locator(".unsaved")).to_have_text("not saved")
    button(page, "Save to rook.toml").click()
    expect(page.locator(".said .done")).to_have_text("Saved to rook.toml.")
    assert read_scenario(file).brief.mass_kg == 4.7
    with page.expect_download() as waiting:
        button(page, re.compile("^Save a copy")).click()
    assert waiting.value.suggested_filename.endswith(".zip")
    give(page, "mass_kg", "4.6")
    button(page, "Save to rook.toml").click()
    expect(page.locator(".unsaved")).to_have_text("")


def test_a_report_is_written_and_handed_over(page, tmp_path):
    with page.expect_download(timeout=60_000) as waiting:
        button(page, re.compile("^Report")).click()
        expect(page.locator(".unsaved")).to_have_text("writing report")
    expect(page.locator(".said .done")).to_contain_text("among your downloads")
    waiting.value.save_as(tmp_path / "report.html")
    start = (tmp_path / "report.html").read_text(encoding="utf-8")[:200]
    assert start.lower().startswith("<!doctype html>")


def test_a_reload_in_the_middle_of_an_edit_and_a_second_tab_show_the_state(page):
    open_sheet(page, "Wing")
    give(page, "span_m", "2.22")
    # At once, before the address can name it.
    page.reload()
    page.get_by_role("tab", name="Wing", exact=True).wait_for()
    expect(entry(page, "span_m")).to_have_value("2.22")
    give(page, "span_m", "2.23")
    address = kept_address(page)
    assert re.search(r"\?state=[0-9a-f]{64}$", address)
    second = page.context.new_page()
    second.goto(address)
    expect(entry(second, "span_m")).to_have_value("2.23")
    second.close()
    give(page, "span_m", "2.4")


def test_an_address_that_names_nothing_says_so(desk):
    watch = Watch(desk.address)
    page = open_page(desk.browser, f"{desk.address}?state={'0' * 64}", watch)
    expect(page.locator(".said .notice")).to_contain_text("no longer kept")
    page.context.close()
    assert watch.complaints == []


def test_a_killed_program_is_said_and_what_was_worked_on_comes_back(page, desk):
    open_sheet(page, "Wing")
    give(page, "span_m", "2.34")
    kept_address(page)
    desk.program.end(kill=True)
    lost = page.get_by_role("alert").filter(has_text="The connection to the program is lost.")
    expect(lost).to_be_visible()
    button(page, "Reload").click()
    expect(page.locator(".ask")).to_contain_text("It does not answer yet.")
    desk.restart()
    # Somebody who starts afresh is offered it...
    watch = Watch(desk.address)
    fresh = open_page(desk.browser, desk.address, watch)
    expect(entry(fresh, "span_m")).to_have_value("2.4")
    expect(fresh.locator(".ask")).to_contain_text("You left off at ")
    button(fresh, "Take it up again").click()
    expect(entry(fresh, "span_m")).to_have_value("2.34")
    expect(fresh.locator(".ask")).to_be_hidden()
    fresh.context.close()
    assert watch.complaints == []
    # ...and the old tab finds it by its address.
    button(page, "Reload").click()
    expect(lost).to_be_hidden()
    page.wait_for_function(IDLE)
    expect(entry(page, "span_m")).to_have_value("2.34")
    # What a browser says of a program that has gone is no fault of the page.
    gone = re.compile("ERR_CONNECTION|WebSocket|Lost websocket|Failed to load resource")
    desk.watch.complaints[:] = [one for one in desk.watch.complaints if not gone.search(one)]
